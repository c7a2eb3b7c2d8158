"""What shines around a black hole: radial profiles, motions of the gas, disks, a backdrop; G = c = M = 1.

The names below are loaded when first used, so that importing the package costs nothing.
"""

from __future__ import annotations

from importlib import import_module
from typing import Any

_HOMES = {
    "Emitter": "emission.contract",
    "Flow": "emission.contract",
    "FourVelocity": "emission.contract",
    "Profile": "emission.contract",
    "ThinDisk": "emission.disk",
    "Backdrop": "emission.backdrop",
    "PowerLaw": "emission.profiles",
    "GaussianRing": "emission.profiles",
    "PageThorne": "emission.page_thorne",
    "Table": "emission.tables",
    "Static": "emission.flows",
    "Circular": "emission.flows",
    "RadialFall": "emission.flows",
    "Blend": "emission.flows",
    "redshift": "emission.redshifts",
    "shade": "emission.shading",
    "EMITTERS": "emission.registry",
    "PROFILES": "emission.registry",
    "FLOWS": "emission.registry",
}

__all__ = list(_HOMES)


def __getattr__(name: str) -> Any:
    if name not in _HOMES:
        raise AttributeError(f"module 'emission' has no attribute '{name}'")
    value = getattr(import_module(_HOMES[name]), name)
    globals()[name] = value
    return value


def __dir__() -> list[str]:
    return __all__
