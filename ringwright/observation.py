"""Observation files: a ring diameter, how it was read, the distance, and priors.

Every number carries its error; a number with two errors is a two-piece normal with its mode at the value. The resolution of a
diameter has no default: whether it was read on a smoothed image or corrected for the smoothing moves the mass by 10 to 20 %.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, field
from pathlib import Path
from typing import Annotated, Any, Literal

from astropy import units as u
from pydantic import Field

from ringwright.scenes.errors import SceneError
from ringwright.scenes.models import Name, Strict
from ringwright.scenes.starters import example
from ringwright.scenes.validation import dotted, examined, read_document
from ringwright.units import KINDS, parse_given, plain_number, shown, unit_size

UNLIKE = 10.0  # units of a value and its error that differ by this factor are taken for a slip
ESTIMATORS = ("peak-ring",)
WHY_NO_RESOLUTION = (
    "because the choice moves the mass by 10 to 20 %: give the FWHM that the image had "
    'when the diameter was read, such as "20 uas", an interval such as ["15 uas", "25 uas"], or "none" for a '
    "diameter that is already corrected for resolution or was fitted as a model"
)


class NumberTable(Strict):
    """A value with its error."""

    value: Any
    error: Any


class DiameterTable(Strict):
    """The ring diameter and how it was read."""

    value: Annotated[Any, Field(examples=['"42 uas"'])]
    error: Annotated[Any, Field(examples=['"3 uas"'])]
    resolution: Annotated[Any, Field(description=WHY_NO_RESOLUTION)]
    estimator: Annotated[str, Field(examples=[f'"{ESTIMATORS[0]}"'])]


class PriorTable(Strict):
    """What is known besides the ring."""

    mass: NumberTable | None = None
    theta_g: NumberTable | None = None
    theta_g_shape: Literal["log", "flat"] = "log"
    scene: dict[str, NumberTable] = Field(default_factory=dict)


class ObservationFile(Strict):
    """A whole observation file."""

    name: Name
    diameter: DiameterTable
    distance: NumberTable | None = None
    prior: PriorTable = Field(default_factory=PriorTable)


@dataclass(frozen=True)
class Measurement:
    """A number with errors upward and downward, all in one unit: a two-piece normal with its mode at the value."""

    value: u.Quantity
    plus: u.Quantity
    minus: u.Quantity


@dataclass(frozen=True)
class Observation:
    """One observed ring.

    Attributes
    ----------
    name, path, text : str
    diameter : Measurement
        [µas]
    resolution : tuple of Quantity
        Empty for a diameter that is corrected already, one FWHM, or the two ends of an interval [µas].
    estimator : str
    distance, mass, theta_g : Measurement or None
        [Mpc], [solMass], [µas]; mass and theta_g are priors.
    theta_g_shape : str
        "log" for a prior flat in ln θ_g, "flat" for one flat in θ_g.
    scene_priors : dict
        Priors on scene parameters by key.
    unlike_units : tuple of str
        Numbers whose error stands in a unit of another size, which is a slip more often than not.
    of_example : tuple of str
        Which of "diameter" and "distance" still hold the invented numbers of the commented example.
    """

    name: str
    path: str
    text: str
    diameter: Measurement
    resolution: tuple[u.Quantity, ...]
    estimator: str
    distance: Measurement | None = None
    mass: Measurement | None = None
    theta_g: Measurement | None = None
    theta_g_shape: str = "log"
    scene_priors: dict[str, Measurement] = field(default_factory=dict)
    unlike_units: tuple[str, ...] = ()
    of_example: tuple[str, ...] = ()


def load_observation(path: str | Path) -> Observation:
    """Read an observation file.

    Raises
    ------
    SceneError
        With every problem of the file: line, key, what was given and what is accepted.
    """
    document = read_document(path, "observation")
    model, problems = examined(ObservationFile, document)
    reader = _Reader()
    diameter, distance = model.diameter, model.distance
    prior = model.prior or PriorTable()
    numbers = {
        "diameter": reader.optional(("diameter",), diameter, "sky angle"),
        "distance": reader.optional(("distance",), distance, "distance"),
        "mass": reader.optional(("prior", "mass"), prior.mass, "mass"),
        "theta_g": reader.optional(("prior", "theta_g"), prior.theta_g, "sky angle"),
    }
    scene_priors = {
        key: reader.scene_number(("prior", "scene", key), table) for key, table in prior.scene.items()
    }
    resolution = () if diameter is None else reader.resolution(diameter.resolution)
    reader.conflicts(diameter, prior, has_distance="distance" in document.data)
    if problems or reader.found:
        raise SceneError([*problems, *(document.problem(*one) for one in reader.found)])
    return Observation(
        name=model.name,
        path=document.path,
        text=document.text,
        resolution=resolution,
        estimator=diameter.estimator,
        theta_g_shape=prior.theta_g_shape,
        scene_priors=scene_priors,
        unlike_units=tuple(reader.unlike),
        of_example=_of_example(document.data),
        **numbers,  # type: ignore[arg-type]
    )


def _of_example(data: dict[str, Any]) -> tuple[str, ...]:
    invented = example("observation")
    return tuple(key for key in ("diameter", "distance") if data.get(key) == invented[key])


class _Reader:
    """Reads numbers with errors, and keeps what is wrong with them and what is odd."""

    def __init__(self) -> None:
        self.found: list[tuple[tuple[str | int, ...], str]] = []
        self.unlike: list[str] = []

    def number(self, place: tuple[str, ...], table: Any, kind: str, *, positive: bool = True) -> Measurement:
        value = self.part((*place, "value"), table.value, kind)
        plus, minus = self.errors((*place, "error"), table.error, kind)
        if positive and value <= 0.0:
            self.found.append(((*place, "value"), f"{shown(table.value)} is not positive"))
        if kind and not (math.isnan(value) or math.isnan(plus + minus)):
            self.compare_units(dotted(place), table, kind)
        unit = KINDS[kind][0] if kind else ""
        return Measurement(*(number * u.Unit("" if unit == "M" else unit) for number in (value, plus, minus)))

    def compare_units(self, name: str, table: Any, kind: str) -> None:
        """Note a value and an error whose units differ tenfold or more."""
        errors = list(table.error.values()) if isinstance(table.error, dict) else [table.error]
        ratios = [unit_size(error, kind) / unit_size(table.value, kind) for error in errors]
        if any(max(ratio, 1.0 / ratio) >= UNLIKE for ratio in ratios):
            self.unlike.append(f"{name}: {table.value} with an error of {' and '.join(errors)}")

    def errors(self, place: tuple[str, ...], given: Any, kind: str) -> tuple[float, float]:
        """Errors upward and downward."""
        if not isinstance(given, dict):
            both = self.error(place, given, kind)
            return both, both
        if set(given) != {"plus", "minus"}:
            self.found.append((place, "write one error, or { plus = …, minus = … }"))
            return math.nan, math.nan
        plus, minus = (self.error((*place, side), given[side], kind) for side in ("plus", "minus"))
        return plus, minus

    def error(self, place: tuple[str, ...], given: Any, kind: str) -> float:
        error = self.part(place, given, kind)
        if error <= 0.0:
            text = f"an error of {shown(given)} is not positive; a measurement without an error cannot be compared"
            self.found.append((place, text))
        return error

    def optional(
        self, place: tuple[str, ...], table: NumberTable | DiameterTable | None, kind: str
    ) -> Measurement | None:
        return None if table is None else self.number(place, table, kind)

    def scene_number(self, place: tuple[str, ...], table: NumberTable) -> Measurement:
        """A prior on a scene parameter: a length in M, an angle or a plain number."""
        text = table.value if isinstance(table.value, str) else ""
        kind = "length" if text.strip().endswith("M") else "angle" if text else ""
        return self.number(place, table, kind, positive=False)

    def part(self, place: tuple[str, ...], value: Any, kind: str) -> float:
        try:
            return parse_given(value, kind) if kind else plain_number(value)
        except ValueError as problem:
            self.found.append((place, str(problem)))
            return math.nan

    def resolution(self, given: Any) -> tuple[u.Quantity, ...]:
        place = ("diameter", "resolution")
        if given == "none":
            return ()
        values = given if isinstance(given, list) else [given]
        numbers = [self.part(place, value, "sky angle") for value in values]
        if any(math.isnan(number) for number in numbers):
            return ()
        if len(numbers) not in (1, 2):
            self.found.append((place, 'give one FWHM, an interval of two, or "none"'))
        elif any(number <= 0.0 for number in numbers):
            self.found.append(
                (place, f'{shown(given)} is not positive; write "none" for a corrected diameter')
            )
        elif len(numbers) == 2 and not numbers[0] < numbers[1]:
            text = f"the interval {shown(given)} runs the wrong way round; write the smaller end first"
            self.found.append((place, text))
        return tuple(number * u.uas for number in numbers)

    def conflicts(self, diameter: DiameterTable | None, prior: PriorTable, *, has_distance: bool) -> None:
        if diameter is not None and diameter.estimator not in ESTIMATORS:
            text = f"'{diameter.estimator}' is not an estimator of ours; accepted: {', '.join(ESTIMATORS)} (docs/measuring.md)"
            self.found.append((("diameter", "estimator"), text))
        if prior.mass is not None and prior.theta_g is not None:
            text = (
                "a prior on the mass stands here too: with the distance that would be three statements about two "
                "numbers; keep mass or theta_g"
            )
            self.found.append((("prior", "theta_g"), text))
        elif prior.mass is not None and not has_distance:
            text = "a prior on the mass needs a distance to become an angle on the sky; add [distance]"
            self.found.append((("prior", "mass"), text))
