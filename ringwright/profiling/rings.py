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
from typing import NamedTuple

import numpy as np

import raytrace as rt
from raytrace.contract import Array
from raytrace.panels import gauss_legendre
from raytrace.roots import bracketed_roots
from ringwright.profiling.cuts import POINTS, Lines, corners, middles
from ringwright.sampling import SampledLight, seen_flux
from ringwright.scenes import Scene

LIMIT_RATIO = math.exp(-math.pi)
LIMIT_ROTATION = math.pi
LIMIT_DELAY = 3.0 * math.sqrt(3.0) * math.pi
# Points across a piece of a cut that integrals are taken on: exact for the longest series times the square of a distance.
NODES = 26
# Rounds of the search for a half maximum or a crest, each on so many points of what the last left: to 1e-8 of a piece.
ROUNDS = 6
# Screen angles, at most, on which the circle that holds half the light is found: it is a mark, not a measurement.
MOST_ANGLES = 256


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
    def typical_width(self) -> Array:
        """Median width of every order [M]; NaN without light."""
        return _medians(self.width)

    @property
    def band_width(self) -> Array:
        """Width of the band that each order can reach [M]; infinite for order 0."""
        return self.band_outer - self.band_inner


def order_fluxes(light: Sequence[SampledLight], orders: int) -> Array:
    """What is seen of every order, at the light's own angles: those of a table may be too few for it."""
    flux = np.zeros(orders)
    for part in light:
        flux[part.order] += seen_flux(part)
    return flux


