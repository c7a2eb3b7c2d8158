"""Motions of the gas: where they meet, what they conserve, and that a blend is slower than light
everywhere."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

import emission as em

# Sums of a few float64 terms of order one.
ROUNDING = 1e-13
fraction = st.floats(0.0, 1.0)
RADII = np.concatenate([2.0 + np.geomspace(1e-12, 4.0, 500), np.geomspace(6.0, 1e5, 500)])


def assert_same_motion(one, other, rtol):
    for a, b in zip(one, other, strict=True):
        np.testing.assert_allclose(a, b, rtol=rtol, atol=1e-14)


@pytest.mark.parametrize(
    ("blend", "plain"),
    [
        (em.Blend(orbit_fraction=1.0, fall_fraction=0.0), em.Circular()),
        (em.Blend(orbit_fraction=0.0, fall_fraction=1.0), em.RadialFall()),
    ],
)
def test_a_blend_ends_in_the_motions_it_blends(blend, plain, schwarzschild):
    # Close to the horizon u^t ≈ 1/f carries the rounding of f = 1 − 2/r, 1e-16/f, in different ways.
    radius = RADII[RADII > 2.0 + 1e-6]
    one = blend.four_velocity(radius, spacetime=schwarzschild)
    assert_same_motion(one, plain.four_velocity(radius, spacetime=schwarzschild), 1e-9)


@given(orbit=fraction, fall=fraction)
@settings(deadline=None, derandomize=True, max_examples=60)
def test_a_blend_keeps_half_the_room_that_the_proof_promises(orbit, fall, schwarzschild):
    u = em.Blend(orbit_fraction=orbit, fall_fraction=fall).four_velocity(RADII, spacetime=schwarzschild)
    f = schwarzschild.f(RADII)
    omega = u.phi / u.t
    assert np.all((RADII * omega) ** 2 <= 0.5 * f * (1.0 + ROUNDING))
    assert np.all(np.isfinite(u.t))
    assert np.all(u.t * np.sqrt(f) >= 1.0 - ROUNDING)


@given(orbit=fraction, fall=fraction)
@settings(deadline=None, derandomize=True, max_examples=60)
def test_a_blend_turns_and_falls_by_its_fractions(orbit, fall, schwarzschild):
    radius = np.array([2.5, 4.0, 5.9, 8.0, 30.0])
    orbiting = em.Circular().four_velocity(radius, spacetime=schwarzschild)
    falling = em.RadialFall().four_velocity(radius, spacetime=schwarzschild)
    u = em.Blend(orbit_fraction=orbit, fall_fraction=fall).four_velocity(radius, spacetime=schwarzschild)
    np.testing.assert_allclose(u.phi / u.t, orbit * orbiting.phi / orbiting.t, rtol=ROUNDING)
    np.testing.assert_allclose(u.r, (1.0 - fall) * orbiting.r + fall * falling.r, rtol=1e-12, atol=1e-14)


@pytest.mark.parametrize("fractions", [(-0.1, 0.5), (0.5, 1.2), (float("nan"), 0.0)])
def test_fractions_outside_zero_to_one_are_refused(fractions):
    with pytest.raises(ValueError, match="is outside 0 to 1"):
        em.Blend(orbit_fraction=fractions[0], fall_fraction=fractions[1])


@pytest.mark.parametrize("charge", [0.0, 0.6])
def test_the_plunge_keeps_energy_and_angular_momentum_of_the_innermost_stable_orbit(charge, toy):
    hole = toy(charge)
    radius = np.linspace(hole.horizon * 1.001, hole.isco, 200)
    u = em.Circular().four_velocity(radius, spacetime=hole)
    last = hole.circular_orbit(hole.isco)
    np.testing.assert_allclose(hole.f(radius) * u.t, last.energy, rtol=ROUNDING)
    np.testing.assert_allclose(radius**2 * u.phi, last.angular_momentum, rtol=ROUNDING)
    assert np.all(np.diff(u.r) >= 0.0)


def test_motion_is_continuous_across_the_innermost_stable_orbit(schwarzschild):
    inside, outside = 6.0 * (1.0 - 1e-9), 6.0 * (1.0 + 1e-9)
    one = em.Circular().four_velocity(inside, spacetime=schwarzschild)
    other = em.Circular().four_velocity(outside, spacetime=schwarzschild)
    np.testing.assert_allclose(one, other, atol=1e-7)


def test_orbits_do_not_drift_outside_the_innermost_stable_orbit(schwarzschild):
    radius = np.linspace(6.0, 60.0, 1000)
    assert np.all(em.Circular().four_velocity(radius, spacetime=schwarzschild).r == 0.0)


def test_the_kink_follows_the_spacetime(charged):
    assert em.Circular().kinks(charged) == (charged.isco,)
    assert em.Circular().kinks() == (6.0,)
    assert em.Blend(orbit_fraction=0.0, fall_fraction=1.0).kinks(charged) == ()
    assert em.Blend(orbit_fraction=0.0, fall_fraction=0.5).kinks(charged) == (charged.isco,)
