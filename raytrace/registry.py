"""The spacetimes that scene files can name: one line each."""

from __future__ import annotations

from collections.abc import Callable

from raytrace.contract import Spacetime
from raytrace.schwarzschild import Schwarzschild

SPACETIMES: dict[str, Callable[..., Spacetime]] = {"schwarzschild": Schwarzschild}


def or_default(spacetime: Spacetime | None) -> Spacetime:
    """The spacetime that was given, or Schwarzschild."""
    return Schwarzschild() if spacetime is None else spacetime
