"""Scan files: a base scene, what varies, and how it is drawn. The way a parameter varies is its prior.

Each parameter must stand in the base scene, and the ends of its prior must make valid scenes of it, so that what is wrong is told
before anything runs. Lengths are in M, angles in rad.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from pathlib import Path
from typing import Annotated, Any, Literal

from pydantic import Field

from ringwright.scenes.errors import Problem, SceneError, did_you_mean
from ringwright.scenes.loading import load_scene
from ringwright.scenes.models import (
    FARTHEST,
    FEWEST_PIXELS,
    MOST_PIXELS,
    NARROWEST_FIELD,
    Given,
    Name,
    SceneFile,
    Strict,
)
from ringwright.scenes.scene import Scene, key_path
from ringwright.scenes.validation import Document, accepted_keys, dotted, examined, read_document
from ringwright.units import shown
from ringwright.varying import KINDS, Kind, Vary, number_and_unit

Ends = Annotated[list[Any], Field(min_length=2, max_length=2)]
FieldSide = Annotated[float, Given("length", NARROWEST_FIELD, FARTHEST)]
HALF_TURN = math.pi * (1.0 + 1e-15)  # "180 deg" may come out a rounding error beyond π
MOST_SCENES = 10_000_000
# Readings are in units of M on the scan's own image, so these change nothing in a scan of scale-free scenes.
WITHOUT_EFFECT = (
    "name",
    "hole.mass",
    "hole.distance",
    "hole.theta_g",
    "view.position_angle",
    "view.frequency",
    "view.field",
    "view.pixels",
    "source",
)


class SamplingTable(Strict):
    """How scenes are drawn."""

    method: Literal["sobol", "grid"] = "sobol"
    scenes: Annotated[int, Field(ge=1, le=MOST_SCENES)] | None = None
    seed: Annotated[int, Field(ge=0)] = 0


class ImageTable(Strict):
    """Field and pixels of the scan's images."""

    field: FieldSide = "56 M"  # type: ignore[assignment]
    pixels: Annotated[int, Field(ge=FEWEST_PIXELS, le=MOST_PIXELS)] = 256


class VaryTable(Strict):
    """One parameter and its prior."""

    key: Annotated[str, Field(examples=['"view.inclination"'])]
    range_: Ends | None = Field(None, alias="range")
    log_range: Ends | None = None
    cosine_range: Ends | None = None
    list_: Annotated[list[Any], Field(min_length=1)] | None = Field(None, alias="list")
    labels: list[str] | None = None
    points: Annotated[int, Field(ge=1)] | None = None

    def prior(self, kind: Kind) -> list[Any] | None:
        """What stands under one of the four ways to vary."""
        given: list[Any] | None = getattr(self, {"range": "range_", "list": "list_"}.get(kind, kind))
        return given


class ScanFile(Strict):
    """A whole scan file."""

    name: Name
    family: str | None = None
    scene: Annotated[str, Field(examples=['"my-scene.toml"'])]
    sampling: SamplingTable = Field(default_factory=SamplingTable)
    image: ImageTable = Field(default_factory=ImageTable)
    vary: Annotated[list[VaryTable], Field(min_length=1)]


@dataclass(frozen=True)
class ScanPlan:
    """A validated scan file.

    Attributes
    ----------
    name, family, path, text : str
    base : Scene
    method : str
        "sobol" or "grid".
    scenes, seed : int
    field_m : float
        Side of the scan's images [M].
    pixels : int
    vary : tuple of Vary
    notices : tuple of str
        What the user should know before it runs.
    """

    name: str
    family: str
    path: str
    text: str
    base: Scene
    method: str
    scenes: int
    seed: int
    field_m: float
    pixels: int
    vary: tuple[Vary, ...]
    notices: tuple[str, ...] = ()


