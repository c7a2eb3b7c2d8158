"""Redshift factor: closed forms for simple motions, and good behaviour at the horizon and off the plane."""

from __future__ import annotations

import dataclasses

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

import emission as em
from raytrace.contract import RayStatus

FLOWS = [
    em.Static(),
    em.Circular(),
    em.RadialFall(),
    em.Blend(orbit_fraction=0.7, fall_fraction=0.5),
]


@pytest.mark.parametrize("inward", [False, True])
def test_radial_fall_and_radial_light_have_their_closed_form(inward, schwarzschild, light):
    # Outward light: g = f/(1 + √(2/r)) = 1 − √(2/r); light sent inward, which a lens may still return: 1 +
    # √(2/r).
    radius = np.geomspace(2.1, 1e4, 300)
    g = em.redshift(em.RadialFall(), light.at(schwarzschild, radius, inward=inward), schwarzschild)
    sign = 1.0 if inward else -1.0
    np.testing.assert_allclose(g[0], 1.0 + sign * np.sqrt(2.0 / radius), rtol=1e-12)


@pytest.mark.parametrize("flow", FLOWS, ids=repr)
@pytest.mark.filterwarnings("error")
def test_light_fades_out_toward_the_horizon_and_stays_finite(flow, schwarzschild, light):
    radius = np.concatenate([[2.0, np.nextafter(2.0, 3.0)], 2.0 + np.geomspace(1e-13, 1e-2, 100)])
    g = em.redshift(flow, light.at(schwarzschild, radius, spin_part=-1.5, impact=2.0), schwarzschild)[0]
    assert np.all(np.isfinite(g))
    assert g[0] == 0.0
    assert np.all(g[1:] > 0.0)
    assert np.all(np.diff(g) > 0.0)
    assert np.all(g <= 2.0 * np.sqrt(1.0 - 2.0 / radius))


@given(
    depth=st.floats(-12.0, 3.0),
    ratio=st.floats(0.0, 1.0),
    tilt=st.floats(-1.0, 1.0),
    orbit=st.floats(0.0, 1.0),
    fall=st.floats(0.0, 1.0),
    inward=st.booleans(),
)
@settings(deadline=None, derandomize=True, max_examples=300)
def test_redshift_is_positive_and_finite_for_all_light(
    depth, ratio, tilt, orbit, fall, inward, schwarzschild, light
):
    r = 2.0 + 10.0**depth
    inward = inward and r > 3.0  # light sent inward from within the photon orbit never comes back
    most = r / np.sqrt(1.0 - 2.0 / r)
    hit = light.at(schwarzschild, r, spin_part=ratio * tilt * most, impact=ratio * most, inward=inward)
    g = em.redshift(em.Blend(orbit_fraction=orbit, fall_fraction=fall), hit, schwarzschild)
    # A receding or approaching speed below √(1/2) on orbits and below 1 in free fall bounds g by 1 + √(2/3)
    # at r > 3.
    assert np.all((g > 0.0) & (g < 4.0))


def test_redshift_is_nan_exactly_where_nothing_is_crossed(schwarzschild, light):
    hit = light.at(schwarzschild, [3.0, 7.0], impact=1.0)
    both = light.stack(hit, light.missed(hit, RayStatus.ESCAPED))
    g = em.redshift(em.Circular(), both, schwarzschild)
    np.testing.assert_array_equal(np.isnan(g), [[False, False], [True, True]])


def test_approaching_gas_shines_blue(schwarzschild, light):
    # λ > 0 is light that shares the rotation: it left gas that came toward the observer.
    toward = em.redshift(
        em.Circular(), light.at(schwarzschild, 10.0, spin_part=9.0, impact=10.0), schwarzschild
    )
    away = em.redshift(
        em.Circular(), light.at(schwarzschild, 10.0, spin_part=-9.0, impact=10.0), schwarzschild
    )
    assert toward > 1.0 > away


def test_a_single_ray_keeps_its_shape(schwarzschild, light):
    hit = light.at(schwarzschild, [7.0], impact=1.0)
    one = dataclasses.replace(
        hit,
        radius=hit.radius[:, 0],
        momentum=hit.momentum[:, :, 0],
        status=hit.status[:, 0],
        fate=hit.fate[0],
    )
    assert em.redshift(em.Static(), one, schwarzschild).shape == (1,)
    disk = em.ThinDisk(profile=em.PowerLaw(inner=2.0, outer=9.0, slope=1.0), flow=em.Static())
    assert em.shade(disk, one, spacetime=schwarzschild).shape == (1, 1)
    assert em.shade(em.Backdrop(), one, spacetime=schwarzschild).shape == (1, 1)


def test_missing_momentum_is_said(schwarzschild, light):
    hit = dataclasses.replace(light.at(schwarzschild, [7.0]), momentum=None)
    with pytest.raises(ValueError, match="trace the rays with momentum=True"):
        em.redshift(em.Static(), hit, schwarzschild)
