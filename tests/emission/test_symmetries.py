"""Whole images: mirror symmetries, and which side of a fast disk is bright."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import pytest

import emission as em
import raytrace as rt

# Radii of mirrored rays agree to about 1e-13, and a steep profile multiplies that by its slope and κ = |∂ln
# r/∂ln b|.
MIRROR = 1e-9
PROFILE = em.PowerLaw(inner=2.6, outer=50.0, slope=3.7, edge_width=0.4)
MOVING = [em.Circular(), em.Blend(orbit_fraction=0.7, fall_fraction=0.5)]
RADIAL = [em.Static(), em.RadialFall()]


@dataclass(frozen=True)
class Reversed:
    """The same motion turning the other way."""

    flow: em.Flow

    def kinks(self, spacetime=None):
        return self.flow.kinks(spacetime)

    def four_velocity(self, radius, *, spacetime=None):
        u = self.flow.four_velocity(radius, spacetime=spacetime)
        return u._replace(phi=-u.phi)


@pytest.fixture(scope="module")
def screen():
    return np.random.default_rng(7).uniform(-15.0, 15.0, (2, 2000))


def image(flow, alpha, beta, degrees):
    hit = rt.trace(alpha, beta, inclination=np.radians(degrees), orders=3)
    return em.shade(em.ThinDisk(profile=PROFILE, flow=flow, slant=True), hit)


@pytest.mark.parametrize("flow", RADIAL, ids=repr)
@pytest.mark.parametrize("degrees", [20.0, 75.0, 130.0])
def test_gas_that_does_not_turn_looks_the_same_in_the_mirror(flow, degrees, screen):
    alpha, beta = screen
    np.testing.assert_allclose(
        image(flow, alpha, beta, degrees), image(flow, -alpha, beta, degrees), rtol=MIRROR, atol=1e-12
    )


@pytest.mark.parametrize("flow", MOVING, ids=repr)
@pytest.mark.parametrize("degrees", [20.0, 75.0, 130.0])
def test_the_mirror_reverses_the_rotation(flow, degrees, screen):
    alpha, beta = screen
    there, mirrored = image(flow, alpha, beta, degrees), image(flow, -alpha, beta, degrees)
    np.testing.assert_allclose(there, image(Reversed(flow), -alpha, beta, degrees), rtol=MIRROR, atol=1e-12)
    assert np.max(np.abs(there - mirrored)) > 0.1 * np.max(there)


@pytest.mark.parametrize("flow", MOVING + RADIAL, ids=repr)
@pytest.mark.parametrize("degrees", [20.0, 75.0])
def test_seen_from_below_the_image_is_upside_down(flow, degrees, screen):
    alpha, beta = screen
    np.testing.assert_allclose(
        image(flow, alpha, beta, degrees), image(flow, alpha, -beta, 180.0 - degrees), rtol=MIRROR, atol=1e-12
    )


@pytest.mark.parametrize("degrees", [20.0, 160.0])
@pytest.mark.parametrize("flow", MOVING, ids=repr)
def test_a_fast_disk_is_brightest_where_it_approaches(flow, degrees):
    # α < 0 approaches for every inclination between 0° and 180°, because λ = −α sin i.
    side = np.linspace(-12.0, 12.0, 201)
    alpha, beta = (axis.ravel() for axis in np.meshgrid(side, side))
    total = image(flow, alpha, beta, degrees)[0].sum(axis=0)
    assert alpha[np.argmax(total)] < 0.0
    assert total[alpha < 0.0].sum() > 1.1 * total[alpha > 0.0].sum()
