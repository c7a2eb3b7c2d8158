"""Measuring rings: one estimator for synthetic and observed images (docs/measuring.md)."""

from ringwright.ring.outcomes import RingOutcome

__all__ = ["RingOutcome"]
