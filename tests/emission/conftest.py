"""Crossings and spacetimes made by hand, so that emission is tested without tracing a ray."""

from __future__ import annotations

import math
from types import SimpleNamespace

import numpy as np
import pytest

from raytrace.contract import CircularOrbit, Hit, Metric, RayStatus


class StaticToy:
    """A static charged hole, f = 1 − 2/r + q²/r² (Reissner 1916, Nordström 1918); charge 0 is Schwarzschild.

    Written for the tests alone, straight from g = diag(−f, 1/f, r², r² sin²θ) and circular geodesics
    Ω² = f′/(2r), E = f u^t, L = r² Ω u^t: emission must not need more of a spacetime than this.
    """

    def __init__(self, charge: float = 0.0) -> None:
        self.name = f"toy with charge {charge:g}"
        self.charge_squared = charge**2
        self.horizon = 1.0 + math.sqrt(1.0 - self.charge_squared)
        self.photon_orbit = (3.0 + math.sqrt(9.0 - 8.0 * self.charge_squared)) / 2.0
        self.isco = self._least_energy()

    def f(self, r):
        return 1.0 - 2.0 / r + self.charge_squared / r**2

    def metric(self, r, theta):
        r = np.asarray(r, dtype=np.float64)
        f = self.f(r)
        return Metric(-f, 1.0 / f, r**2, (r * np.sin(theta)) ** 2, np.zeros_like(r))

    def circular_orbit(self, r):
        r = np.asarray(r, dtype=np.float64)
        omega = np.sqrt((1.0 / r**2 - self.charge_squared / r**3) / r)
        time = 1.0 / np.sqrt(self.f(r) - (r * omega) ** 2)
        return CircularOrbit(self.f(r) * time, r**2 * omega * time, omega)

    def _least_energy(self) -> float:
        # The innermost stable orbit of a charged hole: r³ − 6r² + 9q²r − 4q⁴ = 0, largest real root.
        q2 = self.charge_squared
        roots = np.roots([1.0, -6.0, 9.0 * q2, -4.0 * q2**2])
        return float(max(root.real for root in roots if abs(root.imag) < 1e-9))

    def critical_radius(self, inclination, angle):
        raise NotImplementedError

    def trace_rays(self, alpha, beta, inclination, orders, azimuth, delay, momentum):
        raise NotImplementedError


@pytest.fixture(scope="session")
def schwarzschild():
    return StaticToy(0.0)


@pytest.fixture(scope="session")
def charged():
    return StaticToy(0.6)


@pytest.fixture(scope="session")
def toy():
    return StaticToy


def light_at(hole, radius, *, spin_part=0.0, impact=0.0, inward=False):
    """One order of crossings with null momentum: λ = spin_part, total angular momentum b = impact, p_t =
    −1."""
    r = np.atleast_1d(np.asarray(radius, dtype=np.float64))
    spin_part, impact, r = np.broadcast_arrays(np.asarray(spin_part, float), np.asarray(impact, float), r)
    f = hole.f(r)
    with np.errstate(divide="ignore"):
        radial = np.sqrt(np.maximum(1.0 - f * impact**2 / r**2, 0.0)) / f
    polar = np.sqrt(np.maximum(impact**2 - spin_part**2, 0.0))
    momentum = np.stack([np.where(inward, -radial, radial), polar, spin_part])[:, None, :]
    return Hit(
        radius=r[None, :].copy(),
        azimuth=None,
        delay=None,
        momentum=momentum,
        status=np.zeros((1, r.size), dtype=np.int8),
        fate=np.full(r.size, int(RayStatus.ESCAPED), dtype=np.int8),
        inclination=1.0,
    )


def stack(*hits):
    """Several hand-made orders of the same rays as one Hit."""
    return Hit(
        radius=np.concatenate([h.radius for h in hits]),
        azimuth=None,
        delay=None,
        momentum=np.concatenate([h.momentum for h in hits], axis=1),
        status=np.concatenate([h.status for h in hits]),
        fate=hits[0].fate,
        inclination=hits[0].inclination,
    )


def missed(hit, status):
    """The same rays with nothing but NaN and a status other than CROSSED."""
    return Hit(
        radius=np.full_like(hit.radius, np.nan),
        azimuth=None,
        delay=None,
        momentum=np.full_like(hit.momentum, np.nan),
        status=np.full_like(hit.status, int(status)),
        fate=hit.fate,
        inclination=hit.inclination,
    )


@pytest.fixture(scope="session")
def light():
    return SimpleNamespace(at=light_at, stack=stack, missed=missed)
