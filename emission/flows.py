"""How the gas of an equatorial disk moves: at rest, orbiting with a plunge inside, falling, or a blend.

Circular orbits end at the innermost stable orbit; inside it the gas keeps energy and angular momentum of
that orbit (Cunningham 1975, ApJ 202, 788). G = c = M = 1, four-velocities contravariant, any metric that
meets `Spacetime`.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from emission.contract import Array, FourVelocity, checked_radii
from raytrace.contract import Metric, Spacetime
from raytrace.registry import or_default

EQUATOR = math.pi / 2


@dataclass(frozen=True)
class Static:
    """Gas at rest with respect to infinity: u^t = 1/√(−g_tt)."""

    def kinks(self, spacetime: Spacetime | None = None) -> tuple[float, ...]:
        """No kink: the motion is smooth everywhere outside the horizon."""
        return ()

    def four_velocity(self, radius: ArrayLike, *, spacetime: Spacetime | None = None) -> FourVelocity:
        """Four-velocity at radii [M].

        Raises
        ------
        ValueError
            If a radius does not lie outside the horizon.
        """
        radii, metric = _place(radius, or_default(spacetime))
        nothing = np.zeros_like(radii)[()]
        return FourVelocity(1.0 / np.sqrt(-metric.tt), nothing, nothing)


@dataclass(frozen=True)
class Circular:
    """Circular orbits outside the innermost stable orbit, Cunningham's plunge inside it.

    In Schwarzschild the plunge has E = √(8/9), L = √12, u^r = −(1/3)(6/r − 1)^{3/2} (Cunningham 1975, from
    memory).
    """

    def kinks(self, spacetime: Spacetime | None = None) -> tuple[float, ...]:
        """Radius of the innermost stable orbit [M], where u^r sets in as the 3/2 power."""
        return (or_default(spacetime).isco,)

    def four_velocity(self, radius: ArrayLike, *, spacetime: Spacetime | None = None) -> FourVelocity:
        """Four-velocity at radii [M].

        Raises
        ------
        ValueError
            If a radius does not lie outside the horizon.
        """
        hole = or_default(spacetime)
        radii, metric = _place(radius, hole)
        return _circular(hole, radii, metric)


@dataclass(frozen=True)
class RadialFall:
    """Free fall from rest at infinity without angular momentum: E = 1, L = 0."""

    def kinks(self, spacetime: Spacetime | None = None) -> tuple[float, ...]:
        """No kink: the motion is smooth everywhere outside the horizon."""
        return ()

    def four_velocity(self, radius: ArrayLike, *, spacetime: Spacetime | None = None) -> FourVelocity:
        """Four-velocity at radii [M].

        Raises
        ------
        ValueError
            If a radius does not lie outside the horizon.
        """
        _, metric = _place(radius, or_default(spacetime))
        return _infalling(metric, 1.0, 0.0)


@dataclass(frozen=True)
class Blend:
    """Between circular orbits and radial free fall: slower rotation, faster infall.

    Ω = orbit_fraction · Ω_K and u^r = u^r_K + fall_fraction · (u^r_freefall − u^r_K), where K is `Circular`
    with its plunge and Ω_K = u^φ_K/u^t_K; u^t follows from u·u = −1. Both fractions lie in [0, 1].

    It is timelike at every r > 2 in Schwarzschild: u·u = −1 has a real u^t for any u^r as long as r²Ω² < f,
    f = 1 − 2/r. Outside r = 6, r²Ω² ≤ r²Ω_K² = 1/r and 1/(r f) = 1/(r − 2) ≤ 1/4. Inside, Ω_K = f L/(E r²),
    so that r²Ω²/f ≤ (L²/E²) f/r² ≤ 13.5/27 = 1/2, because f/r² has its maximum 1/27 at r = 3.

    Parameters
    ----------
    orbit_fraction, fall_fraction : float
        (1, 0) is `Circular`, (0, 1) is `RadialFall`.

    Raises
    ------
    ValueError
        If a fraction lies outside [0, 1].
    """

    orbit_fraction: float
    fall_fraction: float

    def __post_init__(self) -> None:
        for name in ("orbit_fraction", "fall_fraction"):
            value = getattr(self, name)
            if not 0.0 <= value <= 1.0:
                raise ValueError(
                    f"{name} = {value:g} is outside 0 to 1; 0 leaves out that part of the motion, 1 has all "
                    "of it"
                )

    def kinks(self, spacetime: Spacetime | None = None) -> tuple[float, ...]:
        """Radius of the innermost stable orbit [M], unless the blend is pure free fall."""
        if self.orbit_fraction == 0.0 and self.fall_fraction == 1.0:
            return ()
        return (or_default(spacetime).isco,)

    def four_velocity(self, radius: ArrayLike, *, spacetime: Spacetime | None = None) -> FourVelocity:
        """Four-velocity at radii [M].

        Raises
        ------
        ValueError
            If a radius does not lie outside the horizon.
        """
        hole = or_default(spacetime)
        radii, metric = _place(radius, hole)
        orbit = _circular(hole, radii, metric)
        fall = _infalling(metric, 1.0, 0.0)
        omega = self.orbit_fraction * orbit.phi / orbit.t
        inward = orbit.r + self.fall_fraction * (fall.r - orbit.r)
        room = -metric.tt - omega * (2.0 * metric.t_phi + metric.phi_phi * omega)
        time = np.sqrt((1.0 + metric.rr * inward**2) / room)
        return FourVelocity(time, inward, omega * time)


def _place(radius: ArrayLike, hole: Spacetime) -> tuple[Array, Metric]:
    radii = checked_radii(hole, radius)
    return radii, hole.metric(radii, EQUATOR)


def _circular(hole: Spacetime, radii: Array, metric: Metric) -> FourVelocity:
    """Gas with energy and angular momentum of the circular orbit at r or, inside, of the innermost stable
    one."""
    orbit = hole.circular_orbit(np.maximum(radii, hole.isco))
    motion = _infalling(metric, orbit.energy, orbit.angular_momentum)
    # Outside, u^r is zero by definition; the square root would return rounding noise of about 1e-8.
    return motion._replace(r=np.where(radii < hole.isco, motion.r, 0.0)[()])


def _infalling(metric: Metric, energy: Array | float, angular_momentum: Array | float) -> FourVelocity:
    """Geodesic motion within the plane with given energy and angular momentum per unit mass, inward."""
    block = metric.t_phi**2 - metric.tt * metric.phi_phi
    time = (metric.phi_phi * energy + metric.t_phi * angular_momentum) / block
    turn = -(metric.t_phi * energy + metric.tt * angular_momentum) / block
    radial_squared = (energy * time - angular_momentum * turn - 1.0) / metric.rr
    return FourVelocity(time, -np.sqrt(np.maximum(radial_squared, 0.0)), turn)
