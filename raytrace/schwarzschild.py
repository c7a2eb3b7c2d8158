"""The Schwarzschild spacetime: metric, circular orbits, critical curve, and its rays in closed form.

Schwarzschild 1916; circular geodesics as in any textbook of general relativity; critical curve √27 (Hilbert 1917).
Light paths are in `raytrace.kernels.schwarzschild`. G = c = M = 1.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import ClassVar, NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

from raytrace.contract import Array, CircularOrbit, Hit, Metric

CRITICAL_RADIUS = math.sqrt(27.0)
# Rays that are worth a thread: about a millisecond each way.
FEWEST_RAYS, FEWEST_IN_LANES = 1024, 8192
# |cos i| below this is an exactly edge-on view: half a unit in the last place of π/2.
EDGE_ON = 1e-16


@dataclass(frozen=True)
class Schwarzschild:
    """A black hole without spin or charge.

    Attributes
    ----------
    name : str
    horizon, photon_orbit, isco : float
        2, 3 and 6 [M].
    """

    name: ClassVar[str] = "schwarzschild"
    horizon: ClassVar[float] = 2.0
    photon_orbit: ClassVar[float] = 3.0
    isco: ClassVar[float] = 6.0

    def metric(self, r: ArrayLike, theta: ArrayLike) -> Metric:
        """Covariant components at (r, θ), broadcast."""
        radius, angle = np.broadcast_arrays(
            np.asarray(r, dtype=np.float64), np.asarray(theta, dtype=np.float64)
        )
        f = 1.0 - 2.0 / radius
        zero = np.zeros_like(radius)
        return Metric(-f, 1.0 / f, radius**2 + zero, (radius * np.sin(angle)) ** 2, zero)

    def circular_orbit(self, r: ArrayLike) -> CircularOrbit:
        """Energy, angular momentum and angular velocity of a circular geodesic.

        Raises
        ------
        ValueError
            At or inside the photon orbit, where there is none.
        """
        radius = np.asarray(r, dtype=np.float64)
        if not np.all(radius > self.photon_orbit):
            raise ValueError(
                f"there is no circular orbit of matter at {np.min(radius):g} M; radii beyond the photon orbit at "
                f"{self.photon_orbit:g} M are accepted"
            )
        root = np.sqrt(1.0 - 3.0 / radius)
        return CircularOrbit((1.0 - 2.0 / radius) / root, np.sqrt(radius) / root, radius**-1.5)

    def critical_radius(self, inclination: float, angle: Array) -> Array:
        """√27 at every screen angle."""
        return np.full(np.shape(angle), CRITICAL_RADIUS)

    def trace_rays(
        self,
        alpha: Array,
        beta: Array,
        inclination: float,
        orders: int,
        azimuth: bool,
        delay: bool,
        momentum: bool,
    ) -> Hit:
        """Trace checked one-dimensional float64 arrays; see `raytrace.trace`."""
        x, y = np.ascontiguousarray(alpha), np.ascontiguousarray(beta)
        cosine, sine = math.cos(inclination), math.sin(inclination)
        if abs(cosine) < EDGE_ON:
            cosine = 0.0
        if azimuth or delay or momentum or cosine == 0.0:
            found = _crossings(x, y, cosine, sine, orders, azimuth, delay, momentum)
        else:
            found = _radii(x, y, cosine, sine, orders)
        return Hit(
            radius=found.radius,
            azimuth=found.azimuth if azimuth else None,
            delay=found.delay if delay else None,
            momentum=found.momentum if momentum else None,
            status=found.status,
            fate=found.fate,
            inclination=inclination,
        )


class _Found(NamedTuple):
    """What a kernel fills; azimuth, delay and momentum have no rows where they are not asked for."""

    radius: Array
    azimuth: Array
    delay: Array
    momentum: Array
    status: NDArray[np.int8]
    fate: NDArray[np.int8]


def _blank(orders: int, rays: int, azimuth: bool, delay: bool, momentum: bool) -> _Found:
    """Room for a kernel's results: NaN until a crossing is found."""
    shape, nothing = (orders, rays), (0, rays)
    return _Found(
        np.full(shape, np.nan),
        np.full(shape if azimuth else nothing, np.nan),
        np.full(shape if delay else nothing, np.nan),
        np.full((3, *(shape if momentum else nothing)), np.nan),
        np.zeros(shape, dtype=np.int8),
        np.zeros(rays, dtype=np.int8),
    )


def _crossings(
    x: Array, y: Array, cosine: float, sine: float, orders: int, azimuth: bool, delay: bool, momentum: bool
) -> _Found:
    """Everything asked for, ray by ray."""
    from raytrace.kernels import threads
    from raytrace.kernels.schwarzschild import trace_rays

    found = _blank(orders, x.size, azimuth, delay, momentum)
    threads.in_blocks(lambda a, b: trace_rays(a, b, x, y, cosine, sine, *found), x.size, least=FEWEST_RAYS)
    return found


def _radii(x: Array, y: Array, cosine: float, sine: float, orders: int) -> _Found:
    """Radii alone, many rays at a time; the few rays that need care one by one."""
    from raytrace.kernels import threads
    from raytrace.kernels.lanes import LEFT, crossing_radii

    found = _blank(orders, x.size, False, False, False)
    filled = found.radius, found.status, found.fate
    threads.in_blocks(
        lambda a, b: crossing_radii(a, b, x, y, cosine, sine, *filled), x.size, least=FEWEST_IN_LANES
    )
    left = np.flatnonzero(found.fate == LEFT)
    if left.size:
        rest = _crossings(x[left], y[left], cosine, sine, orders, False, False, False)
        found.radius[:, left], found.status[:, left], found.fate[left] = rest.radius, rest.status, rest.fate
    return found