def load_scan(path: str | Path) -> ScanPlan:
    """Read a scan file and the base scene that it names.

    Raises
    ------
    SceneError
        With every problem of the file: line, key, what was given and what is accepted.
    """
    document = read_document(path, "scan")
    model, found = examined(ScanFile, document)
    base = _base(model.scene, document, found)
    drawn = [
        None if table is None else _vary(table, index, model, document, found)
        for index, table in enumerate(model.vary or ())
    ]
    vary = tuple(one for one in drawn if one is not None)
    if base is not None:
        _try_on(base, model, drawn, document, found)
    _check_sampling(model, document, found)
    if found or base is None:
        raise SceneError(found)
    scenes = (
        math.prod(_cells(one) for one in vary)
        if model.sampling.method == "grid"
        else model.sampling.scenes or 0
    )
    return ScanPlan(
        name=model.name,
        family=model.family or model.name,
        path=document.path,
        text=document.text,
        base=base,
        method=model.sampling.method,
        scenes=scenes,
        seed=model.sampling.seed,
        field_m=model.image.field,
        pixels=model.image.pixels,
        vary=vary,
        notices=_notices(model.sampling.method, scenes),
    )


def _base(name: str | None, document: Document, found: list[Problem]) -> Scene | None:
    if name is None:
        return None
    path = Path(document.path).parent / name
    try:
        return load_scene(path)
    except SceneError as problem:
        unread = [one for one in problem.problems if one.text.startswith("cannot be read")]
        for one in unread:
            text = f"the base scene {one.file} {one.text} (its path starts at the scan file's folder)"
            found.append(document.problem(("scene",), text))
        found += [one for one in problem.problems if one not in unread]
        return None


def _vary(
    table: VaryTable, index: int, model: ScanFile, document: Document, found: list[Problem]
) -> Vary | None:
    place = ("vary", index)
    given = [kind for kind in KINDS if table.prior(kind) is not None]
    if len(given) != 1:
        stands = f"{' and '.join(given)} stand here" if given else "none stands here"
        text = f"'{table.key}' needs exactly one of {', '.join(KINDS)}; {stands}"
        found.append(document.problem(place, text))
        return None
    kind = given[0]
    found += _unread(table, kind, place, model, document)
    try:
        if kind == "list":
            return _listed(table)
        return _ranged(table, kind, model)
    except ValueError as problem:
        found.append(document.problem((*place, kind), str(problem)))
        return None


def _unread(
    table: VaryTable, kind: Kind, place: tuple[str | int, ...], model: ScanFile, document: Document
) -> list[Problem]:
    """Keys that this way of varying does not read."""
    found = []
    if table.labels is not None and kind != "list":
        found.append(
            document.problem(
                (*place, "labels"), f"nothing reads labels of a {kind}; they name a list's values"
            )
        )
    grid = model.sampling is None or model.sampling.method == "grid"
    if table.points is not None and (kind == "list" or not grid):
        found.append(
            document.problem((*place, "points"), "nothing reads points here; they divide a range on a grid")
        )
    return found


def _listed(table: VaryTable) -> Vary:
    values = tuple(table.list_ or ())
    try:
        units = {number_and_unit(value)[1] for value in values}
    except ValueError:
        units = set()
    labels = tuple(table.labels or ()) if units else tuple(table.labels or map(_label, values))
    if labels and len(labels) != len(values):
        raise ValueError(f"{len(values)} values and {len(labels)} labels; give one label for each value")
    if len(units) > 1:
        raise ValueError("the values have different units; write them all in one")
    unit = next(iter(units), "")
    return Vary(table.key, "list", unit, math.nan, math.nan, values, labels, len(values))


