"""The emitters, profiles and motions that scene files can name: one line each.

Keys are the `kind` of a table in a scene file; the values take the table's other keys as keyword arguments,
lengths in M = 1 as plain numbers, and raise ValueError with a sentence where a value cannot be.
"""

from __future__ import annotations

from collections.abc import Callable

from emission.backdrop import Backdrop
from emission.contract import Emitter, Flow, Profile
from emission.disk import ThinDisk
from emission.flows import Blend, Circular, RadialFall, Static
from emission.page_thorne import PageThorne
from emission.profiles import GaussianRing, PowerLaw
from emission.tables import Table

EMITTERS: dict[str, Callable[..., Emitter]] = {
    "thin-disk": ThinDisk,
    "backdrop": Backdrop,
}

PROFILES: dict[str, Callable[..., Profile]] = {
    "power-law": PowerLaw,
    "gaussian-ring": GaussianRing,
    "page-thorne": PageThorne,
    "table": Table.read,
}

FLOWS: dict[str, Callable[..., Flow]] = {
    "static": Static,
    "circular": Circular,
    "blend": Blend,
    "radial-fall": RadialFall,
}
