"""A screen that follows the light: samples and weights between the images of an emitter's edges, order by order.

The bands and panels are those of `raytrace.panels`; nodes and angles are doubled until light as steep as r⁻³
is represented to the tolerance asked for, and what was reached is told per order. It starts from the critical
curve of the spacetime that it is given and knows no metric. G = c = M = 1; angles in radians; weights are areas
on the screen [M²].
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from raytrace.contract import Array, Spacetime
from raytrace.isoradials import checked_inclination
from raytrace.panels import Band, band, panel_radii
from raytrace.registry import or_default
from raytrace.series import BandSeries

FEWEST_ANGLES = 16
MOST_ANGLES = 2048
MOST_NODES = 48
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
    resolved = [_resolved(hole, radii, order, inclination, tolerance) for order in range(orders)]
    bands = tuple(band for band, _ in resolved)
    return Screen(
        alpha=np.concatenate([band.alpha.ravel() for band in bands]),
        beta=np.concatenate([band.beta.ravel() for band in bands]),
        weight=np.concatenate([band.weight.ravel() for band in bands]),
        order=np.concatenate([np.full(math.prod(band.shape), band.order) for band in bands]),
        error=np.array([error for _, error in resolved]),
        bands=bands,
    )


def _resolved(
    hole: Spacetime, radii: Array, order: int, inclination: float, tolerance: float
) -> tuple[Band, float]:
    """Refine one band until light as steep as r⁻³ is interpolated to the tolerance, and say what was
    reached.
    """
    sampled = band(radii, order=order, inclination=inclination, angles=FEWEST_ANGLES, spacetime=hole)
    while True:
        series = BandSeries.of(sampled, _test_brightness(hole, sampled, inclination))
        finer = refined(series, tolerance, inclination, hole)
        if finer is None:
            return sampled, series.error()
        sampled = finer


def refined(series: BandSeries, tolerance: float, inclination: float, spacetime: Spacetime) -> Band | None:
    """A band with twice the nodes or angles where a tail of the series asks for it; None where none does or a
    limit is reached.
    """
    sampled = series.band
    across, around = series.tails()
    nodes, angles = len(sampled.nodes), len(sampled.angles)
    if across > tolerance and nodes < MOST_NODES:
        nodes *= 2
    if around > tolerance and angles < MOST_ANGLES:
        return band(
            sampled.radii,
            order=sampled.order,
            inclination=inclination,
            angles=2 * angles,
            nodes=nodes,
            spacetime=spacetime,
        )
    return None if nodes == len(sampled.nodes) else sampled.with_nodes(nodes)


def _test_brightness(hole: Spacetime, sampled: Band, inclination: float) -> Array:
    """The test brightness r⁻³ on a band, scaled to 1 at its inner edge; shape (panels, q, n_angles)."""
    hit = hole.trace_rays(
        sampled.alpha.ravel(), sampled.beta.ravel(), inclination, sampled.order + 1, False, False, False
    )
    radius = np.where(hit.status[-1] == 0, hit.radius[-1], np.inf)
    return ((sampled.radii[0] / radius) ** TEST_SLOPE).reshape(sampled.shape)
