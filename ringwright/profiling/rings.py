"""What each order is: where its ring lies, how wide it is, how much light it carries, how it follows the one before.

All from the light's series along equally spaced position angles; only rotation and delay trace rays, at the images of one
circle. For high orders at fixed screen angle a Schwarzschild hole makes every order narrower and fainter than the one
before by e^−π, turns it by π and delays it by 3√3π M (Darwin 1959; Luminet 1979; Johnson et al. 2020); low orders are
some way from there. Lengths in M, angles in radians, fluxes in the scene's unit.
"""

from __future__ import annotations

import itertools
import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

import raytrace as rt
from raytrace.contract import Array
from raytrace.panels import gauss_legendre
from ringwright.profiling.cuts import POINTS, Line, corners
from ringwright.sampling import SampledLight
from ringwright.scenes import Scene

LIMIT_RATIO = math.exp(-math.pi)
LIMIT_ROTATION = math.pi
LIMIT_DELAY = 3.0 * math.sqrt(3.0) * math.pi
# Points across a piece of a cut that integrals are taken on, and on which crests and half maxima are looked for.
NODES = 24
# Rounds of the search for a half maximum or a crest, each on so many points of what the last left: to 1e-8 of a piece.
ROUNDS = 6


@dataclass(frozen=True)
class RingTable:
    """Every order along equally spaced position angles.

    Attributes
    ----------
    position_angle : array (n,)
        East of north [rad].
    band_inner, band_outer : arrays (orders, n)
        Where the innermost emitting circle appears and how far out the order could at most [M].
    peak, mean : arrays (orders, n)
        Distance of the brightest point and mean distance from the origin along the cut [M]; NaN without light.
    peak_offset, mean_offset : arrays (orders, n)
        The same from the critical curve [M].
    width : array (orders, n)
        Root of the second moment about the mean [M].
    fwhm : array (orders, n)
        Between the outermost half-maximum points, jumps at edges among them [M].
    angular_flux : array (orders, n)
        ∫ I b db per radian.
    flux, fraction : arrays (orders,)
    width_ratio, flux_ratio : arrays (orders,)
        Over the order before (median width); NaN for order 0.
    rotation, delay : arrays (orders, 3)
        After the order before, at the same screen angle and emitting radius: median, least, greatest over angle [rad, M].
    emitting_radius : float
        Of the circle that rotation and delay are those of [M].
    notes : tuple of str
    """

    position_angle: Array
    band_inner: Array
    band_outer: Array
    peak: Array
    mean: Array
    peak_offset: Array
    mean_offset: Array
    width: Array
    fwhm: Array
    angular_flux: Array
    flux: Array
    fraction: Array
    width_ratio: Array
    flux_ratio: Array
    rotation: Array
    delay: Array
    emitting_radius: float
    notes: tuple[str, ...]

    @property
    def band_width(self) -> Array:
        """Width of the band that each order can reach [M]; infinite for order 0."""
        return self.band_outer - self.band_inner


def ring_table(
    scene: Scene,
    light: Sequence[SampledLight],
    *,
    count: int,
    emitting_radius: float | None = None,
    scale: float = 1.0,
) -> RingTable:
    """The table of a scene's rings.

    Parameters
    ----------
    scene : Scene
    light : sequence of SampledLight
        Without light from infinity.
    count : int
        Position angles.
    emitting_radius : float, optional
        [M]; the circle within which half of order 0's light is emitted unless given.
    scale : float
        Flux in the scene's unit per unit of ∫ I dα dβ.
    """
    position_angle = math.tau / count * np.arange(count, dtype=np.float64)
    angle = position_angle - scene.position_angle + 0.5 * math.pi
    shapes = np.array([_shapes(light, each, scene.orders) for each in angle])
    peak, mean, width, fwhm, flux = np.moveaxis(shapes, (2, 1, 0), (0, 1, 2))
    critical = scene.spacetime.critical_radius(scene.inclination, angle)
    inner = min(float(part.series.band.radii[0]) for part in light)
    radius = _median_radius(light) if emitting_radius is None else emitting_radius
    total = scale * flux.mean(axis=1) * math.tau
    rotation, delay = _after_the_order_before(scene, radius, angle)
    typical = np.array([_median(row) for row in width])
    return RingTable(
        position_angle,
        _images(scene, inner, angle),
        _images(scene, math.inf, angle),
        peak,
        mean,
        peak - critical,
        mean - critical,
        width,
        fwhm,
        scale * flux,
        total,
        total / total.sum(),
        _over_the_one_before(typical),
        _over_the_one_before(total),
        rotation,
        delay,
        radius,
        _notes(total, light),
    )


def _shapes(light: Sequence[SampledLight], angle: float, orders: int) -> list[list[float]]:
    """Peak, mean, width, FWHM and angular flux of every order along one screen angle."""
    lines = [Line(part, angle) for part in light]
    found = []
    for order in range(orders):
        mine = [line for line in lines if line.order == order]
        found.append(_shape(mine))
    return found


def _shape(lines: Sequence[Line]) -> list[float]:
    marks = corners(lines)
    points, weights = gauss_legendre(NODES)
    half = 0.5 * np.diff(marks)[:, None]
    middle = 0.5 * (marks[1:] + marks[:-1])[:, None]
    b = middle + half * points
    value, weight = _sum(lines, b.ravel(), np.repeat(middle, NODES)), (half * weights).ravel()
    b = b.ravel()
    held = float(np.sum(value * weight))
    if not held > 0.0:
        return [math.nan] * 4 + [0.0]
    mean = float(np.sum(value * weight * b)) / held
    spread = math.sqrt(max(float(np.sum(value * weight * (b - mean) ** 2)) / held, 0.0))
    peak, height = _crest(lines, marks)
    return [peak, mean, spread, _fwhm(lines, marks, 0.5 * height), float(np.sum(value * weight * b))]


