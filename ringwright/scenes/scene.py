"""`Scene`: one validated scene, ready to be rendered, and what several keys of its file must satisfy together.

Units were taken off on the way in: angles in rad, the field in M, astropy quantities only where a reader may want them.
"""

from __future__ import annotations

import copy
import math
from dataclasses import dataclass, field
from pathlib import Path
from typing import TYPE_CHECKING, Any

from astropy import units as u

from emission.registry import EMITTERS, FLOWS, PROFILES
from raytrace import registry
from raytrace.contract import Spacetime
from ringwright.scenes import lines
from ringwright.scenes.errors import SceneError, did_you_mean
from ringwright.scenes.models import SceneFile, ThinDiskEmitter
from ringwright.scenes.validation import Document, validated
from ringwright.units import theta_g

if TYPE_CHECKING:
    from emission.contract import Emitter

Found = list[tuple[lines.Path, str]]


@dataclass(frozen=True)
class Scene:
    """What to render. Made by `load_scene`; changed by `replace`.

    Attributes
    ----------
    name, path, text : str
        Name, file it came from, and the file as it stood.
    spacetime : Spacetime
    mass, distance, theta_g, frequency, total_flux : Quantity or None
    inclination, position_angle : float
        [rad]
    field_m : float
        Side of the image [M].
    pixels, orders : int
    position : (Quantity, Quantity) or None
        Right ascension and declination.
    emitters : tuple of (float, Emitter)
        Strength and what shines.
    scale_free : bool
        Whether the image in units of M is the same at every mass, distance, flux density and frequency.
    """

    name: str
    path: str
    text: str
    spacetime: Spacetime
    mass: u.Quantity | None
    distance: u.Quantity | None
    theta_g: u.Quantity | None
    inclination: float
    position_angle: float
    frequency: u.Quantity | None
    field_m: float
    pixels: int
    orders: int
    total_flux: u.Quantity | None
    position: tuple[u.Quantity, u.Quantity] | None
    emitters: tuple[tuple[float, Emitter], ...]
    scale_free: bool
    data: dict[str, Any] = field(repr=False, compare=False)

    def replace(self, path: str, value: Any) -> Scene:
        """The same scene with one value changed.

        Parameters
        ----------
        path : str
            Key path in the file, such as "view.inclination", or "emitter.profile.inner" where there is one emitter
            ("emitter.1.profile.inner" otherwise).
        value : object
            As it would stand in the file; a dict for a whole table.

        Raises
        ------
        SceneError
            If there is no such key or the value does not make a valid scene.
        """
        data = copy.deepcopy(self.data)
        put(data, key_path(path, data), value)
        return scene_from(Document(self.path, "", data), text=self.text)

    def resolved(self) -> dict[str, Any]:
        """Every key with its default filled in, as it would stand in a file."""
        data: dict[str, Any] = {"name": self.name}
        model = validated(SceneFile, Document(self.path, "", self.data))
        for table in ("hole", "view", "source"):
            data[table] = _filled(getattr(model, table), self.data.get(table, {}))
        data["emitter"] = [
            _filled(one, given) for one, given in zip(model.emitter, self.data["emitter"], strict=True)
        ]
        return data


def key_path(path: str, data: dict[str, Any]) -> lines.Path:
    """A dotted key path as parts, with the index of a single emitter filled in."""
    parts: list[str | int] = [int(part) if part.isdigit() else part for part in path.split(".")]
    single = parts[0] == "emitter" and len(data.get("emitter", [])) == 1
    if single and not (len(parts) > 1 and isinstance(parts[1], int)):
        parts.insert(1, 0)
    return tuple(parts)


def put(data: Any, path: lines.Path, value: Any) -> None:
    """Set a value in nested tables, which are made where they are absent.

    Raises
    ------
    SceneError
        If the path leads through something that is no table, or past the last emitter.
    """
    place = data
    for part in path[:-1]:
        if isinstance(place, dict):
            place = place.setdefault(part, {})
        elif isinstance(place, list) and isinstance(part, int) and part < len(place):
            place = place[part]
        else:
            place = None
    inside = isinstance(place, dict) or (
        isinstance(place, list) and isinstance(path[-1], int) and path[-1] < len(place)
    )
    if not inside:
        name = ".".join(map(str, path))
        raise Document("", "", data).error(
            ((), f"'{name}' is no key of this scene; with several emitters write emitter.0.…")
        )
    place[path[-1]] = value


