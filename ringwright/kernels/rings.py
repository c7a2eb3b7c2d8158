"""Kernels of the ring estimator: sampling a smooth image along rays, peaks, the centre, widths, moments.

Cubic B-splines (Unser 1999, IEEE Signal Processing Magazine 16, 22) on the coefficients that
ring/smoothing.py makes; the ring's definitions are steps 2 to 6 of the estimator in docs/measuring.md.
Lengths are in samples of the coefficient grid, angles are position angles, so a ray steps (drow, dcol) =
(cos, -sin): row grows to the north, column to the west.
"""

from __future__ import annotations

import math
from typing import Any

import numpy as np

from raytrace.kernels.compiling import kernel
from ringwright.kernels.splines import climb, value

# A sample a quarter of the FWHM apart misses at most (1/8)²·4 ln2 = 4.3 % of a peak: every local maximum
# within 10 % of the highest sample is refined before the highest peak is named.
CONTENDER = 0.90
BISECTIONS = 36
# Trial centres: the flux centroid and this many hexagonal rings around it, each judged on every fifth ray.
SCOUT_RINGS = 3
STARTS = 3  # trial centres to step down from, unless the first one leads to a fair circle
FAIR_CIRCLE = 0.03**2  # variance over squared mean
TIE = 1e-9
COARSE_STRIDE = 5
HARMONIC_STEPS = 4
HARMONIC_DONE = 0.01  # of the mean radius: near enough for Gauss-Newton
# Gauss-Newton on the peak radii polishes the centre; its slopes are differences over this share of the mean
# radius.
DIFFERENCE = 1e-4
POLISHES = 5
CENTRE_TOLERANCE = 1e-6  # [mean radius]; moves a diameter by less than that times the scatter
HALVINGS = 4
# A trial centre with more than this share of its rays at a limit has no ring around it (step 7); between two
# of those the one with fewer is nearer to a ring. Without this a bright knot would win: seen from its top
# every ray peaks at the start.
LIMIT_SHARE = 0.05
NO_CENTRE = 1e3  # far above any dispersion
HOPELESS = 0.5  # share of rays at a limit from which no step leads to a ring
RING_RADII = 16  # radii between the two edges of the ring for the azimuthal moments
DISK_RADII = 6  # equal-area annuli of the central disk


@kernel()
def find_peak(
    coef: Any, row: float, col: float, drow: float, dcol: float, start: float, stop: float, samples: Any
) -> tuple[float, float, bool]:
    """The highest peak of one ray: its radius, its height, and whether it is a limit of the search."""
    count = samples.size
    step = (stop - start) / (count - 1)
    highest = 0.0
    for k in range(count):
        r = start + k * step
        samples[k] = value(coef, row + r * drow, col + r * dcol)
        highest = max(highest, samples[k])
    radius = start
    peak = samples[0]
    at_limit = True
    if samples[count - 1] > peak:
        radius = stop
        peak = samples[count - 1]
    for k in range(1, count - 1):
        here = samples[k]
        if here <= 0.0 or here < CONTENDER * highest or here < samples[k - 1] or here <= samples[k + 1]:
            continue
        r = start + k * step
        r = climb(coef, row, col, drow, dcol, r - step, r + step, r)
        height = value(coef, row + r * drow, col + r * dcol)
        if height > peak:
            radius, peak, at_limit = r, height, False
    return radius, peak, at_limit


@kernel()
def peaks_around(
    coef: Any,
    row: float,
    col: float,
    turn: Any,
    start: float,
    stop: float,
    samples: Any,
    radius: Any,
    height: Any,
) -> int:
    """Peaks along as many rays of `turn` (2, rays) = (cos, -sin) as `radius` holds; returns how many are limits."""
    stride = turn.shape[1] // radius.size
    limits = 0
    for k in range(radius.size):
        drow = turn[0, k * stride]
        dcol = turn[1, k * stride]
        radius[k], height[k], at_limit = find_peak(coef, row, col, drow, dcol, start, stop, samples)
        limits += at_limit
    return limits


@kernel()
def dispersion(radius: Any) -> tuple[float, float]:
    """Mean radius, and variance over squared mean, of the peaks around a trial centre."""
    mean = 0.0
    for r in radius:
        mean += r
    mean /= radius.size
    variance = 0.0
    for r in radius:
        variance += (r - mean) ** 2
    return mean, variance / radius.size / (mean * mean)


@kernel()
def demerit(radius: Any, limits: int) -> float:
    """What the search for a centre makes small: the dispersion, and before it the rays without a peak."""
    spread = dispersion(radius)[1]
    share = limits / radius.size
    return spread if share <= LIMIT_SHARE else NO_CENTRE * (1.0 + share) + spread


