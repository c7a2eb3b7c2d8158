"""Gas inside the innermost stable orbit: Cunningham 1975, ApJ 202, 788 (equations from memory); orbits of
BPT 1972.

Bardeen, Press & Teukolsky 1972, ApJ 178, 347. Values marked CHK were computed independently in arbitrary
precision.
"""

from __future__ import annotations

import math

import numpy as np
import pytest

import emission as em

CLOSED_FORM = 1e-13  # rounding of sums of order one


@pytest.mark.parametrize(
    ("radius", "inward"),
    [(5.0, -0.0298142), (4.0, -0.1178511), (3.0, -1.0 / 3.0), (2.5, -0.5521674), (2.0 + 1e-9, -0.9428090)],
)
def test_speed_of_the_plunge(radius, inward):
    # CHK, printed to seven digits; the last is the value at the horizon.
    u = em.Circular().four_velocity(radius)
    assert u.r == pytest.approx(inward, abs=6e-8)


def test_the_plunge_in_closed_form():
    r = np.linspace(2.01, 5.99, 300)
    u = em.Circular().four_velocity(r)
    energy, momentum = math.sqrt(8.0 / 9.0), math.sqrt(12.0)
    np.testing.assert_allclose(u.t, energy / (1.0 - 2.0 / r), rtol=CLOSED_FORM)
    np.testing.assert_allclose(u.phi, momentum / r**2, rtol=CLOSED_FORM)
    # u^r is the root of a difference: its square, not itself, has the rounding error of the terms.
    np.testing.assert_allclose(u.r**2, (6.0 / r - 1.0) ** 3 / 9.0, atol=1e-15)


def test_energy_at_the_innermost_stable_orbit():
    # BPT 1972: r_isco = 6, binding energy 1 − √(8/9) = 0.057190958 (CHK).
    u = em.Circular().four_velocity(6.0)
    assert 1.0 - (1.0 - 2.0 / 6.0) * u.t == pytest.approx(0.057190958, abs=5e-10)


@pytest.mark.parametrize("radius", [6.0, 10.0, 100.0])
def test_orbits_outside_are_keplerian(radius):
    # Ω = r^(−3/2) and u^t = (1 − 3/r)^(−1/2): Schwarzschild orbits, any textbook; BPT 1972 at a = 0.
    u = em.Circular().four_velocity(radius)
    assert u.phi / u.t == pytest.approx(radius**-1.5, rel=CLOSED_FORM)
    assert u.t == pytest.approx(1.0 / math.sqrt(1.0 - 3.0 / radius), rel=CLOSED_FORM)
    assert u.r == 0.0


def test_free_fall_from_rest_at_infinity():
    # Textbook (e.g. Misner, Thorne & Wheeler 1973, §31.3): u^t = 1/f, u^r = −√(2/r).
    r = np.geomspace(2.001, 1e4, 200)
    u = em.RadialFall().four_velocity(r)
    np.testing.assert_allclose(u.t, 1.0 / (1.0 - 2.0 / r), rtol=CLOSED_FORM)
    np.testing.assert_allclose(u.r, -np.sqrt(2.0 / r), rtol=1e-11)
    assert np.all(u.phi == 0.0)
