"""A screen that follows the light: samples and weights between the images of an emitter's edges, order by order.

The bands and panels are those of `raytrace.panels`; nodes and angles are doubled until light as steep as r⁻³
is represented to the tolerance asked for, and what was reached is told per order. It starts from the critical
curve of the spacetime that it is given and knows no metric. G = c = M = 1; angles in radians; weights are areas
on the screen [M²].
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from functools import partial

import numpy as np
from numpy.typing import ArrayLike, NDArray

from raytrace.contract import Array, RayStatus, Spacetime
from raytrace.isoradials import checked_inclination
from raytrace.panels import NODES, Band, band, panel_radii
from raytrace.registry import or_default
from raytrace.series import BandSeries

FEWEST_ANGLES = 16
MOST_ANGLES = 2048
MOST_NODES = 48
# Where tails are this small, twice the samples should leave less than this share of one; else it is rounding. Larger tails
# may well grow before they fall: structure is not seen until it is resolved.
SMALL_TAIL = 1e-6
STALLED = 0.7
# The brightness on which the screen is judged: as steep as emission near the hole usually is.
TEST_SLOPE = 3.0


@dataclass(frozen=True)
class Screen:
    """Samples of the screen, flattened over all orders.

    Attributes
    ----------
    alpha, beta, weight : arrays (n,)
        Positions [M] and areas [M²].
    order : int array (n,)
        The order that each sample belongs to.
    error : array (orders,)
        Estimated error of each order: of the interpolated test brightness r⁻³ relative to its largest value,
        and of its integral over the band relative to the integral.
    bands : tuple of Band
        The same samples with their structure, one per order.
    """

    alpha: Array
    beta: Array
    weight: Array
    order: NDArray[np.int64]
    error: Array
    bands: tuple[Band, ...]

    def interpolate(self, values: ArrayLike) -> tuple[BandSeries, ...]:
        """Smooth interpolants of something known at the samples, one per order.

        Parameters
        ----------
        values : array_like (n,)
            At the samples, in their order.

        Returns
        -------
        tuple of BandSeries
            Functions of distance from the origin [M] and screen angle [rad]; 0 outside their bands.

        Raises
        ------
        ValueError
            If there are not as many values as samples.
        """
        sampled = np.asarray(values, dtype=np.float64)
        if sampled.shape != self.alpha.shape:
            raise ValueError(
                f"values of shape {sampled.shape} do not fit the screen's {self.alpha.size} samples; give one each"
            )
        ends = np.cumsum([math.prod(each.shape) for each in self.bands])
        pieces = np.split(sampled, ends[:-1])
        return tuple(
            BandSeries.of(each, piece.reshape(each.shape))
            for each, piece in zip(self.bands, pieces, strict=True)
        )


def screen(
    *,
    inclination: float,
    edges: Sequence[float],
    orders: int = 3,
    tolerance: float = 1e-4,
    spacetime: Spacetime | None = None,
) -> Screen:
    """Samples and weights that resolve every order of an emitter between its edges.

    Parameters
    ----------
    inclination : float
        [rad], 0 to π.
    edges : sequence of float
        Radii where the emitter's brightness or its slope jumps, ascending [M]; the first and the last bound
        it.
    orders : int
        How many orders, from n = 0.
    tolerance : float
        Error allowed for light as steep as r⁻³: of its interpolant relative to the brightest point of each
        order, and of each order's integral relative to the integral.
    spacetime : Spacetime, optional
        Schwarzschild unless given.

    Returns
    -------
    Screen

    Raises
    ------
    ValueError
        If the edges do not ascend from the horizon outward, or orders, tolerance or inclination make no
        sense.
    """
    hole = or_default(spacetime)
    inclination = checked_inclination(inclination)
    if orders < 1 or int(orders) != orders:
        raise ValueError(f"orders = {orders!r} is a count of images and must be a whole number from 1 upward")
    if not 0.0 < tolerance < 1.0:
        raise ValueError(f"the tolerance {tolerance!r} is a relative error and must lie between 0 and 1")
    radii = panel_radii(edges, hole)
    judged = partial(_test_brightness, hole, inclination)
    found = [
        resolved(radii, judged, order=order, inclination=inclination, tolerance=tolerance, spacetime=hole)
        for order in range(orders)
    ]
    bands = tuple(series.band for series in found)
    return Screen(
        alpha=np.concatenate([band.alpha.ravel() for band in bands]),
        beta=np.concatenate([band.beta.ravel() for band in bands]),
        weight=np.concatenate([band.weight.ravel() for band in bands]),
        order=np.concatenate([np.full(math.prod(band.shape), band.order) for band in bands]),
        error=np.array([series.error() for series in found]),
        bands=bands,
    )


def resolved(
    radii: Array,
    brightness: Callable[[Band], Array],
    *,
    order: int,
    inclination: float,
    tolerance: float,
    spacetime: Spacetime,
) -> BandSeries:
    """Sample a brightness on the band of one order, doubling nodes or angles until the tails of its series are
    below a tolerance, a limit is reached or doubling no longer helps (rounding).

    Parameters
    ----------
    radii : array (panels + 1,)
        As `panel_radii` gives them [M].
    brightness : callable
        Takes a band, returns what shines at its samples, shape (panels, q, n_angles).
    order, inclination, tolerance, spacetime
        As for `screen`.
    """

    def sample(nodes: int, angles: int) -> Band:
        return band(
            radii, order=order, inclination=inclination, angles=angles, nodes=nodes, spacetime=spacetime
        )

    sampled = sample(NODES, FEWEST_ANGLES)
    before = (math.inf, math.inf)
    while True:
        series = BandSeries.of(sampled, brightness(sampled))
        tails = series.tails()
        nodes, angles = len(sampled.nodes), len(sampled.angles)
        helps = [tail > SMALL_TAIL or tail < STALLED * last for tail, last in zip(tails, before, strict=True)]
        more_nodes = tails[0] > tolerance and helps[0] and nodes < MOST_NODES
        more_angles = tails[1] > tolerance and helps[1] and angles < MOST_ANGLES
        if not more_nodes and not more_angles:
            return series
        before = (tails[0] if more_nodes else before[0], tails[1] if more_angles else before[1])
        nodes = 2 * nodes if more_nodes else nodes
        sampled = sample(nodes, 2 * angles) if more_angles else sampled.with_nodes(nodes)


def _test_brightness(hole: Spacetime, inclination: float, sampled: Band) -> Array:
    """The test brightness r⁻³ on a band, scaled to 1 at its inner edge; shape (panels, q, n_angles)."""
    hit = hole.trace_rays(
        sampled.alpha.ravel(), sampled.beta.ravel(), inclination, sampled.order + 1, False, False, False
    )
    radius = np.where(hit.status[-1] == RayStatus.CROSSED, hit.radius[-1], np.inf)
    return ((sampled.radii[0] / radius) ** TEST_SLOPE).reshape(sampled.shape)
