"""What an interferometer sees of each order: visibilities along baselines, their envelopes, and who carries them.

The envelope at a baseline is the largest amplitude within one over the diameter of the critical curve to either
side (Johnson et al. 2020, Sci. Adv. 6, eaaz1310, describe such envelopes of photon rings; the window is ours). Baselines
in wavelengths, directions in radians east of north, amplitudes in the unit of the scene's flux.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.ndimage import maximum_filter1d

from raytrace.contract import Array
from ringwright.lightwaves import interpolation_error, visibility
from ringwright.sampling import SampledLight

Complex = NDArray[np.complex128]
# Baselines sampled per fringe of the critical curve: the largest of them misses the crest of |cos| by 0.5 % at most.
PER_FRINGE = 16
# The error is asked for at every so many baselines.
ERROR_EVERY = 48
# An order carries the envelope where it has more than this share of it; being ahead for the last so many fringes of the
# baselines sampled says nothing.
CARRIES = 0.5
LASTING = 2.0
# Null: a minimum of the amplitude below this share of the envelope.
NULL_DEPTH = 0.2
MOST_NULLS = 20
# Baselines on which each null is looked at again, within one step to either side.
CLOSER = 33


@dataclass(frozen=True)
class View:
    """How a screen in M lies on the sky.

    Attributes
    ----------
    theta_g : float
        GM/(c²D) [rad].
    position_angle : float
        Of +β, east of north [rad].
    scale : float
        Flux in the scene's unit per unit of ∫ I dα dβ.
    fringe : float
        One over the diameter of the critical curve [wavelengths].
    """

    theta_g: float
    position_angle: float
    scale: float
    fringe: float


@dataclass(frozen=True)
class Fringes:
    """Visibilities per order on baselines of some directions.

    Attributes
    ----------
    baseline : array (n,)
        [wavelengths]
    position_angle : array (p,)
        [rad]
    visibility : complex array (orders, p, n)
    envelope : array (orders, p, n)
        Of each order.
    total_envelope : array (p, n)
    error : array (p, n)
        Estimated numerical error of the total.
    """

    baseline: Array
    position_angle: Array
    visibility: Complex
    envelope: Array
    total_envelope: Array
    error: Array

    @property
    def total(self) -> Complex:
        """Sum over orders, shape (p, n)."""
        return self.visibility.sum(axis=0)


def fringes(
    light: Sequence[SampledLight], view: View, *, orders: int, longest: float, position_angle: Array
) -> Fringes:
    """Visibilities of every order from 0 to the longest baseline.

    Parameters
    ----------
    light : sequence of SampledLight
    view : View
    orders : int
    longest : float
        [wavelengths]
    position_angle : array (p,)
        Directions of the baselines, east of north [rad].
    """
    count = max(math.ceil(longest / view.fringe * PER_FRINGE), PER_FRINGE) + 1
    baseline = np.linspace(0.0, longest, count)
    found = np.zeros((orders, position_angle.size, count), dtype=np.complex128)
    some = np.union1d(np.arange(0, count, ERROR_EVERY), [count - 1])
    error = np.zeros((position_angle.size, some.size))
    for part in light:
        values = seen(part, view, baseline, position_angle)
        found[part.order] += values
        error += _seen_error(part, view, baseline[some], position_angle, values[:, some])
    width = 2 * round(view.fringe / (baseline[1] - baseline[0])) + 1
    return Fringes(
        baseline,
        position_angle,
        found,
        _envelope(np.abs(found), width),
        _envelope(np.abs(found.sum(axis=0)), width),
        np.array([np.interp(baseline, baseline[some], each) for each in error]),
    )


def seen(part: SampledLight, view: View, baseline: Array, position_angle: Array) -> Complex:
    """Visibilities (p, n) of one order of one emitter in the scene's unit."""
    wavenumber, turn = _grid(view, baseline, position_angle)
    values = view.scale * visibility(part, wavenumber=wavenumber, turn=turn)
    return values.reshape(position_angle.size, baseline.size)


