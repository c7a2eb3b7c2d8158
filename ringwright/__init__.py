"""Ringwright turns one measured ring into one defensible mass.

The names below are loaded when first used, so that importing the package costs nothing.
"""

from __future__ import annotations

from importlib import import_module
from typing import Any

__version__ = "0.1.0"

_HOMES = {
    "Scene": "ringwright.scenes",
    "SceneError": "ringwright.scenes",
    "load_scene": "ringwright.scenes",
    "Image": "ringwright.image",
    "render": "ringwright.rendering",
    "Ring": "ringwright.ring",
    "RingOutcome": "ringwright.ring",
    "measure": "ringwright.ring",
    "visibility": "ringwright.visibilities",
    "Profile": "ringwright.profiling.profile",
    "profile": "ringwright.profiling.profile",
    "ScanTable": "ringwright.scanning.table",
    "scan": "ringwright.scanning",
    "Comparison": "ringwright.comparing",
    "compare": "ringwright.comparing",
    "load_observation": "ringwright.observation",
}

__all__ = ["__version__", *_HOMES]


def __getattr__(name: str) -> Any:
    if name not in _HOMES:
        raise AttributeError(f"module 'ringwright' has no attribute '{name}'")
    value = getattr(import_module(_HOMES[name]), name)
    globals()[name] = value
    return value


def __dir__() -> list[str]:
    return __all__
