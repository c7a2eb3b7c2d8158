"""The Schwarzschild spacetime: metric, circular orbits, critical curve, and its rays in closed form.

Schwarzschild 1916; circular geodesics as in any textbook of general relativity; critical curve √27 (Hilbert 1917).
Light paths are in `raytrace.kernels.schwarzschild`. G = c = M = 1.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import ClassVar

import numpy as np
from numpy.typing import ArrayLike

from raytrace.contract import Array, CircularOrbit, Hit, Metric

CRITICAL_RADIUS = math.sqrt(27.0)
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
        from raytrace.kernels import threads
        from raytrace.kernels.lanes import crossing_radii
        from raytrace.kernels.schwarzschild import trace_rays

        shape = (orders, alpha.size)
        empty = (0, alpha.size)
        x, y = np.ascontiguousarray(alpha), np.ascontiguousarray(beta)
        cosine, sine = math.cos(inclination), math.sin(inclination)
        cosine = 0.0 if abs(cosine) < EDGE_ON else cosine
        radius = np.full(shape, np.nan)
        turned = np.full(shape if azimuth else empty, np.nan)
        later = np.full(shape if delay else empty, np.nan)
        pushed = np.full((3, *(shape if momentum else empty)), np.nan)
        status = np.zeros(shape, dtype=np.int8)
        fate = np.zeros(alpha.size, dtype=np.int8)
        with threads.LOCK:
            if azimuth or delay or momentum or cosine == 0.0:
                trace_rays(x, y, cosine, sine, radius, turned, later, pushed, status, fate)
            else:
                crossing_radii(x, y, cosine, sine, radius, status, fate)
        return Hit(
            radius=radius,
            azimuth=turned if azimuth else None,
            delay=later if delay else None,
            momentum=pushed if momentum else None,
            status=status,
            fate=fate,
            inclination=inclination,
        )
