"""Disks of gas at rest seen face-on: Gralla, Holz & Wald 2019, PRD 100, 024018, fig. 5 (description from
memory).

Emission that ends sharply at r = 6, 3 or 2 shows an edge at every order's image of that circle; with g² = 1
− 2/r the bolometric brightness there is 4/9, 1/9 and 0 of the emitted one. Image radii are CHK: exact,
computed independently of this project.
"""

from __future__ import annotations

import numpy as np
import pytest

import emission as em
import raytrace as rt

IMAGES = {  # r: b of orders 0, 1, 2 (CHK)
    2.0: (2.84769633, 5.01513549, 5.18780817),
    3.0: (3.88426557, 5.18991324, 5.19614030),
    6.0: (6.93214848, 5.47891372, 5.20798959),
}
# Far above the last printed digit of b, and less than a thousandth of the distance between orders.
BESIDE = 1e-6


def seen(inner, b):
    """Brightness per order of a flat disk at rest; s = 1 gives the fourth power of g that a bolometric one
    has."""
    disk = em.ThinDisk(
        profile=em.PowerLaw(inner=inner, outer=60.0, slope=0.0), flow=em.Static(), spectral_index=1.0
    )
    b = np.atleast_1d(b)
    return em.shade(disk, rt.trace(np.zeros_like(b), b, inclination=0.0, orders=3))[0]


@pytest.mark.parametrize("order", [0, 1, 2])
@pytest.mark.parametrize("inner", IMAGES)
def test_brightness_sets_in_at_the_image_of_the_edge(inner, order):
    b = IMAGES[inner][order]
    dark, bright = seen(inner, np.array([b * (1.0 - BESIDE), b * (1.0 + BESIDE)]))[order]
    assert dark == 0.0
    assert bright > 0.0


@pytest.mark.parametrize(("inner", "factor"), [(6.0, 4.0 / 9.0), (3.0, 1.0 / 9.0), (2.0, 0.0)])
def test_bolometric_factor_at_the_edge(inner, factor):
    b = IMAGES[inner][0]
    assert seen(inner, b * (1.0 + BESIDE))[0, 0] == pytest.approx(factor, abs=2e-5)


def test_three_peaks_of_a_disk_that_ends_at_the_innermost_stable_orbit():
    # "Peaks near b ≈ 7, 5.5, 5.2" (fig. 5, from memory) of emission that falls outward from r = 6.
    disk = em.ThinDisk(
        profile=em.PowerLaw(inner=6.0, outer=60.0, slope=6.0), flow=em.Static(), spectral_index=1.0
    )
    b = np.linspace(5.0, 9.0, 40001)
    image = em.shade(disk, rt.trace(np.zeros_like(b), b, inclination=0.0, orders=3))[0]
    np.testing.assert_allclose(b[np.argmax(image, axis=1)], [6.9, 5.5, 5.2], atol=0.1)
