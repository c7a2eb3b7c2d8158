"""Scan files: a base scene, what varies, and how it is drawn. The way a parameter varies is its prior.

A range is uniform, a log range uniform in the logarithm, a cosine range (for inclinations) uniform in the cosine; a list gives
equal weights. Numbers are kept in M, rad or without a unit.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from pathlib import Path
from typing import Annotated, Any, Literal

import numpy as np
from numpy.typing import NDArray
from pydantic import Field

from ringwright.scenes.errors import Problem, SceneError
from ringwright.scenes.loading import load_scene
from ringwright.scenes.models import FEWEST_PIXELS, MOST_PIXELS, Length, Strict
from ringwright.scenes.scene import Scene
from ringwright.scenes.validation import Document, read_document, register, validated
from ringwright.units import parse_given

Array = NDArray[np.float64]
Kind = Literal["range", "log_range", "cosine_range", "list"]
KINDS: tuple[Kind, ...] = ("range", "log_range", "cosine_range", "list")
Ends = Annotated[list[Any], Field(min_length=2, max_length=2)]
MOST_SCENES = 10_000_000


class SamplingTable(Strict):
    """How scenes are drawn."""

    method: Literal["sobol", "grid"] = "sobol"
    scenes: Annotated[int, Field(ge=1, le=MOST_SCENES)] | None = None
    seed: Annotated[int, Field(ge=0)] = 0


class ImageTable(Strict):
    """Field and pixels of the scan's images."""

    field: Length = "56 M"  # type: ignore[assignment]
    pixels: Annotated[int, Field(ge=FEWEST_PIXELS, le=MOST_PIXELS)] = 256


class VaryTable(Strict):
    """One parameter and its prior."""

    key: str
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

    name: Annotated[str, Field(pattern=r"^[A-Za-z0-9][A-Za-z0-9._-]*$")]
    family: str | None = None
    scene: str
    sampling: SamplingTable = Field(default_factory=SamplingTable)
    image: ImageTable = Field(default_factory=ImageTable)
    vary: Annotated[list[VaryTable], Field(min_length=1)]


register(ScanFile)


@dataclass(frozen=True)
class Vary:
    """One parameter of a scan.

    Attributes
    ----------
    key : str
        Key path in the scene.
    kind : str
        "range", "log_range", "cosine_range" or "list".
    unit : str
        "M", "rad" or "": the unit of `low`, `high` and of `numbers`.
    low, high : float
        Ends of a range; NaN for a list.
    values : tuple
        Values of a list, as they stand in the file.
    labels : tuple of str
        Names of a list's values where they are no numbers.
    points : int
        Cells on a grid.
    """

    key: str
    kind: Kind
    unit: str
    low: float
    high: float
    values: tuple[Any, ...]
    labels: tuple[str, ...]
    points: int

    def draw(self, u: Array) -> list[Any]:
        """Values, as they would stand in a scene file, at places 0 ≤ u < 1 of the prior's cumulative."""
        if self.kind == "list":
            return [self.values[min(int(x * len(self.values)), len(self.values) - 1)] for x in u]
        return [self.written(float(x)) for x in self._quantiles(np.asarray(u, dtype=np.float64))]

    def numbers(self, values: list[Any]) -> Array:
        """Drawn values as plain numbers; the place in the list for values that are no numbers."""
        if self.labels:
            return np.array([float(self.values.index(value)) for value in values])
        return np.array([_number(value)[0] for value in values])

    def written(self, number: float) -> Any:
        """A number of this parameter as it would stand in a scene file."""
        return f"{number!r} {self.unit}" if self.unit else number

    def ends(self) -> list[Any]:
        """Values at the ends of the prior, or all of a list, to be tried on the base scene."""
        return list(self.values) if self.kind == "list" else [self.written(self.low), self.written(self.high)]

    def _quantiles(self, u: Array) -> Array:
        if self.kind == "log_range":
            return np.exp(math.log(self.low) + u * math.log(self.high / self.low))
        if self.kind == "cosine_range":
            first, last = math.cos(self.low), math.cos(self.high)
            return np.arccos(np.clip(first + u * (last - first), -1.0, 1.0))
        return self.low + u * (self.high - self.low)


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
    document = read_document(path)
    model = validated(ScanFile, document)
    base = _base(model, document)
    found: list[Problem] = []
    vary = tuple(_vary(table, index, model, document, found) for index, table in enumerate(model.vary))
    if not found:
        _try_ends(vary, base, document, found)
    _check_sampling(model, document, found)
    if found:
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


