"""One parameter of a scan: how it varies, which is its prior, and how it is drawn.

A range is uniform, a log range uniform in the logarithm, a cosine range (for inclinations) uniform in the cosine; a list gives
equal weights. Numbers are kept in M, rad or without a unit.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Any, Literal

import numpy as np
from numpy.typing import NDArray

from ringwright.units import parse_given, plain_number

Array = NDArray[np.float64]
Kind = Literal["range", "log_range", "cosine_range", "list"]
KINDS: tuple[Kind, ...] = ("range", "log_range", "cosine_range", "list")


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
        return np.array([number_and_unit(value)[0] for value in values])

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


def number_and_unit(value: Any) -> tuple[float, str]:
    """A plain number and its unit, "M", "rad" or none."""
    if not isinstance(value, str):
        return plain_number(value), ""
    kind = "length" if value.strip().endswith("M") else "angle"
    return parse_given(value, kind), "M" if kind == "length" else "rad"
