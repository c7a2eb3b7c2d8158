"""Measuring rings: one estimator for synthetic and observed images (docs/measuring.md)."""

from __future__ import annotations

from importlib import import_module
from typing import Any

_HOMES = {
    "Ring": "ringwright.ring.measuring",
    "RingOutcome": "ringwright.ring.outcomes",
    "measure": "ringwright.ring.measuring",
    "measure_many": "ringwright.ring.measuring",
    "Readings": "ringwright.ring.readings",
}

__all__ = ["Ring", "RingOutcome", "measure", "measure_many", "Readings"]


def __getattr__(name: str) -> Any:
    if name not in _HOMES:
        raise AttributeError(f"module 'ringwright.ring' has no attribute '{name}'")
    return getattr(import_module(_HOMES[name]), name)