def ring_table(
    scene: Scene,
    light: Sequence[SampledLight],
    *,
    count: int,
    emitting_radius: float | None = None,
    scale: float = 1.0,
    flux: Array | None = None,
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
    flux : array (orders,), optional
        What `order_fluxes` gives, where it is known already.

    Raises
    ------
    InputError
        If some of the light comes from infinity.
    ValueError
        If the emitting radius lies inside the horizon.
    """
    position_angle = math.tau / count * np.arange(count, dtype=np.float64)
    angle = position_angle - scene.position_angle + 0.5 * math.pi
    by_order = [[part for part in light if part.order == order] for order in range(scene.orders)]
    shapes = [_shape([Lines(part, angle) for part in parts]) for parts in by_order]
    peak, mean, width, fwhm, angular_flux = (np.array(rows) for rows in zip(*shapes, strict=True))
    critical = scene.spacetime.critical_radius(scene.inclination, angle)
    inner = min(float(part.series.band.radii[0]) for part in light)
    radius = _half_light_radius(scene, by_order[0]) if emitting_radius is None else emitting_radius
    rotation, delay = _after_the_order_before(scene, radius, angle)
    flux = scale * (order_fluxes(light, scene.orders) if flux is None else flux)
    return RingTable(
        position_angle=position_angle,
        band_inner=_images(scene, inner, angle),
        band_outer=_images(scene, math.inf, angle),
        peak=peak,
        mean=mean,
        peak_offset=peak - critical,
        mean_offset=mean - critical,
        width=width,
        fwhm=fwhm,
        angular_flux=scale * angular_flux,
        flux=flux,
        fraction=flux / flux.sum(),
        width_ratio=_over_the_one_before(_medians(width)),
        flux_ratio=_over_the_one_before(flux),
        rotation=rotation,
        delay=delay,
        emitting_radius=radius,
        notes=_notes(by_order, flux, angular_flux),
    )


class _Shape(NamedTuple):
    """What one order is along every angle, arrays (n,); NaN where it has no light, whose angular flux is 0."""

    peak: Array
    mean: Array
    width: Array
    fwhm: Array
    angular_flux: Array


def _shape(lines: Sequence[Lines]) -> _Shape:
    marks = corners(lines)
    b, light = _integrand(lines, marks)
    held = np.sum(light, axis=(0, 1))
    lit = held > 0.0
    held = np.where(lit, held, np.nan)
    mean = np.sum(light * b, axis=(0, 1)) / held
    spread = np.sqrt(np.maximum(np.sum(light * (b - mean) ** 2, axis=(0, 1)) / held, 0.0))
    sampled = _sampled(lines, marks)
    peak, height = _crest(lines, sampled)
    return _Shape(
        peak=np.where(lit, peak, np.nan),
        mean=mean,
        width=spread,
        fwhm=np.where(lit, _fwhm(lines, sampled, 0.5 * height), np.nan),
        angular_flux=np.where(lit, np.sum(light * b, axis=(0, 1)), 0.0),
    )


def _integrand(lines: Sequence[Lines], marks: Array) -> tuple[Array, Array]:
    """Nodes on every piece of each cut [M], and the light there times db; shapes (pieces, NODES, n)."""
    points, weights = gauss_legendre(NODES)
    half = 0.5 * np.diff(marks, axis=0)[:, None, :]
    b = 0.5 * (marks[1:] + marks[:-1])[:, None, :] + half * points[:, None]
    return b, sum(line.brightness(b, middles(marks)) for line in lines) * half * weights[:, None]


def _seen(lines: Sequence[Lines], distance: Array, middle: Array) -> Array:
    return np.maximum(sum(line.brightness(distance, middle) for line in lines), 0.0)


def _sampled(lines: Sequence[Lines], marks: Array) -> tuple[Array, Array, Array]:
    """Points on every piece, both ends included, the piece's middle beside them, and the light there; each
    (pieces × POINTS, n).
    """
    b = np.linspace(marks[:-1], marks[1:], POINTS, axis=1)
    middle = middles(marks)
    value = _seen(lines, b, middle)
    flat = (-1, marks.shape[1])
    return b.reshape(flat), np.repeat(middle, POINTS, axis=0), value.reshape(flat)


def _crest(lines: Sequence[Lines], sampled: tuple[Array, Array, Array]) -> tuple[Array, Array]:
    """Place and height of the brightest point: the best sample, then ever closer around it within its piece."""
    b, middle, value = sampled
    each = np.arange(value.shape[1])
    at = np.argmax(value, axis=0)
    best, height, inside = b[at, each], value[at, each], middle[at, each]
    low = b[np.where(at % POINTS > 0, at - 1, at), each]
    high = b[np.where(at % POINTS < POINTS - 1, at + 1, at), each]
    for _ in range(ROUNDS):
        place = np.linspace(low, high, POINTS)
        light = _seen(lines, place[None], inside[None])[0]
        at = np.argmax(light, axis=0)
        best = np.where(light[at, each] > height, place[at, each], best)
        height = np.maximum(light[at, each], height)
        low, high = place[np.maximum(at - 1, 0), each], place[np.minimum(at + 1, POINTS - 1), each]
    return best, height


def _fwhm(lines: Sequence[Lines], sampled: tuple[Array, Array, Array], half: Array) -> Array:
    """Between the outermost points at which brightness crosses half its maximum; a jump through it is such a point."""
    b, middle, value = sampled
    above, each, last = value >= half, np.arange(half.size), len(value) - 1
    inner, outer = np.argmax(above, axis=0), last - np.argmax(above[::-1], axis=0)
    ends = []
    for at, step in ((inner, -1), (outer, 1)):
        # A neighbour on another piece is at the same distance: brightness jumps just there.
        beside = np.clip(at + step, 0, last)
        ends.append(_crossing(lines, b[beside, each], b[at, each], middle[at, each], half))
    return ends[1] - ends[0]


def _crossing(lines: Sequence[Lines], dark: Array, bright: Array, inside: Array, half: Array) -> Array:
    """Where brightness crosses a level between darker and brighter places."""
    each = np.arange(half.size)
    for _ in range(ROUNDS):
        place = np.linspace(dark, bright, POINTS)
        first = np.argmax(_seen(lines, place[None], inside[None])[0] >= half, axis=0)
        dark, bright = place[np.maximum(first - 1, 0), each], place[first, each]
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


def _half_light_radius(scene: Scene, direct: Sequence[SampledLight]) -> float:
    """Radius of the circle within which half of order 0's light is emitted [M]."""
    count = min(MOST_ANGLES, max(len(part.series.band.angles) for part in direct))
    angle = math.tau / count * (np.arange(count, dtype=np.float64) + 0.5)
    lines = [Lines(part, angle) for part in direct]
    marks = corners(lines)

    def within(limit: Array | float) -> float:
        b, light = _integrand(lines, np.minimum(marks, limit))
        return float(np.sum(light * b))

    whole = within(math.inf)

    def excess(radius: Array, index: object) -> Array:
        limit = rt.isoradial(
            radius, order=0, angle=angle, inclination=scene.inclination, spacetime=scene.spacetime
        )
        return np.array([within(np.asarray(limit)) - 0.5 * whole])

    ends = [part.series.band.radii[[0, -1]] for part in direct]
    inner, outer = min(low for low, _ in ends), max(high for _, high in ends)
    return float(bracketed_roots(excess, np.array([inner]), np.array([outer]))[0])


def _after_the_order_before(scene: Scene, radius: float, angle: Array) -> tuple[Array, Array]:
    """Rotation and delay of every order after the one before: median, least, greatest over angle, shape (orders, 3)."""
    images = _images(scene, radius, angle)
    azimuth, delay = np.full((2, *images.shape), np.nan)
    for order, b in enumerate(images):
        seen = np.isfinite(b)  # an exactly edge-on view has rays within the plane, which have no crossing
        hit = rt.trace(
            b[seen] * np.cos(angle[seen]),
            b[seen] * np.sin(angle[seen]),
            inclination=scene.inclination,
            orders=order + 1,
            spacetime=scene.spacetime,
            momentum=False,
        ).only(order)
        azimuth[order, seen], delay[order, seen] = hit.azimuth, hit.delay
    blank = [[math.nan] * 3]
    turned = [_spread(np.mod(after - before, math.tau)) for before, after in itertools.pairwise(azimuth)]
    later = [_spread(after - before) for before, after in itertools.pairwise(delay)]
    return np.array(blank + turned), np.array(blank + later)


def _spread(row: Array) -> list[float]:
    """Median, least and greatest of what is known; NaN where nothing is."""
    known = row[np.isfinite(row)]
    return [float(pick(known)) for pick in (np.median, np.min, np.max)] if known.size else [math.nan] * 3


def _medians(rows: Array) -> Array:
    return np.array([_spread(row)[0] for row in rows])


def _over_the_one_before(values: Array) -> Array:
    with np.errstate(divide="ignore", invalid="ignore"):
        ratio = values[1:] / values[:-1]
    return np.concatenate([[math.nan], np.where(np.isfinite(ratio), ratio, math.nan)])


def _notes(by_order: Sequence[Sequence[SampledLight]], flux: Array, angular_flux: Array) -> tuple[str, ...]:
    """Sentences for orders without light, and for those that are hidden at some of the angles."""
    found = []
    for order, parts in enumerate(by_order):
        hidden, dark = any(part.fronts for part in parts), int(np.sum(angular_flux[order] == 0.0))
        if not flux[order] > 0.0:
            why = "an opaque disk in front hides it" if hidden else "nothing of the emitter is seen in it"
            found.append(f"order {order} carries no light: {why}")
        elif hidden and dark:
            found.append(
                f"order {order} is hidden by an opaque disk in front at {dark} of {angular_flux.shape[1]} position angles"
            )
    return tuple(found)
