"""Brightness of a disk against radius from numbers: two columns of a plain text file, or two sequences.

Between the numbers runs the monotone piecewise cubic of Fritsch & Carlson (1980, SIAM J. Numer. Anal. 17,
238) with the slopes of Fritsch & Butland (1984, SIAM J. Sci. Stat. Comput. 5, 300; formula from memory),
which never overshoots and so is never negative. Radii in M = 1; brightness in any unit.
"""

from __future__ import annotations

import re
from dataclasses import dataclass, field
from pathlib import Path
from typing import ClassVar

import numpy as np
from numpy.typing import ArrayLike

from emission.contract import Array
from emission.profiles import SMALLEST_EDGE
from raytrace.contract import Spacetime

# Units in an ECSV header that leave a radius the number that is meant here.
UNITS_OF_RADIUS = {"", "1", "M"}
# The screen gives every edge a panel. Curvature jumps at the rows of a short table are worth one each; a
# long table is smooth at the scale of the panels that its ends alone lead to.
MOST_EDGES = 24


@dataclass(frozen=True, kw_only=True)
class Table:
    """Brightness interpolated between tabulated radii, 0 outside them.

    Parameters
    ----------
    radii : sequence of float
        At least two, ascending, from 2 outward [M].
    values : sequence of float
        Brightness there: as many, finite, not negative, not all zero; in any unit.

    Raises
    ------
    ValueError
        If the numbers are not such.
    """

    radii: tuple[float, ...]
    values: tuple[float, ...]
    bolometric: ClassVar[bool] = False
    _slopes: Array = field(init=False, repr=False, compare=False)

    def __post_init__(self) -> None:
        r, value = np.asarray(self.radii, dtype=np.float64), np.asarray(self.values, dtype=np.float64)
        _check(r, value)
        object.__setattr__(self, "radii", tuple(r.tolist()))
        object.__setattr__(self, "values", tuple(value.tolist()))
        object.__setattr__(self, "_slopes", _monotone_slopes(r, value))

    @classmethod
    def read(cls, file: str | Path) -> Table:
        """Read a table from two columns of text, radius [M] and brightness, separated by blanks or commas.

        Lines that begin with # are comments, and one line of column names is allowed, so that ECSV and CSV
        files are read as they are. An ECSV header that gives the radius a unit must give M or 1.

        Raises
        ------
        ValueError
            If the file is not such a table; the message names the file and the line.
        OSError
            If the file cannot be read.
        """
        path = Path(file)
        radii, values = _columns(path.read_text(encoding="utf-8"), path.name)
        try:
            return cls(radii=radii, values=values)
        except ValueError as error:
            raise ValueError(f"{path.name}: {error}") from None

    @property
    def edges(self) -> tuple[float, ...]:
        """Bounds of the support [M] and, in a table of up to 24 rows, the radii between, where the curvature
        jumps."""
        return self.radii if len(self.radii) <= MOST_EDGES else (self.radii[0], self.radii[-1])

    def brightness(self, radius: ArrayLike, *, spacetime: Spacetime | None = None) -> Array:
        """Brightness at radii [M], in the table's unit; 0 outside the table."""
        r = np.asarray(radius, dtype=np.float64)
        knots, values = np.asarray(self.radii), np.asarray(self.values)
        i = np.clip(np.searchsorted(knots, r, side="right") - 1, 0, knots.size - 2)
        step = knots[i + 1] - knots[i]
        x = (r - knots[i]) / step
        cubic = (
            (1.0 + 2.0 * x) * (1.0 - x) ** 2 * values[i]
            + x**2 * (3.0 - 2.0 * x) * values[i + 1]
            + step * x * (1.0 - x) * ((1.0 - x) * self._slopes[i] - x * self._slopes[i + 1])
        )
        within = (r >= knots[0]) & (r <= knots[-1])
        # Rounding may leave −1e-17 where a monotone piece ends at zero.
        return np.where(within, np.maximum(cubic, 0.0), 0.0)[()]


def _check(r: Array, value: Array) -> None:
    if r.ndim != 1 or r.shape != value.shape or r.size < 2:
        raise ValueError(
            f"a table of brightness needs at least two radii and as many values; given are {r.size} and "
            f"{value.size}"
        )
    if not (np.all(np.isfinite(r)) and np.all(np.diff(r) > 0.0)):
        raise ValueError("the radii of a table of brightness must be finite and ascend from row to row")
    if r[0] < SMALLEST_EDGE:
        raise ValueError(
            f"the first radius of the table, {r[0]:g} M, lies inside the horizon; begin at "
            f"{SMALLEST_EDGE:g} M or outside"
        )
    if not (np.all(np.isfinite(value)) and np.min(value) >= 0.0 and np.max(value) > 0.0):
        raise ValueError("the brightness in a table must be finite, nowhere negative and somewhere positive")


def _monotone_slopes(r: Array, value: Array) -> Array:
    """Slopes at the knots: weighted harmonic means of the neighbouring secants, 0 where these change sign."""
    step, secant = np.diff(r), np.diff(value) / np.diff(r)
    slopes = np.zeros_like(r)
    # At the ends the secant itself: it keeps the piece monotone, to first order.
    slopes[0], slopes[-1] = secant[0], secant[-1]
    before, after = 2.0 * step[1:] + step[:-1], step[1:] + 2.0 * step[:-1]
    same = secant[:-1] * secant[1:] > 0.0
    left, right = np.where(same, secant[:-1], 1.0), np.where(same, secant[1:], 1.0)
    slopes[1:-1] = np.where(same, (before + after) / (before / left + after / right), 0.0)
    return slopes


def _columns(text: str, name: str) -> tuple[tuple[float, ...], tuple[float, ...]]:
    _check_unit(text, name)
    rows: list[tuple[float, ...]] = []
    named = False
    for number, line in enumerate(text.splitlines(), start=1):
        words = line.replace(",", " ").split()
        if not words or words[0].startswith("#"):
            continue
        try:
            row = tuple(float(word) for word in words)
        except ValueError:
            if rows or named:
                raise ValueError(f"{name}, line {number}: '{line.strip()}' is not two numbers") from None
            named = True
            continue
        if len(row) != 2:
            raise ValueError(
                f"{name}, line {number}: {len(row)} columns where two are due, radius [M] and brightness"
            )
        rows.append(row)
    if not rows:
        raise ValueError(f"{name} has no rows; a table needs two columns, radius [M] and brightness")
    radii, values = zip(*rows, strict=True)
    return radii, values


def _check_unit(text: str, name: str) -> None:
    """Refuse an ECSV header whose first column carries a unit other than M."""
    column = re.search(r"^#\s*-\s*\{(.*)\}", text, flags=re.MULTILINE)
    unit = re.search(r"unit:\s*'?\"?([^,'\"}]*)", column.group(1)) if column else None
    if unit and unit.group(1).strip() not in UNITS_OF_RADIUS:
        raise ValueError(
            f"{name} gives the radius in {unit.group(1).strip()}; a table of brightness takes radii in M, "
            "as plain numbers"
        )