def _seen_error(
    part: SampledLight, view: View, baseline: Array, position_angle: Array, whole: Complex
) -> Array:
    """Error of what `seen` has given on the same baselines."""
    wavenumber, turn = _grid(view, baseline, position_angle)
    values = view.scale * interpolation_error(
        part, wavenumber=wavenumber, turn=turn, whole=whole.ravel() / view.scale
    )
    return values.reshape(position_angle.size, baseline.size)


def _grid(view: View, baseline: Array, position_angle: Array) -> tuple[Array, Array]:
    wavenumber = np.tile(math.tau * view.theta_g * baseline, position_angle.size)
    return wavenumber, np.repeat(view.position_angle - position_angle, baseline.size)


def _envelope(amplitude: Array, width: int) -> Array:
    return np.asarray(maximum_filter1d(amplitude, width, axis=-1, mode="nearest"), dtype=np.float64)


def first_carried(found: Fringes, order: int, view: View, *, above: float = 0.0) -> Array:
    """Baseline beyond which an order has more than half of the envelope until a higher one has more than it, per
    direction [wavelengths].

    Parameters
    ----------
    found : Fringes
    order : int
    view : View
    above : float
        The order's envelope must also exceed this there, in the scene's unit.

    Returns
    -------
    array (p,)
        NaN where there is none within the baselines sampled, some fringes at their end aside.
    """
    mine = found.envelope[order]
    ahead = mine > CARRIES * found.total_envelope
    overtaken = np.any(found.envelope[order + 1 :] >= mine, axis=0)
    lasting = max(1, math.ceil(LASTING * view.fringe / (found.baseline[1] - found.baseline[0])))
    first = np.full(found.position_angle.size, np.nan)
    for row in range(first.size):
        behind = np.flatnonzero(~(ahead[row] | overtaken[row]))
        start = behind[-1] + 1 if behind.size else 0
        where = np.flatnonzero(ahead[row, start:-lasting] & (mine[row, start:-lasting] > above))
        if where.size:
            first[row] = found.baseline[start + where[0]]
    return first


def trusted_baseline(found: Fringes, share: float) -> float:
    """Longest baseline [wavelengths] up to which the error stays below a share of the envelope in every direction."""
    wrong = np.any(found.error > share * found.total_envelope, axis=0)
    return float(found.baseline[np.argmax(wrong) - 1] if wrong.any() else found.baseline[-1])


def nulls(light: Sequence[SampledLight], view: View, found: Fringes, row: int) -> tuple[Array, Array]:
    """The first nulls of the total along one direction, each looked at closely.

    Parameters
    ----------
    light, view, found
        What `fringes` was given, and what it returned.
    row : int
        Of the direction.

    Returns
    -------
    place, depth : arrays (m,)
        Baselines [wavelengths], and the amplitude there over the envelope.
    """
    rough, least = minima(found.baseline, np.abs(found.total[row]))
    envelope = np.interp(rough, found.baseline, found.total_envelope[row])
    deep = np.flatnonzero(least < NULL_DEPTH * envelope)[:MOST_NULLS]
    if not deep.size:
        return np.empty(0), np.empty(0)
    step = found.baseline[1] - found.baseline[0]
    near = rough[deep, None] + step * np.linspace(-1.0, 1.0, CLOSER)
    direction = found.position_angle[row : row + 1]
    amplitude = np.abs(sum(seen(part, view, near.ravel(), direction)[0] for part in light)).reshape(
        near.shape
    )
    closely = [minima(places, values) for places, values in zip(near, amplitude, strict=True)]
    best = [(places[0], values[0]) if places.size else (math.nan, math.nan) for places, values in closely]
    place, value = np.array(best).T
    return place, value / envelope[deep]


def minima(baseline: Array, amplitude: Array) -> tuple[Array, Array]:
    """Minima of an amplitude sampled at equal steps, by a parabola through the square at three points: places and
    amplitudes.
    """
    square = amplitude**2
    left, here, right = square[:-2], square[1:-1], square[2:]
    at = np.flatnonzero((here < left) & (here <= right))
    bend = left[at] - 2.0 * here[at] + right[at]
    shift = 0.5 * (left[at] - right[at]) / bend
    value = here[at] - 0.125 * (left[at] - right[at]) ** 2 / bend
    step = baseline[1] - baseline[0]
    return baseline[at + 1] + shift * step, np.sqrt(np.maximum(value, 0.0))