@kernel()
def follow(
    coef: Any,
    row: float,
    col: float,
    turn: Any,
    ridge: Any,
    by_row: float,
    by_col: float,
    reach: float,
    out: Any,
) -> float:
    """Dispersion about a centre moved by a little; every peak is followed from where it was."""
    for k in range(ridge.size):
        drow = turn[0, k]
        dcol = turn[1, k]
        guess = ridge[k] - by_row * drow - by_col * dcol
        out[k] = climb(coef, row + by_row, col + by_col, drow, dcol, guess - reach, guess + reach, guess)
    return dispersion(out)[1]


@kernel()
def polish(
    coef: Any, row: float, col: float, turn: Any, ridge: Any, size: float, reach: float
) -> tuple[float, float]:
    """One Gauss-Newton step toward the least dispersion; the slopes are differences over `size`."""
    here = np.empty(ridge.size)
    north = np.empty(ridge.size)
    west = np.empty(ridge.size)
    least = follow(coef, row, col, turn, ridge, 0.0, 0.0, reach, here)
    follow(coef, row, col, turn, ridge, size, 0.0, reach, north)
    follow(coef, row, col, turn, ridge, 0.0, size, reach, west)
    means = dispersion(here)[0], dispersion(north)[0], dispersion(west)[0]
    h00 = h11 = h01 = g0 = g1 = 0.0
    for k in range(ridge.size):
        off = here[k] / means[0]
        by_north = north[k] / means[1] - off
        by_west = west[k] / means[2] - off
        h00 += by_north * by_north
        h11 += by_west * by_west
        h01 += by_north * by_west
        g0 += by_north * (off - 1.0)
        g1 += by_west * (off - 1.0)
    determinant = h00 * h11 - h01 * h01
    if not determinant > 0.0:
        return 0.0, 0.0
    by_row = size * (h01 * g1 - h11 * g0) / determinant
    by_col = size * (h01 * g0 - h00 * g1) / determinant
    for _ in range(HALVINGS):
        if follow(coef, row, col, turn, ridge, by_row, by_col, reach, here) < least:
            return by_row, by_col
        by_row *= 0.5
        by_col *= 0.5
    return 0.0, 0.0


@kernel()
def _within(row: float, col: float, about_row: float, about_col: float, reach: float) -> tuple[float, float]:
    away = math.hypot(row - about_row, col - about_col)
    if away <= reach:
        return row, col
    return about_row + (row - about_row) * reach / away, about_col + (col - about_col) * reach / away


@kernel()
def first_harmonic(radius: Any, turn: Any) -> tuple[float, float]:
    """How far a circle seen from within lies off the point it is seen from."""
    by_row = 0.0
    by_col = 0.0
    for k in range(radius.size):
        by_row += 2.0 * radius[k] * turn[0, k]
        by_col += 2.0 * radius[k] * turn[1, k]
    return by_row / radius.size, by_col / radius.size


