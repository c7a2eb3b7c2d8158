"""The diameter of a photon ring as the spacing of its fringes tells it, direction by direction.

A thin ring's visibility falls as u^−½ and oscillates with the period 1/d, d being its width between the two tangents
across the baseline (Johnson et al. 2020, Sci. Adv. 6, eaaz1310; Gralla, Lupsasca & Marrone 2020, PRD 102, 124004);
the minima of the amplitude are numbered and a straight line through them has the slope 1/d. Baselines in
wavelengths, angles in radians, diameters in M.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from raytrace.contract import Array
from ringwright.profiling.fringes import PER_FRINGE, View, minima, seen
from ringwright.sampling import SampledLight

# Decimals of a radian to which directions are told apart.
SAME_DIRECTION = 12
# The first minimum of a ring is not yet at its place; more than so many say nothing new.
SKIPPED = 1.25
MOST_FRINGES = 40.0
FEWEST_MINIMA = 4
# A ring is thin to baselines below this share of 1/(2π × its width): its amplitude has not begun to fall for that.
THIN = 1.0


@dataclass(frozen=True)
class Spacing:
    """Diameters of one order against direction.

    Attributes
    ----------
    order : int
    position_angle : array (p,)
        Of the baseline, that is of the diameter [rad].
    diameter, error : arrays (p,)
        [M]; NaN where too few minima are there.
    first, last : float
        The baselines that were used [wavelengths].
    note : str
        Why there is none; empty where there is.
    """

    order: int
    position_angle: Array
    diameter: Array
    error: Array
    first: float
    last: float
    note: str


def ring_diameters(
    light: Sequence[SampledLight],
    view: View,
    *,
    order: int,
    width: float,
    longest: float,
    position_angle: Array,
) -> Spacing:
    """Diameter of an order's ring from the spacing of its fringes.

    Parameters
    ----------
    light : sequence of SampledLight
    view : View
    order : int
    width : float
        Of the ring, as the root of its second moment [M].
    longest : float
        Longest baseline to use [wavelengths].
    position_angle : array (p,)
        Equally spaced over half a turn or a whole one [rad].
    """
    thin = THIN / (math.tau * width * view.theta_g) if width > 0.0 else 0.0
    first, last = SKIPPED * view.fringe, min(longest, thin, MOST_FRINGES * view.fringe)
    blank = np.full(position_angle.size, np.nan)
    if not last - first > FEWEST_MINIMA * view.fringe:
        return Spacing(
            order, position_angle, blank, blank, first, max(last, first), _too_few(order, thin, longest, view)
        )
    count = math.ceil((last - first) / view.fringe * PER_FRINGE) + 1
    baseline = np.linspace(first, last, count)
    # A baseline and its reverse see the same amplitude.
    half_turn, place = np.unique(np.round(position_angle % math.pi, SAME_DIRECTION), return_inverse=True)
    mine = [part for part in light if part.order == order]
    amplitude = np.abs(sum(seen(part, view, baseline, half_turn) for part in mine))
    fitted = np.array([_spacing(minima(baseline, row)[0]) for row in amplitude])[place]
    diameter = 1.0 / (fitted[:, 0] * view.theta_g)
    return Spacing(order, position_angle, diameter, diameter * fitted[:, 1] / fitted[:, 0], first, last, "")


def _too_few(order: int, thin: float, longest: float, view: View) -> str:
    limit = "the baselines end" if longest < thin else "the ring is resolved across its width"
    return (
        f"order {order} has fewer than {FEWEST_MINIMA} fringes that tell its diameter before {limit}, "
        f"at {min(thin, longest) / 1e9:.3g} Gλ ({min(thin, longest) / view.fringe:.2g} fringes)"
    )


def _spacing(places: Array) -> tuple[float, float]:
    """Spacing of numbered minima and its error: the fit's own, and half of what its two halves differ by."""
    if places.size < FEWEST_MINIMA:
        return math.nan, math.nan
    number = np.round((places - places[0]) / np.median(np.diff(places)))
    slope, scatter = _line(number, places)
    middle = places.size // 2
    halves = [_line(number[part], places[part])[0] for part in (slice(0, middle + 1), slice(middle, None))]
    return slope, math.hypot(scatter, 0.5 * (halves[1] - halves[0]))


def _line(x: Array, y: Array) -> tuple[float, float]:
    """Slope of a straight line by least squares, and its standard error (none for two points)."""
    away = x - x.mean()
    slope = float(np.sum(away * y) / np.sum(away**2))
    rest = y - y.mean() - slope * away
    freedom = max(x.size - 2, 1)
    return slope, math.sqrt(float(np.sum(rest**2)) / freedom / float(np.sum(away**2)))