def _ranged(table: VaryTable, kind: Kind, model: ScanFile) -> Vary:
    (low, unit), (high, other) = (number_and_unit(end) for end in table.prior(kind) or ())
    if unit != other:
        raise ValueError("the two ends have different units; write both in one")
    if not low < high:
        raise ValueError(
            f"the interval runs the wrong way round, from {low:g} to {high:g}; write the smaller end first"
        )
    if kind == "log_range" and low <= 0.0:
        raise ValueError(f"a log range starts above 0, not at {low:g}")
    if kind == "cosine_range" and not (unit == "rad" and low >= 0.0 and high <= HALF_TURN):
        raise ValueError('a cosine range is one of angles from 0 to 180 deg, such as ["0 deg", "20 deg"]')
    if model.sampling is not None and model.sampling.method == "grid" and table.points is None:
        raise ValueError("on a grid a range needs points, the number of equal cells of prior weight")
    return Vary(table.key, kind, unit, low, high, (), (), table.points or 1)


def _label(value: Any) -> str:
    if isinstance(value, dict):
        rest = ", ".join(f"{key} {inner}" for key, inner in value.items() if key != "kind")
        return f"{value.get('kind', '')} ({rest})" if rest else str(value.get("kind", ""))
    return str(value)


def _try_on(
    base: Scene, model: ScanFile, drawn: list[Vary | None], document: Document, found: list[Problem]
) -> None:
    """Every key must stand in the base scene, and every end of every prior must make a valid scene of it."""
    for index, (table, one) in enumerate(zip(model.vary or (), drawn, strict=True)):
        if table is None:
            continue
        problem = _key_problem(table.key, base)
        if problem:
            found.append(document.problem(("vary", index, "key"), problem))
        elif one is not None:
            found += _end_problems(one, base, ("vary", index, one.kind), document)


def _key_problem(key: str, base: Scene) -> str:
    *table, last = key_path(key, base.data)
    accepted = accepted_keys(SceneFile, base.data, tuple(table))
    if isinstance(last, str) and last not in accepted:
        hint = did_you_mean(last, accepted) if accepted else "emitters count from emitter.0"
        return f"'{key}' is no key of the base scene; {hint}"
    if base.scale_free and any(key == one or key.startswith(f"{one}.") for one in WITHOUT_EFFECT):
        return f"'{key}' changes nothing in a scan: readings are in units of M, on the image that [image] describes"
    return ""


def _end_problems(one: Vary, base: Scene, place: tuple[str | int, ...], document: Document) -> list[Problem]:
    given = document.data["vary"][place[1]][one.kind]
    for value, written in zip(one.ends(), given, strict=True):
        try:
            base.replace(one.key, value)
        except SceneError as problem:
            reasons = "; ".join(_within(each, one.key, base) for each in problem.problems)
            return [document.problem(place, f"{one.key} = {shown(written)}: {reasons}")]
    return []


def _within(problem: Problem, key: str, base: Scene) -> str:
    """The words of a problem; with its key, where that is another than the one that varies."""
    return (
        problem.text if problem.key == dotted(key_path(key, base.data)) else f"{problem.key}: {problem.text}"
    )


def _check_sampling(model: ScanFile, document: Document, found: list[Problem]) -> None:
    sampling = model.sampling
    if sampling is not None and sampling.method == "sobol" and sampling.scenes is None:
        found.append(document.problem(("sampling",), "a Sobol sequence needs scenes, best a power of two"))
    if sampling is not None and sampling.method == "grid" and sampling.scenes is not None:
        text = "a grid has as many scenes as its cells; leave scenes out"
        found.append(document.problem(("sampling", "scenes"), text))
    keys = [table.key for table in model.vary or () if table is not None]
    for index, key in enumerate(keys):
        if key in keys[:index]:
            found.append(document.problem(("vary", index, "key"), f"'{key}' varies twice"))


def _cells(one: Vary) -> int:
    return len(one.values) if one.kind == "list" else one.points


def _notices(method: str, scenes: int) -> tuple[str, ...]:
    if method == "sobol" and scenes & (scenes - 1):
        below = 2 ** int(math.log2(scenes))
        return (f"{scenes} Sobol scenes are less even than a power of two such as {below} or {2 * below}",)
    return ()