def _sum(lines: Sequence[Line], distance: Array, inside: Array) -> Array:
    return np.maximum(sum(line.brightness(distance, inside) for line in lines), 0.0)


def _pieces(lines: Sequence[Line], marks: Array) -> tuple[Array, Array, Array]:
    """Points on every piece of a cut, both ends included, the piece's middle beside them, and the light there."""
    share = np.linspace(0.0, 1.0, POINTS)
    b = marks[:-1, None] + np.diff(marks)[:, None] * share
    middle = np.repeat(0.5 * (marks[1:] + marks[:-1]), POINTS).reshape(b.shape)
    return b, middle, _sum(lines, b.ravel(), middle.ravel()).reshape(b.shape)


def _crest(lines: Sequence[Line], marks: Array) -> tuple[float, float]:
    """Place and height of the brightest point: the best sample, then thirds of the piece around it."""
    b, middle, value = _pieces(lines, marks)
    row, column = (int(place) for place in np.unravel_index(int(np.argmax(value)), value.shape))
    best, height = b[row, column], value[row, column]
    low, high = b[row, max(column - 1, 0)], b[row, min(column + 1, POINTS - 1)]
    inside = np.full(POINTS, middle[row, column])
    for _ in range(ROUNDS):
        place = np.linspace(low, high, POINTS)
        light = _sum(lines, place, inside)
        at = int(np.argmax(light))
        if light[at] > height:
            best, height = place[at], light[at]
        low, high = place[max(at - 1, 0)], place[min(at + 1, POINTS - 1)]
    return float(best), float(height)


def _fwhm(lines: Sequence[Line], marks: Array, half: float) -> float:
    """Between the outermost points at which brightness crosses half its maximum; a jump through it is such a point."""
    b, middle, value = _pieces(lines, marks)
    above = np.flatnonzero(value.ravel() >= half)
    if not above.size:
        return math.nan
    flat, inside, bright = b.ravel(), middle.ravel(), value.ravel()
    ends = []
    for at, step in ((above[0], -1), (above[-1], 1)):
        beside = at + step
        if not 0 <= beside < flat.size or inside[beside] != inside[at] or bright[beside] >= half:
            ends.append(float(flat[at]))
            continue
        ends.append(_crossing(lines, flat[beside], flat[at], inside[at], half))
    return ends[1] - ends[0]


def _crossing(lines: Sequence[Line], dark: float, bright: float, inside: float, half: float) -> float:
    """Where brightness crosses a level between a darker and a brighter place."""
    for _ in range(ROUNDS):
        place = np.linspace(dark, bright, POINTS)
        first = int(np.argmax(_sum(lines, place, np.full(POINTS, inside)) >= half))
        dark, bright = float(place[max(first - 1, 0)]), float(place[first])
    return 0.5 * (dark + bright)


def _images(scene: Scene, radius: float, angle: Array) -> Array:
    """Where a circle appears, order by order [M], shape (orders, n)."""
    return np.array(
        [
            rt.isoradial(
                radius, order=order, angle=angle, inclination=scene.inclination, spacetime=scene.spacetime
            )
            for order in range(scene.orders)
        ]
    )


def _median_radius(light: Sequence[SampledLight]) -> float:
    """Radius of the circle within which half of order 0's light is emitted, edge by edge of its panels and linear in
    between.
    """
    first = [part for part in light if part.order == 0]
    radii = np.unique(np.concatenate([part.series.band.radii for part in first]))
    within = np.zeros(radii.size)
    for part in first:
        band = part.series.band
        held = np.sum(band.weight * part.series.values, axis=(1, 2))
        within += np.interp(radii, band.radii, np.concatenate([[0.0], np.cumsum(held)]))
    return float(np.interp(0.5 * within[-1], within, radii))


def _after_the_order_before(scene: Scene, radius: float, angle: Array) -> tuple[Array, Array]:
    """Rotation and delay of every order after the one before: median, least, greatest over angle, shape (orders, 3)."""
    azimuth, delay = [], []
    for order, b in enumerate(_images(scene, radius, angle)):
        hit = rt.trace(
            b * np.cos(angle),
            b * np.sin(angle),
            inclination=scene.inclination,
            orders=order + 1,
            spacetime=scene.spacetime,
            momentum=False,
        ).only(order)
        azimuth.append(np.asarray(hit.azimuth)[0])
        delay.append(np.asarray(hit.delay)[0])
    turned = [np.mod(after - before, math.tau) for before, after in itertools.pairwise(azimuth)]
    later = [after - before for before, after in itertools.pairwise(delay)]
    return _spread(turned), _spread(later)


def _spread(rows: Sequence[Array]) -> Array:
    blank = [math.nan] * 3
    return np.array([blank, *([_median(row), float(np.nanmin(row)), float(np.nanmax(row))] for row in rows)])


def _median(row: Array) -> float:
    return float(np.nanmedian(row)) if np.isfinite(row).any() else math.nan


def _over_the_one_before(values: Array) -> Array:
    with np.errstate(divide="ignore", invalid="ignore"):
        ratio = values[1:] / values[:-1]
    return np.concatenate([[math.nan], np.where(np.isfinite(ratio), ratio, math.nan)])


def _notes(flux: Array, light: Sequence[SampledLight]) -> tuple[str, ...]:
    hidden = any(part.fronts for part in light)
    why = "an opaque disk in front hides it" if hidden else "nothing of the emitter is seen in it"
    return tuple(f"order {order} carries no light: {why}" for order in np.flatnonzero(~(flux > 0.0)))
