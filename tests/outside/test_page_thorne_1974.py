"""Flux of a thin disk: Page & Thorne 1974, ApJ 191, 499 (eq. 15n, number from memory), and its copies.

Values marked CHK were computed independently of this project in arbitrary precision; digits shown are
converged.
"""

from __future__ import annotations

import math

import numpy as np
import pytest
from scipy.integrate import quad
from scipy.optimize import minimize_scalar

import emission as em
from emission.page_thorne import PEAK_FLUX, PEAK_RADIUS, flux

QUADRATURE = 1e-9  # what scipy.integrate.quad is asked for


def energy(r):
    return (1.0 - 2.0 / r) / math.sqrt(1.0 - 3.0 / r)


def luminosity(flux_of_r):
    """Energy per unit rest mass that both faces send to infinity: 4π ∫ F E r dr, with r = 6/x²."""
    return quad(
        lambda x: 4.0 * math.pi * flux_of_r(6.0 / x**2) * energy(6.0 / x**2) * 72.0 / x**5,
        0.0,
        1.0,
        epsabs=QUADRATURE,
        epsrel=QUADRATURE,
    )[0]


def copied_flux(r):
    """The form with √3/3 before the logarithm, which many copies print (Luminet 1979 among them, from
    memory)."""
    root, edge, photon = math.sqrt(r), math.sqrt(6.0), math.sqrt(3.0)
    ratio = (root + photon) * (edge - photon) / ((root - photon) * (edge + photon))
    bracket = root - edge + math.sqrt(3.0) / 3.0 * math.log(ratio)
    return 3.0 / (8.0 * math.pi) * bracket / (r**2.5 * (r - 3.0))


@pytest.mark.parametrize(
    ("radius", "expected", "digits"),
    [
        (7.0, 6.1150103e-6, 1e-7),  # CHK
        (9.550927962, 1.367811083e-5, 1e-9),  # CHK
        (100.0, 7.7858536e-8, 1e-7),  # CHK
    ],
)
def test_flux_samples(radius, expected, digits):
    assert flux(radius) == pytest.approx(expected, rel=digits)


@pytest.mark.parametrize("r", [6.3, 7.0, 12.0, 60.0])
def test_flux_is_what_conservation_leaves(r):
    """Page & Thorne's integral itself, F = −Ω′/(4πr (E − ΩL)²) ∫ (E − ΩL) L′ dr (from memory), by
    quadrature."""

    def rest(s):  # E − ΩL on a circular orbit
        return math.sqrt(1.0 - 3.0 / s)

    def growth(s):  # dL/dr, L = √r/√(1 − 3/r)
        return (s - 6.0) / (2.0 * s**1.5 * (1.0 - 3.0 / s) ** 1.5)

    stored = quad(lambda s: rest(s) * growth(s), 6.0, r, epsrel=QUADRATURE)[0]
    expected = 1.5 * r**-2.5 * stored / (4.0 * math.pi * r * rest(r) ** 2)
    assert flux(r) == pytest.approx(expected, rel=1e-8)


def test_the_disk_radiates_what_its_gas_has_lost_at_the_innermost_stable_orbit():
    # 1 − E_isco = 1 − √(8/9) = 0.0571910 (Bardeen, Press & Teukolsky 1972, ApJ 178, 347; CHK).
    assert luminosity(flux) == pytest.approx(1.0 - math.sqrt(8.0 / 9.0), rel=1e-7)


def test_the_printed_copies_do_not_conserve_energy():
    # CHK: with √3/3 the "efficiency" is 0.0707 and the peak lies at 8.367.
    assert luminosity(copied_flux) == pytest.approx(0.0707, abs=5e-5)
    peak = minimize_scalar(lambda r: -copied_flux(r), bounds=(6.5, 15.0), method="bounded").x
    assert peak == pytest.approx(8.367, abs=5e-4)


def test_the_peak_lies_where_it_was_published():
    # Luminet 1979, A&A 75, 228: r = 9.55 (from memory); CHK 9.550927962.
    peak = minimize_scalar(
        lambda r: -flux(r), bounds=(6.5, 15.0), method="bounded", options={"xatol": 1e-9}
    ).x
    assert peak == pytest.approx(9.55, abs=5e-3)
    assert peak == pytest.approx(PEAK_RADIUS, rel=1e-6)  # a maximum is flat: half the digits
    assert flux(peak) == pytest.approx(PEAK_FLUX, rel=1e-9)


def test_the_profile_is_the_flux_scaled_to_its_peak():
    profile = em.PageThorne(outer=40.0)
    assert profile.brightness(PEAK_RADIUS) == pytest.approx(1.0, rel=1e-9)
    r = np.array([5.0, 6.0, 8.0, 39.0, 41.0])
    expected = np.where((r > 6.0) & (r < 40.0), flux(r) / PEAK_FLUX, 0.0)
    np.testing.assert_allclose(profile.brightness(r), expected, rtol=1e-12)


def test_far_out_the_flux_is_that_of_a_disk_without_relativity():
    # Shakura & Sunyaev 1973, A&A 24, 337: F ∝ r⁻³(1 − √(r_in/r)) (from memory).
    far = 1e6
    newton = 3.0 / (8.0 * math.pi) * far**-3 * (1.0 - math.sqrt(6.0 / far))
    assert flux(far) == pytest.approx(newton, rel=3e-3)