@kernel()
def scout_centres(
    coef: Any,
    about_row: float,
    about_col: float,
    reach: float,
    turn: Any,
    start: float,
    stop: float,
    samples: Any,
) -> Any:
    """Trial centres within `reach` of a point, each as (demerit, row, col), judged on every fifth ray."""
    few = np.empty(turn.shape[1] // COARSE_STRIDE)
    heights = np.empty(few.size)
    trials = np.empty((1 + SCOUT_RINGS * (SCOUT_RINGS + 1) * 3, 3))
    trial = 0
    for ring in range(SCOUT_RINGS + 1):
        for k in range(max(1, 6 * ring)):
            angle = k * math.pi / (3.0 * max(1, ring))
            row = about_row + reach * ring / SCOUT_RINGS * math.cos(angle)
            col = about_col - reach * ring / SCOUT_RINGS * math.sin(angle)
            limits = peaks_around(coef, row, col, turn, start, stop, samples, few, heights)
            trials[trial, 0] = demerit(few, limits)
            trials[trial, 1] = row
            trials[trial, 2] = col
            trial += 1
    return trials


@kernel()
def best_trial(trials: Any) -> int:
    """The least demerit; of a tie the earlier one, on every machine."""
    best = 0
    for k in range(1, trials.shape[0]):
        if trials[k, 0] < trials[best, 0] * (1.0 - TIE):
            best = k
    return best


@kernel()
def find_centre(
    coef: Any,
    about_row: float,
    about_col: float,
    allowed: float,
    turn: Any,
    start: float,
    stop: float,
    samples: Any,
    radius: Any,
    height: Any,
) -> tuple[float, float]:
    """Where the dispersion of the peak radius is least, within `allowed` of a point.

    Steps down from the best trial centre; where that ends on no fair circle, from the next ones as well.
    """
    trials = scout_centres(coef, about_row, about_col, allowed, turn, start, stop, samples)
    best = math.inf
    best_row = about_row
    best_col = about_col
    for _ in range(STARTS):
        trial = best_trial(trials)
        if trials[trial, 0] > NO_CENTRE * (1.0 + HOPELESS) or (
            trials[trial, 0] > NO_CENTRE and best < math.inf
        ):
            break
        row = trials[trial, 1]
        col = trials[trial, 2]
        trials[trial, 0] = math.inf
        worth = demerit(radius, peaks_around(coef, row, col, turn, start, stop, samples, radius, height))
        for _ in range(HARMONIC_STEPS):
            by_row, by_col = first_harmonic(radius, turn)
            new_row, new_col = _within(row + by_row, col + by_col, about_row, about_col, allowed)
            limits = peaks_around(coef, new_row, new_col, turn, start, stop, samples, radius, height)
            new_worth = demerit(radius, limits)
            if new_worth >= worth:
                break
            moved = math.hypot(new_row - row, new_col - col)
            row, col, worth = new_row, new_col, new_worth
            if moved < HARMONIC_DONE * dispersion(radius)[0]:
                break
        if worth < best * (1.0 - TIE):
            best, best_row, best_col = worth, row, col
        if best < FAIR_CIRCLE:
            break
    peaks_around(coef, best_row, best_col, turn, start, stop, samples, radius, height)
    reach = (stop - start) / (samples.size - 1)
    for _ in range(POLISHES):
        mean = dispersion(radius)[0]
        by_row, by_col = polish(coef, best_row, best_col, turn, radius, DIFFERENCE * mean, reach)
        row, col = _within(best_row + by_row, best_col + by_col, about_row, about_col, allowed)
        by_row, by_col = row - best_row, col - best_col
        follow(coef, best_row, best_col, turn, radius, by_row, by_col, reach, height)
        radius[:] = height
        best_row, best_col = row, col
        if math.hypot(by_row, by_col) < CENTRE_TOLERANCE * mean:
            break
    return best_row, best_col


@kernel()
def crossing(
    coef: Any,
    row: float,
    col: float,
    drow: float,
    dcol: float,
    peak: float,
    end: float,
    step: float,
    level: float,
) -> float:
    """Radius where a ray first falls to `level` between its peak and `end`; NaN where it never does."""
    count = max(1, math.ceil(abs(end - peak) / step))
    before = peak
    for k in range(1, count + 1):
        r = peak + (end - peak) * k / count
        if value(coef, row + r * drow, col + r * dcol) <= level:
            for _ in range(BISECTIONS):
                middle = 0.5 * (before + r)
                if value(coef, row + middle * drow, col + middle * dcol) <= level:
                    r = middle
                else:
                    before = middle
            return 0.5 * (before + r)
        before = r
    return math.nan


@kernel()
def mean_width(
    coef: Any, row: float, col: float, turn: Any, radius: Any, height: Any, outer: float, step: float
) -> tuple[float, int]:
    """Mean FWHM above the mean floor at `outer`, and how many rays never fall to half on a side."""
    floor = ring_moments(coef, row, col, turn, outer)[0]
    total = 0.0
    unresolved = 0
    for k in range(radius.size):
        level = 0.5 * (height[k] + floor)
        inside = crossing(coef, row, col, turn[0, k], turn[1, k], radius[k], 0.0, step, level)
        outside = crossing(coef, row, col, turn[0, k], turn[1, k], radius[k], outer, step, level)
        if math.isnan(inside) or math.isnan(outside):
            unresolved += 1
        else:
            total += outside - inside
    resolved = radius.size - unresolved
    return (total / resolved if resolved else math.nan), unresolved


@kernel()
def ring_moments(coef: Any, row: float, col: float, turn: Any, r: float) -> tuple[float, float, float]:
    """Means of I, I cos and I sin of the position angle on a circle."""
    flat = 0.0
    north = 0.0
    east = 0.0
    for k in range(turn.shape[1]):
        here = value(coef, row + r * turn[0, k], col + r * turn[1, k])
        flat += here
        north += here * turn[0, k]
        east -= here * turn[1, k]
    rays = turn.shape[1]
    return flat / rays, north / rays, east / rays


@kernel()
def asymmetry(
    coef: Any, row: float, col: float, turn: Any, inner: float, outer: float
) -> tuple[float, float]:
    """Modulus and argument of the first azimuthal moment, each averaged over the radii of the ring."""
    modulus = 0.0
    north = 0.0
    east = 0.0
    for k in range(RING_RADII):
        r = inner + (outer - inner) * (k + 0.5) / RING_RADII
        flat, along_north, along_east = ring_moments(coef, row, col, turn, r)
        size = math.hypot(along_north, along_east)
        if flat <= 0.0 or size == 0.0:
            continue
        modulus += size / flat
        north += along_north / size
        east += along_east / size
    return modulus / RING_RADII, math.atan2(east, north)


@kernel()
def disk_mean(coef: Any, row: float, col: float, turn: Any, size: float) -> float:
    """Mean brightness inside a radius, on annuli of equal area."""
    total = 0.0
    for k in range(DISK_RADII):
        total += ring_moments(coef, row, col, turn, size * math.sqrt((k + 0.5) / DISK_RADII))[0]
    return total / DISK_RADII
