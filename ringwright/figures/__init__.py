"""Pictures: every one is drawn on a Figure of its own with the Agg canvas, without pyplot's global state."""