def scene_from(document: Document, *, text: str | None = None) -> Scene:
    """The scene of a document.

    Raises
    ------
    SceneError
        With every problem of single values, or else with every problem of values that do not go together.
    """
    model = validated(SceneFile, document)
    found: Found = []
    emitters = tuple(
        (one.strength, _emitter(one, index, document, found)) for index, one in enumerate(model.emitter)
    )
    spacetime = _spacetime(model, found)
    theta = _theta_g(model, found)
    found += _conflicts(model, theta, emitters)
    if found or spacetime is None:
        raise document.error(*found)
    unit, side = model.view.field
    source = model.source
    return Scene(
        name=model.name,
        path=document.path,
        text=document.text if text is None else text,
        spacetime=spacetime,
        mass=_quantity(model.hole.mass, "solMass"),
        distance=_quantity(model.hole.distance, "Mpc"),
        theta_g=_quantity(theta, "uas"),
        inclination=min(model.view.inclination, math.pi),
        position_angle=model.view.position_angle,
        frequency=_quantity(model.view.frequency, "Hz"),
        field_m=side if unit == "M" or theta is None else side / theta,
        pixels=model.view.pixels,
        orders=model.view.orders,
        total_flux=_quantity(source.total_flux, "Jy"),
        position=None
        if source.right_ascension is None or source.declination is None
        else (source.right_ascension * u.rad, source.declination * u.rad),
        emitters=emitters,
        scale_free=all(emitter.scale_free for _, emitter in emitters),
        data=document.data,
    )


def _quantity(value: float | None, unit: str) -> u.Quantity | None:
    return None if value is None else u.Quantity(value, unit)


def _spacetime(model: SceneFile, found: Found) -> Spacetime | None:
    name = model.hole.spacetime
    if name not in registry.SPACETIMES:
        hint = did_you_mean(name, registry.SPACETIMES)
        found.append((("hole", "spacetime"), f"spacetime '{name}' is not known; {hint}"))
        return None
    return registry.SPACETIMES[name]()


def _theta_g(model: SceneFile, found: Found) -> float | None:
    hole = model.hole
    if hole.theta_g is not None and (hole.mass is not None or hole.distance is not None):
        given = "mass" if hole.mass is not None else "distance"
        found.append(
            (("hole", given), "theta_g stands here already; give mass and distance, or theta_g alone")
        )
    elif (hole.mass is None) != (hole.distance is None):
        given, absent = ("mass", "distance") if hole.distance is None else ("distance", "mass")
        found.append((("hole", given), f"a {given} needs a {absent} beside it to give an angle on the sky"))
    elif hole.mass is not None and hole.distance is not None:
        return theta_g(hole.mass, hole.distance)
    return hole.theta_g


def _emitter(one: Any, index: int, document: Document, found: Found) -> Any:
    """Build what shines through the registry of its kind; refusals become problems at its table."""
    place: lines.Path = ("emitter", index)
    given = one.model_dump(exclude={"kind", "strength"})
    try:
        if isinstance(one, ThinDiskEmitter):
            place = ("emitter", index, "profile")
            given["profile"] = _made(PROFILES, given["profile"], document)
            place = ("emitter", index, "flow")
            given["flow"] = _made(FLOWS, given["flow"], document)
            place = ("emitter", index)
        return EMITTERS[one.kind](**given)
    except (ValueError, OSError) as problem:
        found.append((place, str(problem)))
        return None


def _made(registered: Any, table: dict[str, Any], document: Document) -> Any:
    given = {key: value for key, value in table.items() if key != "kind"}
    if "file" in given:
        given["file"] = Path(document.path).parent / given["file"]
    return registered[table["kind"]](**given)


def _conflicts(model: SceneFile, theta: float | None, emitters: tuple[tuple[float, Any], ...]) -> Found:
    found: Found = []
    if model.view.field[0] == "uas" and theta is None:
        text = "a field on the sky needs theta_g (or mass and distance) in [hole]; or give the field in M"
        found.append((("view", "field"), text))
    if (model.source.right_ascension is None) != (model.source.declination is None):
        found.append((("source",), "right_ascension and declination go together; give both or none"))
    if all(strength == 0.0 for strength, _ in emitters):
        found.append((("emitter",), "every strength is 0, so nothing shines; raise one"))
    bolometric = [emitter is not None and emitter.bolometric for _, emitter in emitters]
    if any(bolometric) and model.source.total_flux is not None:
        text = "a bolometric image has no flux density; leave total_flux out (the image is normalised to 1)"
        found.append((("source", "total_flux"), text))
    if any(bolometric) and not all(bolometric) and len(emitters) > 1:
        found.append((("emitter",), "a bolometric emitter cannot be added to one at a single frequency"))
    opaque = [emitter is not None and emitter.opaque for _, emitter in emitters]
    if any(opaque) and len(emitters) > 1:
        text = "an opaque disk hides what is behind it, which is not followed across emitters; let it stand alone"
        found.append((("emitter", opaque.index(True), "opaque"), text))
    return found


def _filled(model: Any, given: dict[str, Any]) -> dict[str, Any]:
    """A table as it would stand in a file with all its defaults written out."""
    filled: dict[str, Any] = {}
    for name, info in type(model).model_fields.items():
        value = getattr(model, name)
        inner = given.get(name)
        if isinstance(inner, dict):
            filled[name] = _filled(value, inner)
        else:
            filled[name] = inner if name in given else info.get_default()
    return filled


__all__ = ["Scene", "SceneError", "key_path", "put", "scene_from"]
