"""Plain words for the keys of scene files, where a person reads them; files, JSON and products keep the keys.

A key that has no words here is shown as it stands. No units.
"""

from __future__ import annotations

WORDS = {
    "hole.spacetime": "spacetime",
    "view.inclination": "inclination",
    "view.frequency": "frequency",
    "emitter.kind": "emitter",
    "emitter.strength": "strength",
    "emitter.spectral_index": "spectral index",
    "emitter.opaque": "opaque",
    "emitter.slant": "brighter along the surface",
    "emitter.profile": "brightness profile",
    "emitter.profile.kind": "brightness profile",
    "emitter.profile.inner": "inner edge",
    "emitter.profile.outer": "outer edge",
    "emitter.profile.slope": "slope of brightness",
    "emitter.profile.edge_width": "width of the edges",
    "emitter.profile.radius": "radius of the ring of light",
    "emitter.profile.width": "width of the ring of light",
    "emitter.profile.file": "table of brightness",
    "emitter.flow": "motion of the gas",
    "emitter.flow.kind": "motion of the gas",
    "emitter.flow.orbit_fraction": "share of the orbital motion",
    "emitter.flow.fall_fraction": "share of the free fall",
    "joint": "several together",
}
VALUES = {"True": "yes", "False": "no", "thin-disk": "thin disk", "power-law": "power law"}


def plain(key: str) -> str:
    """A key in words, such as "inner edge", or "inner edge of emitter 1" where there are several."""
    parts = key.split(".")
    numbered = len(parts) > 1 and parts[0] == "emitter" and parts[1].isdigit()
    words = WORDS.get(".".join(parts[:1] + parts[2:]) if numbered else key)
    if words is None:
        return key
    return f"{words} of emitter {parts[1]}" if numbered else words


def named(key: str) -> str:
    """A key in words, with the key itself to find it in a file."""
    words = plain(key)
    return key if words == key else f"{words} ({key})"


def value(text: str) -> str:
    """A value of a scene in words."""
    return VALUES.get(text, text.removesuffix(".0"))
