"""A screen that follows the light: samples and weights between the images of an emitter's edges, order by order.

At every screen angle the band of order n is cut into panels whose edges lie on the images of chosen
circles, the emitter's own edges and the critical curve's r = r_photon among them; inside a panel
Gauss–Legendre nodes, around the screen equally spaced angles, so that both directions converge spectrally
for light that is smooth between the edges. G = c = M = 1; angles in radians; weights are areas on the
screen [M²].
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace
from functools import cache
from itertools import pairwise

import numpy as np
from numpy.polynomial import legendre
from numpy.typing import NDArray

from raytrace.contract import Array, Spacetime
from raytrace.isoradials import checked_inclination, isoradial
from raytrace.registry import or_default

# Neighbouring panel edges differ by at most this factor in radius: a power law then needs few nodes.
PANEL_RATIO = 1.7
NODES = 12
FEWEST_ANGLES = 32
MOST_ANGLES = 2048
MOST_NODES = 48
# The brightness on which the screen is judged: as steep as emission near the hole usually is.
TEST_SLOPE = 3.0
# Coefficients at the end of a spectral series that are taken as its tail.
TAIL_SHARE = 0.8


@dataclass(frozen=True)
class Band:
    """The part of the screen where one order of an emitter can appear, cut into panels.

    Attributes
    ----------
    order : int
    radii : array (panels + 1,)
        Circles whose images are the panel edges [M].
    angles : array (n_angles,)
        Equally spaced screen angles, half a step off 0 [rad].
    edges : array (panels + 1, n_angles)
        Images of the circles [M].
    nodes, node_weights : arrays (q,)
        Gauss–Legendre rule on (−1, 1).
    """

    order: int
    radii: Array
    angles: Array
    edges: Array
    nodes: Array
    node_weights: Array

    @property
    def shape(self) -> tuple[int, int, int]:
        """(panels, q, n_angles): the shape of everything sampled on the band."""
        return len(self.radii) - 1, len(self.nodes), len(self.angles)

    @property
    def distance(self) -> Array:
        """Distance of every sample from the screen's origin [M], shape (panels, q, n_angles)."""
        low, high = self.edges[:-1, None, :], self.edges[1:, None, :]
        return 0.5 * (high + low) + 0.5 * (high - low) * self.nodes[None, :, None]

    @property
    def weight(self) -> Array:
        """Area on the screen that every sample stands for [M²], shape (panels, q, n_angles)."""
        half_width = 0.5 * (self.edges[1:, None, :] - self.edges[:-1, None, :])
        step = 2.0 * math.pi / len(self.angles)
        return self.distance * half_width * self.node_weights[None, :, None] * step

    def with_nodes(self, count: int) -> Band:
        """The same panels with another number of nodes in each."""
        points, weights = gauss_legendre(count)
        return replace(self, nodes=points, node_weights=weights)

    @property
    def alpha(self) -> Array:
        """Screen coordinate α of every sample [M]."""
        return self.distance * np.cos(self.angles)

    @property
    def beta(self) -> Array:
        """Screen coordinate β of every sample [M]."""
        return self.distance * np.sin(self.angles)


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
        Estimated relative error of ∫ r⁻³ dα dβ over each order's band.
    bands : tuple of Band
        The same samples with their structure, one per order.
    """

    alpha: Array
    beta: Array
    weight: Array
    order: NDArray[np.int64]
    error: Array
    bands: tuple[Band, ...]


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
        Relative error allowed for light as steep as r⁻³.
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


def panel_radii(edges: Sequence[float], spacetime: Spacetime) -> Array:
    """Radii of the panel edges: the emitter's own, the photon orbit, and enough between for a steep power
    law.
    """
    own = np.asarray(edges, dtype=np.float64)
    if own.ndim != 1 or own.size < 2 or not np.all(np.diff(own) > 0.0) or not np.all(np.isfinite(own)):
        raise ValueError(
            f"the emitter's edges {list(edges)} must be at least two finite radii [M] that ascend"
        )
    if own[0] < spacetime.horizon:
        raise ValueError(
            f"the emitter's inner edge {own[0]:g} M lies inside the horizon at {spacetime.horizon:g} M"
        )
    inside = own[0] < spacetime.photon_orbit < own[-1]
    corners = np.union1d(own, [spacetime.photon_orbit] if inside else [])
    pieces = [
        np.geomspace(low, high, 1 + math.ceil(math.log(high / low) / math.log(PANEL_RATIO)))[:-1]
        for low, high in pairwise(corners)
    ]
    return np.concatenate([*pieces, own[-1:]])


def band(
    radii: Array,
    *,
    order: int,
    inclination: float,
    angles: int,
    nodes: int = NODES,
    spacetime: Spacetime | None = None,
) -> Band:
    """The band of one order with a given number of angles and of nodes per panel.

    Parameters
    ----------
    radii : array (panels + 1,)
        Ascending radii of the panel edges [M].
    order, angles, nodes : int
        Order of the image, number of screen angles, Gauss–Legendre nodes per panel.
    inclination : float
        [rad]
    spacetime : Spacetime, optional
        Schwarzschild unless given.
    """
    steps = (np.arange(angles, dtype=np.float64) + 0.5) * (2.0 * math.pi / angles)
    images = isoradial(
        radii[:, None], order=order, angle=steps[None, :], inclination=inclination, spacetime=spacetime
    )
    points, weights = gauss_legendre(nodes)
    return Band(order, radii, steps, np.asarray(images), points, weights)


@cache
def gauss_legendre(count: int) -> tuple[Array, Array]:
    """Nodes and weights of the Gauss–Legendre rule on (−1, 1)."""
    points, weights = legendre.leggauss(count)
    return points, weights


@cache
def legendre_transform(count: int) -> Array:
    """Matrix (count, count) from values at the Gauss–Legendre nodes to Legendre coefficients."""
    points, weights = gauss_legendre(count)
    degree = np.arange(count)
    return (degree[:, None] + 0.5) * legendre.legvander(points, count - 1).T * weights


def tails(sampled: Band, values: Array) -> tuple[float, float]:
    """How much of a band's samples is left at the end of their series, across panels and around the screen.

    Parameters
    ----------
    sampled : Band
    values : array (panels, q, n_angles)
        Brightness at the band's samples.

    Returns
    -------
    (float, float)
        Largest coefficient in the tail of the Legendre and of the Fourier series, relative to the largest value; around
        the screen also what the tail holds of the flux per angle, relative to the flux.
    """
    scale = float(np.max(np.abs(values))) or 1.0
    across = np.einsum("mq,pqj->pmj", legendre_transform(values.shape[1]), values)
    around = _end_of_series(values) / values.shape[2]
    flux = np.sum(sampled.weight * values, axis=(0, 1))
    return (
        float(np.max(np.abs(across[:, -2:]))) / scale,
        max(
            float(np.max(around)) / scale,
            2.0 * float(np.sum(_end_of_series(flux))) / (abs(float(flux.sum())) or 1.0),
        ),
    )


def _end_of_series(values: Array) -> Array:
    """Sizes of the last Fourier coefficients along the last axis."""
    sizes: Array = np.abs(np.fft.rfft(values, axis=-1))
    return sizes[..., int(TAIL_SHARE * sizes.shape[-1]) :]


def _resolved(
    hole: Spacetime, radii: Array, order: int, inclination: float, tolerance: float
) -> tuple[Band, float]:
    """Refine one band until light as steep as r⁻³ is interpolated to the tolerance, and say what was
    reached.
    """
    sampled = band(radii, order=order, inclination=inclination, angles=FEWEST_ANGLES, spacetime=hole)
    while True:
        across, around = tails(sampled, sampled_brightness(hole, sampled, inclination))
        finer = refined(sampled, across, around, tolerance, inclination, hole)
        if finer is None:
            return sampled, max(across, around)
        sampled = finer


def refined(
    sampled: Band, across: float, around: float, tolerance: float, inclination: float, spacetime: Spacetime
) -> Band | None:
    """A band with twice the nodes or angles where a tail asks for it; None where none does or a limit is
    reached.
    """
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


def sampled_brightness(hole: Spacetime, sampled: Band, inclination: float) -> Array:
    """The test brightness r⁻³ on a band, scaled to 1 at its inner edge; shape (panels, q, n_angles)."""
    hit = hole.trace_rays(
        sampled.alpha.ravel(), sampled.beta.ravel(), inclination, sampled.order + 1, False, False, False
    )
    radius = np.where(hit.status[-1] == 0, hit.radius[-1], np.inf)
    return ((sampled.radii[0] / radius) ** TEST_SLOPE).reshape(sampled.shape)
