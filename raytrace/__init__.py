"""Light paths around a black hole, in geometrised units G = c = M = 1.

The names below are loaded when first used, so that importing the package costs nothing.
"""

from __future__ import annotations

from importlib import import_module
from typing import Any

_HOMES = {
    "Schwarzschild": "raytrace.schwarzschild",
    "SPACETIMES": "raytrace.registry",
    "CircularOrbit": "raytrace.contract",
    "Hit": "raytrace.contract",
    "Metric": "raytrace.contract",
    "RayStatus": "raytrace.contract",
    "Spacetime": "raytrace.contract",
    "trace": "raytrace.tracing",
    "deflection": "raytrace.bending",
    "light_time": "raytrace.timing",
    "light_speed": "raytrace.timing",
    "shadow_angle": "raytrace.shadow",
    "critical_curve": "raytrace.isoradials",
    "isoradial": "raytrace.isoradials",
    "Screen": "raytrace.screens",
    "screen": "raytrace.screens",
}

__all__ = list(_HOMES)


def __getattr__(name: str) -> Any:
    if name not in _HOMES:
        raise AttributeError(f"module 'raytrace' has no attribute '{name}'")
    value = getattr(import_module(_HOMES[name]), name)
    globals()[name] = value
    return value


def __dir__() -> list[str]:
    return __all__
