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
from ringwright.scenes.models import FARTHEST, NARROWEST_FIELD, Hole, SceneFile, ThinDiskEmitter
from ringwright.scenes.validation import Document, examined, validated
from ringwright.units import theta_g

if TYPE_CHECKING:
    from emission.contract import Emitter

Found = list[tuple[lines.Path, str]]
LONGEST_INDEX = 6  # digits of an emitter's place; more is no place but a name
LARGEST_THETA_G = 1.0  # rad: a hole seen from no farther than its own size


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
    parts: list[str | int] = [int(part) if _is_index(part) else part for part in path.split(".")]
    single = parts[0] == "emitter" and len(data.get("emitter", [])) == 1
    if single and not (len(parts) > 1 and isinstance(parts[1], int)):
        parts.insert(1, 0)
    return tuple(parts)


def _is_index(part: str) -> bool:
    return part.isascii() and part.isdigit() and len(part) <= LONGEST_INDEX


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
        With every problem of single values, and of values that do not go together where these are valid by themselves.
    """
    model, problems = examined(SceneFile, document)
    found: Found = []
    emitters = tuple(
        (one.strength, _emitter(one, index, document, found))
        for index, one in enumerate(model.emitter or ())
        if one is not None
    )
    spacetime = _spacetime(model.hole, found)
    theta = _theta_g(model.hole, found)
    found += _conflicts(model, theta) + _emitter_conflicts(model, emitters)
    if problems or found or spacetime is None:
        raise SceneError([*problems, *(document.problem(*one) for one in found)])
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
        field_m=_side(model.view.field, theta),
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


def _side(field: tuple[str, float], theta: float | None) -> float:
    """Side of the image [M]."""
    unit, side = field
    return side if unit == "M" or theta is None else side / theta


def _spacetime(hole: Hole | None, found: Found) -> Spacetime | None:
    if hole is None:
        return None
    if hole.spacetime not in registry.SPACETIMES:
        hint = did_you_mean(hole.spacetime, registry.SPACETIMES)
        found.append((("hole", "spacetime"), f"spacetime '{hole.spacetime}' is not known; {hint}"))
        return None
    return registry.SPACETIMES[hole.spacetime]()


def _theta_g(hole: Hole | None, found: Found) -> float | None:
    if hole is None:
        return None
    if hole.theta_g is not None and (hole.mass is not None or hole.distance is not None):
        given = "mass" if hole.mass is not None else "distance"
        text = "theta_g stands here already; give mass and distance, or theta_g alone"
        found.append((("hole", given), text))
    elif (hole.mass is None) != (hole.distance is None):
        given, absent = ("mass", "distance") if hole.distance is None else ("distance", "mass")
        found.append((("hole", given), f"a {given} needs a {absent} beside it to give an angle on the sky"))
    elif hole.mass is not None and hole.distance is not None:
        theta = theta_g(hole.mass, hole.distance)
        if not 0.0 < u.uas.to("rad", theta) < LARGEST_THETA_G:
            text = f"with this distance theta_g is {theta:g} µas, which no hole has; check the units of both"
            found.append((("hole", "mass"), text))
            return None
        return theta
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
        made = EMITTERS[one.kind](**given)
    except (ValueError, OSError) as problem:
        found.append((place, str(problem)))
        return None
    if made.edges and made.edges[-1] > FARTHEST:
        text = f"this shines out to {made.edges[-1]:g} M; light is followed to {FARTHEST:g} M, so let it end there"
        found.append((("emitter", index, "profile"), text))
        return None
    return made


def _made(registered: Any, table: dict[str, Any], document: Document) -> Any:
    given = {key: value for key, value in table.items() if key != "kind"}
    if "file" in given:
        given["file"] = Path(document.path).parent / given["file"]
    return registered[table["kind"]](**given)


def _conflicts(model: SceneFile, theta: float | None) -> Found:
    """What does not go together in the tables beside the emitters."""
    found: Found = []
    if model.source is not None and (model.source.right_ascension is None) != (
        model.source.declination is None
    ):
        found.append((("source",), "right_ascension and declination go together; give both or none"))
    if model.hole is None or model.view is None:
        return found
    on_sky = model.view.field[0] == "uas"
    if on_sky and theta is None and model.hole.mass is None and model.hole.distance is None:
        text = "a field on the sky needs theta_g (or mass and distance) in [hole]; or give the field in M"
        found.append((("view", "field"), text))
    elif not (on_sky and theta is None) and not NARROWEST_FIELD <= _side(model.view.field, theta) <= FARTHEST:
        side = _side(model.view.field, theta)
        text = f"the field is {side:g} M wide; {NARROWEST_FIELD:g} M to {FARTHEST:g} M is accepted (check the units)"
        found.append((("view", "field"), text))
    return found


def _emitter_conflicts(model: SceneFile, emitters: tuple[tuple[float, Any], ...]) -> Found:
    """What does not go together among emitters, or between them and the source; those that could not be built are passed over."""
    found: Found = []
    whole = [one for one in model.emitter or () if one is not None]
    if whole and len(whole) == len(model.emitter) and all(one.strength == 0.0 for one in whole):
        found.append((("emitter",), "every strength is 0, so nothing shines; raise one"))
    bolometric = [emitter.bolometric for _, emitter in emitters if emitter is not None]
    if any(bolometric) and model.source is not None and model.source.total_flux is not None:
        text = "a bolometric image has no flux density; leave total_flux out (the image is normalised to 1)"
        found.append((("source", "total_flux"), text))
    if any(bolometric) and not all(bolometric):
        found.append((("emitter",), "a bolometric emitter cannot be added to one at a single frequency"))
    text = "an opaque disk hides what is behind it, which is not followed across emitters; let it stand alone"
    for index, one in enumerate(model.emitter or ()):
        if isinstance(one, ThinDiskEmitter) and one.opaque and len(model.emitter) > 1:
            found.append((("emitter", index, "opaque"), text))
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
