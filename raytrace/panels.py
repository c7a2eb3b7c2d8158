"""The band of the screen where one order of an emitter can appear, cut into panels that follow the light.

At every screen angle panel edges lie on the images of chosen circles: the emitter's own edges, the innermost
stable orbit, enough others for a steep power law, and for orders n ≥ 1 on the critical curve itself, which all
those images approach by e^−π an order. Inside a panel stand Gauss–Legendre nodes, around the screen equally
spaced angles, so that both directions converge spectrally for light that is smooth between the edges.
G = c = M = 1; angles in radians; weights are areas on the screen [M²].
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from functools import cache, partial
from itertools import pairwise

import numpy as np
from numpy.polynomial import legendre
from numpy.typing import NDArray

from raytrace.contract import Array, Spacetime
from raytrace.isoradials import isoradial
from raytrace.registry import or_default

# Neighbouring panel edges differ by at most this factor in radius: a power law then needs few nodes.
PANEL_RATIO = 1.7
# Gas that falls in from the innermost stable orbit gathers speed as the power 3/2 of the distance from it. Where the
# emitter has an edge there, panels on its inner side shrink toward it, by these shares of its radius.
GRADED = (1.0 / 12.0, 1.0 / 85.0)
NODES = 12


@dataclass(frozen=True)
class Band:
    """The part of the screen where one order of an emitter can appear, cut into panels.

    Attributes
    ----------
    order : int
    radii : array (panels + 1,)
        Circles whose images are the panel edges [M]. For orders n ≥ 1 the photon orbit stands for the critical
        curve, to which its images shrink.
    angles : array (n_angles,)
        Equally spaced screen angles, half a step off 0 [rad].
    offsets : array (panels + 1, n_angles)
        Distance of the panel edges from the critical curve, positive outside it [M].
    curve : callable
        Distance of the critical curve from the screen's origin [M] at any screen angles [rad].
    nodes, node_weights : arrays (q,)
        Gauss–Legendre rule on (−1, 1).
    """

    order: int
    radii: Array
    angles: Array
    offsets: Array
    curve: Callable[[Array], Array]
    nodes: Array
    node_weights: Array

    @property
    def shape(self) -> tuple[int, int, int]:
        """(panels, q, n_angles): the shape of everything sampled on the band."""
        return len(self.radii) - 1, len(self.nodes), len(self.angles)

    @property
    def edges(self) -> Array:
        """Distance of the panel edges from the screen's origin [M], shape (panels + 1, n_angles)."""
        return self.curve(self.angles) + self.offsets

    @property
    def widths(self) -> Array:
        """From edge to edge of every panel [M], shape (panels, n_angles)."""
        return np.diff(self.offsets, axis=0)

    @property
    def offset(self) -> Array:
        """Distance of every sample from the critical curve [M], shape (panels, q, n_angles)."""
        low, high = self.offsets[:-1, None, :], self.offsets[1:, None, :]
        return 0.5 * (high + low) + 0.5 * (high - low) * self.nodes[None, :, None]

    @property
    def distance(self) -> Array:
        """Distance of every sample from the screen's origin [M], shape (panels, q, n_angles)."""
        return self.curve(self.angles) + self.offset

    @property
    def weight(self) -> Array:
        """Area on the screen that every sample stands for [M²], shape (panels, q, n_angles)."""
        half_width = 0.5 * self.widths[:, None, :]
        step = 2.0 * math.pi / len(self.angles)
        return self.distance * half_width * self.node_weights[None, :, None] * step

    @property
    def alpha(self) -> Array:
        """Screen coordinate α of every sample [M]."""
        return self.distance * np.cos(self.angles)

    @property
    def beta(self) -> Array:
        """Screen coordinate β of every sample [M]."""
        return self.distance * np.sin(self.angles)

    def with_nodes(self, count: int) -> Band:
        """The same panels with another number of nodes in each."""
        points, weights = gauss_legendre(count)
        return replace(self, nodes=points, node_weights=weights)


def panel_radii(edges: Sequence[float], spacetime: Spacetime) -> Array:
    """Radii of the panel edges: the emitter's own, the photon orbit, the innermost stable orbit, and enough
    between for a steep power law.

    Raises
    ------
    ValueError
        If the edges are not at least two finite radii that ascend from the horizon outward.
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
    marks = [spacetime.photon_orbit, spacetime.isco]
    if spacetime.isco in own:
        marks += [spacetime.isco * (1.0 - share) for share in GRADED]
    corners = np.union1d(own, [r for r in marks if own[0] < r < own[-1]])
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
        Ascending radii of the panel edges [M], as `panel_radii` gives them.
    order, angles, nodes : int
        Order of the image, number of screen angles, Gauss–Legendre nodes per panel.
    inclination : float
        [rad]
    spacetime : Spacetime, optional
        Schwarzschild unless given.
    """
    hole = or_default(spacetime)
    steps = (np.arange(angles, dtype=np.float64) + 0.5) * (2.0 * math.pi / angles)
    images = np.array(
        isoradial(radii[:, None], order=order, angle=steps[None, :], inclination=inclination, spacetime=hole)
    )
    curve = partial(hole.critical_radius, inclination)
    offsets = images - curve(steps)
    if order > 0:
        _put_edge_on_critical_curve(offsets, radii == hole.photon_orbit)
    points, weights = gauss_legendre(nodes)
    return Band(order, radii, steps, offsets, curve, points, weights)


def _put_edge_on_critical_curve(offsets: Array, at_photon_orbit: NDArray[np.bool_]) -> None:
    """Move the edge at the photon orbit's image to the critical curve, unless that would cross a neighbour:
    the critical ray still meets the plane somewhat outside the photon orbit.
    """
    for edge in np.flatnonzero(at_photon_orbit[1:-1]) + 1:
        if np.all((offsets[edge - 1] < 0.0) & (offsets[edge + 1] > 0.0)):
            offsets[edge] = 0.0


@cache
def gauss_legendre(count: int) -> tuple[Array, Array]:
    """Nodes and weights of the Gauss–Legendre rule on (−1, 1)."""
    points, weights = legendre.leggauss(count)
    return points, weights
