"""What a spacetime offers and what a traced ray brings back: the contract between light paths and everything else.

Geometrised units G = c = M = 1 throughout; angles in radians; arrays are float64. A new metric is a class
that meets `Spacetime`, in one file, and one line in `raytrace.registry`.
"""

from __future__ import annotations

from dataclasses import dataclass
from enum import IntEnum
from typing import NamedTuple, Protocol, runtime_checkable

import numpy as np
from numpy.typing import ArrayLike, NDArray

Array = NDArray[np.float64]
# Length [M] beyond which rays are refused: not far above it a square leaves the range of floating-point numbers.
FARTHEST = 1e150


class RayStatus(IntEnum):
    """How a ray, followed backward from the observer, stands at its crossing of a given order."""

    CROSSED = 0
    ESCAPED = 1
    CAPTURED = 2
    IN_PLANE = 3

    @property
    def sentence(self) -> str:
        """What happened, in one sentence for a reader."""
        return _SENTENCES[self]


_SENTENCES = {
    RayStatus.CROSSED: "the ray meets the equatorial plane outside the horizon",
    RayStatus.ESCAPED: "the ray returns to infinity before it would meet the plane this often",
    RayStatus.CAPTURED: "the ray falls through the horizon before it would meet the plane this often",
    RayStatus.IN_PLANE: "the ray runs within the equatorial plane and so never crosses it",
}


class Metric(NamedTuple):
    """Covariant components of a stationary, axisymmetric metric in (t, r, θ, φ); signature (−, +, +, +)."""

    tt: Array
    rr: Array
    theta_theta: Array
    phi_phi: Array
    t_phi: Array


class CircularOrbit(NamedTuple):
    """Energy and angular momentum per unit mass, and dφ/dt, of an equatorial circular geodesic (prograde)."""

    energy: Array
    angular_momentum: Array
    angular_velocity: Array


@dataclass(frozen=True)
class Hit:
    """Where, when and with what momentum rays meet the equatorial plane.

    Attributes
    ----------
    radius, azimuth, delay : arrays (orders, n)
        [M], [rad] in (−π, π], [M]; NaN wherever `status` is not CROSSED; None if not asked for.
    momentum : array (3, orders, n)
        Covariant p_r, p_θ, p_φ per unit energy (p_t = −1) of the photon as it runs toward the observer.
    status : int8 array (orders, n)
        `RayStatus` of every order.
    fate : int8 array (n,)
        ESCAPED or CAPTURED: where the ray ends if nothing stops it.
    inclination : float
        [rad]
    """

    radius: Array
    azimuth: Array | None
    delay: Array | None
    momentum: Array | None
    status: NDArray[np.int8]
    fate: NDArray[np.int8]
    inclination: float

    def only(self, order: int) -> Hit:
        """The crossings of one order alone, as arrays of one row."""
        row = slice(order, order + 1)
        return Hit(
            radius=self.radius[row],
            azimuth=None if self.azimuth is None else self.azimuth[row],
            delay=None if self.delay is None else self.delay[row],
            momentum=None if self.momentum is None else self.momentum[:, row],
            status=self.status[row],
            fate=self.fate,
            inclination=self.inclination,
        )


@runtime_checkable
class Spacetime(Protocol):
    """What every metric offers. Radii in M; equatorial and prograde where it matters."""

    @property
    def name(self) -> str: ...

    @property
    def horizon(self) -> float: ...

    @property
    def photon_orbit(self) -> float: ...

    @property
    def isco(self) -> float: ...

    def metric(self, r: ArrayLike, theta: ArrayLike) -> Metric:
        """Covariant components at (r, θ)."""
        ...

    def circular_orbit(self, r: ArrayLike) -> CircularOrbit:
        """Circular geodesic at radius r outside the photon orbit."""
        ...

    def critical_radius(self, inclination: float, angle: Array) -> Array:
        """Radius of the critical curve at screen angles from +α."""
        ...

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
        """Trace checked one-dimensional arrays of screen positions."""
        ...
