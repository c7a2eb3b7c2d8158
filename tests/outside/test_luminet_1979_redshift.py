"""Redshift of orbiting gas: Luminet 1979, A&A 75, 228 (formula from memory), and samples of g.

1 + z = (1 − 3/r)^(−1/2) (1 + r^(−3/2) b sin θ₀ sin α), α from the projected axis: here b sin α is the screen
coordinate α, whose negative side approaches. Values marked CHK were computed independently in arbitrary
precision.
"""

from __future__ import annotations

import numpy as np
import pytest

import emission as em
import raytrace as rt

# b_0(r) of face-on circles (CHK) good to nine digits; g depends on it only through the radius that it
# traces to.
FACE_ON = {6.0: (6.93214848, 0.70710678), 10.0: (10.95611505, 0.83666003), 20.0: (20.97665114, 0.92195445)}
PRINTED = 1e-8


def ray_in_the_plane(r, direction):
    """A photon that leaves radius r along the orbit (+1) or against it (−1): p_r = 0, λ = ±r/√(1 − 2/r)."""
    lam = direction * r / np.sqrt(1.0 - 2.0 / r)
    return rt.Hit(
        radius=np.array([[r]]),
        azimuth=None,
        delay=None,
        momentum=np.array([0.0, 0.0, lam]).reshape(3, 1, 1),
        status=np.zeros((1, 1), dtype=np.int8),
        fate=np.array([rt.RayStatus.ESCAPED], dtype=np.int8),
        inclination=np.pi / 2,
    )


@pytest.mark.parametrize("degrees", [5.0, 30.0, 60.0, 85.0, 120.0, 170.0])
def test_redshift_formula_on_traced_rays(degrees):
    inclination = np.radians(degrees)
    rng = np.random.default_rng(1979)
    alpha, beta = rng.uniform(-25.0, 25.0, (2, 4000))
    hit = rt.trace(alpha, beta, inclination=inclination, orders=2)
    g = em.redshift(em.Circular(), hit)
    orbiting = hit.radius >= 6.0
    r = hit.radius[orbiting]
    sideways = np.broadcast_to(alpha, hit.radius.shape)[orbiting]
    expected = (1.0 + r**-1.5 * sideways * np.sin(inclination)) / np.sqrt(1.0 - 3.0 / r)
    assert orbiting.sum() > 3000
    np.testing.assert_allclose(1.0 / g[orbiting], expected, rtol=1e-11)


@pytest.mark.parametrize("radius", FACE_ON)
def test_face_on_samples(radius):
    b, expected = FACE_ON[radius]
    g = em.redshift(em.Circular(), rt.trace(0.0, b, inclination=0.0, orders=1))
    assert g[0] == pytest.approx(expected, abs=PRINTED)


@pytest.mark.parametrize(
    ("radius", "blue", "red"), [(6.0, 1.41421356, 0.47140452), (10.0, 1.29424459, 0.61812119)]
)
def test_edge_on_extremes(radius, blue, red):
    # CHK: light tangential to the orbit, along it and against it.
    assert em.redshift(em.Circular(), ray_in_the_plane(radius, +1))[0, 0] == pytest.approx(blue, abs=PRINTED)
    assert em.redshift(em.Circular(), ray_in_the_plane(radius, -1))[0, 0] == pytest.approx(red, abs=PRINTED)
