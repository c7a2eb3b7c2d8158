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

from ringwright.scenes.models import Strict
from ringwright.scenes.validation import Document, read_document, register, validated
from ringwright.units import KINDS, parse_given

ESTIMATORS = ("peak-ring",)
NO_RESOLUTION = (
    "is missing and has no default, because the choice moves the mass by 10 to 20 %: give the FWHM that the image had "
    'when the diameter was read, such as "20 uas", an interval such as ["15 uas", "25 uas"], or "none" for a '
    "diameter that is already corrected for resolution or was fitted as a model"
)


class TwoErrors(Strict):
    """Errors upward and downward."""

    plus: Any
    minus: Any


class NumberTable(Strict):
    """A value with its error."""

    value: Any
    error: Any


class DiameterTable(Strict):
    """The ring diameter and how it was read."""

    value: Any
    error: Any
    resolution: Any = None
    estimator: str


class PriorTable(Strict):
    """What is known besides the ring."""

    mass: NumberTable | None = None
    theta_g: NumberTable | None = None
    theta_g_shape: Literal["log", "flat"] = "log"
    scene: dict[str, NumberTable] = Field(default_factory=dict)


class ObservationFile(Strict):
    """A whole observation file."""

    name: Annotated[str, Field(pattern=r"^[A-Za-z0-9][A-Za-z0-9._-]*$")]
    diameter: DiameterTable
    distance: NumberTable | None = None
    prior: PriorTable = Field(default_factory=PriorTable)


register(ObservationFile)


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


def load_observation(path: str | Path) -> Observation:
    """Read an observation file.

    Raises
    ------
    SceneError
        With every problem of the file: line, key, what was given and what is accepted.
    """
    document = read_document(path)
    model = validated(ObservationFile, document)
    reader = _Reader(document)
    prior = model.prior
    observation = Observation(
        name=model.name,
        path=document.path,
        text=document.text,
        diameter=reader.number(("diameter",), model.diameter, "sky angle"),
        resolution=reader.resolution(model.diameter.resolution),
        estimator=model.diameter.estimator,
        distance=reader.optional(("distance",), model.distance, "distance"),
        mass=reader.optional(("prior", "mass"), prior.mass, "mass"),
        theta_g=reader.optional(("prior", "theta_g"), prior.theta_g, "sky angle"),
        theta_g_shape=prior.theta_g_shape,
        scene_priors={
            key: reader.scene_number(("prior", "scene", key), table) for key, table in prior.scene.items()
        },
    )
    reader.conflicts(model)
    if reader.found:
        raise document.error(*reader.found)
    return observation


class _Reader:
    """Reads numbers with errors, and keeps what is wrong with them."""

    def __init__(self, document: Document) -> None:
        self.document = document
        self.found: list[tuple[tuple[str | int, ...], str]] = []

    def number(self, place: tuple[str, ...], table: Any, kind: str, *, positive: bool = True) -> Measurement:
        value = self.part((*place, "value"), table.value, kind)
        errors = table.error if isinstance(table.error, dict) else {"plus": table.error, "minus": table.error}
        if set(errors) != {"plus", "minus"}:
            self.found.append(((*place, "error"), "write one error, or { plus = …, minus = … }"))
            errors = {}
        plus, minus = (
            self.part(self.within(place, table, side), errors[side], kind) if side in errors else math.nan
            for side in ("plus", "minus")
        )
        for side, error in (("plus", plus), ("minus", minus)):
            if error <= 0.0:
                text = f"an error of {errors[side]!r} is not positive; a measurement without an error cannot be compared"
                self.found.append((self.within(place, table, side), text))
        if positive and value <= 0.0:
            self.found.append(((*place, "value"), f"{table.value!r} is not positive"))
        unit = KINDS[kind][0] if kind in KINDS else kind
        return Measurement(*(number * u.Unit("" if unit == "M" else unit) for number in (value, plus, minus)))

    def optional(self, place: tuple[str, ...], table: NumberTable | None, kind: str) -> Measurement | None:
        return None if table is None else self.number(place, table, kind)

    def scene_number(self, place: tuple[str, ...], table: NumberTable) -> Measurement:
        """A prior on a scene parameter: a length in M, an angle or a plain number."""
        text = table.value if isinstance(table.value, str) else ""
        kind = "length" if text.strip().endswith("M") else "angle" if text else ""
        return self.number(place, table, kind, positive=False)

    def within(self, place: tuple[str, ...], table: Any, side: str) -> tuple[str, ...]:
        return (*place, "error", side) if isinstance(table.error, dict) else (*place, "error")

    def part(self, place: tuple[str, ...], value: Any, kind: str) -> float:
        try:
            if kind:
                return parse_given(value, kind)
            if isinstance(value, bool) or not isinstance(value, int | float):
                raise ValueError(f"{value!r} is not a number")
            return float(value)
        except ValueError as problem:
            self.found.append((place, str(problem)))
            return math.nan

    def resolution(self, given: Any) -> tuple[u.Quantity, ...]:
        place = ("diameter", "resolution")
        if given is None:
            self.found.append((place, NO_RESOLUTION))
            return ()
        if given == "none":
            return ()
        values = given if isinstance(given, list) else [given]
        numbers = [self.part(place, value, "sky angle") for value in values]
        if len(numbers) not in (1, 2):
            self.found.append((place, 'give one FWHM, an interval of two, or "none"'))
        elif any(number <= 0.0 for number in numbers):
            self.found.append((place, f'{given!r} is not positive; write "none" for a corrected diameter'))
        elif len(numbers) == 2 and not numbers[0] < numbers[1]:
            self.found.append(
                (place, f"the interval {given!r} runs the wrong way round; write the smaller end first")
            )
        return tuple(number * u.uas for number in numbers)

    def conflicts(self, model: ObservationFile) -> None:
        estimator, prior = model.diameter.estimator, model.prior
        if estimator not in ESTIMATORS:
            text = f"'{estimator}' is not an estimator of ours; accepted: {', '.join(ESTIMATORS)} (docs/measuring.md)"
            self.found.append((("diameter", "estimator"), text))
        if prior.mass is not None and prior.theta_g is not None:
            text = (
                "a prior on the mass stands here too: with the distance that would be three statements about two "
                "numbers; keep mass or theta_g"
            )
            self.found.append((("prior", "theta_g"), text))
        elif prior.mass is not None and model.distance is None:
            text = "a prior on the mass needs a distance to become an angle on the sky; add [distance]"
            self.found.append((("prior", "mass"), text))