def _base(model: ScanFile, document: Document) -> Scene:
    path = Path(document.path).parent / model.scene
    if not path.is_file():
        raise document.error(
            (("scene",), f"there is no scene file {path} (paths start at the scan file's folder)")
        )
    return load_scene(path)


def _vary(table: VaryTable, index: int, model: ScanFile, document: Document, found: list[Problem]) -> Vary:
    place = ("vary", index)
    given = [kind for kind in KINDS if table.prior(kind) is not None]
    empty = Vary(table.key, "list", "", math.nan, math.nan, (), (), 1)
    if len(given) != 1:
        text = f"'{table.key}' needs exactly one of {', '.join(KINDS)}; {' and '.join(given) or 'none'} stands here"
        found.append(document.problem(place, text))
        return empty
    kind = given[0]
    try:
        if kind == "list":
            return _listed(table)
        return _ranged(table, kind, model)
    except ValueError as problem:
        found.append(document.problem((*place, kind), str(problem)))
        return empty


def _listed(table: VaryTable) -> Vary:
    values = tuple(table.list_ or ())
    try:
        units = {_number(value)[1] for value in values}
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
    (low, unit), (high, other) = (_number(end) for end in table.prior(kind) or ())
    if unit != other:
        raise ValueError("the two ends have different units; write both in one")
    if not low < high:
        raise ValueError(
            f"the interval runs the wrong way round, from {low:g} to {high:g}; write the smaller end first"
        )
    if kind == "log_range" and low <= 0.0:
        raise ValueError(f"a log range starts above 0, not at {low:g}")
    if kind == "cosine_range" and unit != "rad":
        raise ValueError('a cosine range is one of angles, such as ["0 deg", "20 deg"]')
    if model.sampling.method == "grid" and table.points is None:
        raise ValueError("on a grid a range needs points, the number of equal cells of prior weight")
    return Vary(table.key, kind, unit, low, high, (), (), table.points or 1)


def _number(value: Any) -> tuple[float, str]:
    """A plain number and its unit, "M", "rad" or none."""
    if isinstance(value, bool) or not isinstance(value, int | float | str):
        raise ValueError(f"{value!r} is neither a number nor a quantity")
    if not isinstance(value, str):
        if not math.isfinite(value):
            raise ValueError(f"{value!r} is not finite")
        return float(value), ""
    kind = "length" if value.strip().endswith("M") else "angle"
    return parse_given(value, kind), "M" if kind == "length" else "rad"


def _label(value: Any) -> str:
    if isinstance(value, dict):
        rest = ", ".join(f"{key} {inner}" for key, inner in value.items() if key != "kind")
        return f"{value.get('kind', '')} ({rest})" if rest else str(value.get("kind", ""))
    return str(value)


def _try_ends(vary: tuple[Vary, ...], base: Scene, document: Document, found: list[Problem]) -> None:
    """Every end of every prior must make a valid scene of the base."""
    for index, one in enumerate(vary):
        for value in one.ends():
            try:
                base.replace(one.key, value)
            except SceneError as problem:
                reasons = "; ".join(each.text for each in problem.problems)
                found.append(document.problem(("vary", index, one.kind), f"{one.key} = {value!r}: {reasons}"))
                break


def _check_sampling(model: ScanFile, document: Document, found: list[Problem]) -> None:
    sampling = model.sampling
    if sampling.method == "sobol" and sampling.scenes is None:
        found.append(document.problem(("sampling",), "a Sobol sequence needs scenes, best a power of two"))
    if sampling.method == "grid" and sampling.scenes is not None:
        text = "a grid has as many scenes as its cells; leave scenes out"
        found.append(document.problem(("sampling", "scenes"), text))
    keys = [table.key for table in model.vary]
    for index, key in enumerate(keys):
        if key in keys[:index]:
            found.append(document.problem(("vary", index, "key"), f"'{key}' varies twice"))
    if model.image.field <= 0.0:
        found.append(document.problem(("image", "field"), "a field has a positive side"))


def _cells(one: Vary) -> int:
    return len(one.values) if one.kind == "list" else one.points


def _notices(method: str, scenes: int) -> tuple[str, ...]:
    if method == "sobol" and scenes & (scenes - 1):
        below = 2 ** int(math.log2(scenes))
        return (f"{scenes} Sobol scenes are less even than a power of two such as {below} or {2 * below}",)
    return ()
