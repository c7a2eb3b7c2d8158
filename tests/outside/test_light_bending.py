"""Bending of light by a mass without spin: exact values, the weak-field series, and the logarithm near the critical curve.

Tags: CHK, computed independently of this project in arbitrary precision; ABS, read in the paper's abstract; MEM-H, -M, -L, recalled from
memory with high, medium or low confidence.
"""

from __future__ import annotations

import math

import pytest

import raytrace as rt
from ringwright.units import GM_SUN

# Exact deflection angles, CHK (elliptic integrals).
EXACT = {
    5.2: 6.8103719567,
    6.0: 1.7193883102,
    10.0: 0.590395787606,
    20.0: 0.236135995388,
    100.0: 0.0412225397493,
    1000.0: 0.00401182380993,
}
# Impact parameters of given deflections, CHK; π/2 and 3π/2 are the outer edges of the lensed and photon rings of
# Gralla, Holz & Wald 2019, PRD 100, 024018, section II (MEM-H).
TURNED = {0.5: 6.16756676477, 1.0: 5.35695863074, 1.5: 5.22793860853, 2.0: 5.20268040281, 3.0: 5.19643350111}


@pytest.mark.parametrize(("b", "angle"), EXACT.items())
def test_deflection_has_its_exact_value(b, angle):
    assert rt.deflection(b) == pytest.approx(angle, rel=1e-9)


@pytest.mark.parametrize(("half_turns", "b"), TURNED.items())
def test_deflection_by_parts_of_a_turn(half_turns, b):
    # The printed b has 12 digits; near the critical curve the angle amplifies its last one.
    loose = 6e-12 / (b - math.sqrt(27.0))
    assert rt.deflection(b) == pytest.approx(half_turns * math.pi, rel=1e-10, abs=loose)


def test_weak_deflection_follows_the_series():
    # Keeton & Petters 2005, PRD 72, 104006; Iyer & Petters 2007, GRG 39, 1563 (MEM-H, CHK).
    series = [4, 15 * math.pi / 4, 128 / 3, 3465 * math.pi / 64, 3584 / 5, 255255 * math.pi / 256, 98304 / 7]
    closed = [
        math.sqrt(math.pi) * 2**n * math.gamma((3 * n + 1) / 2) / (math.factorial(n) * math.gamma(n / 2 + 1))
        for n in range(1, 8)
    ]
    assert series == pytest.approx(closed, rel=1e-12)
    for b in (50.0, 300.0, 1e4, 1e6):
        total = sum(term / b**n for n, term in enumerate(series, start=1))
        left_out = 334639305 * math.pi / 16384 / b**8
        assert abs(rt.deflection(b) - total) <= 1.5 * left_out + 1e-12 * total


def test_series_in_the_distance_of_closest_approach():
    # α̂ = 4x + (15π/4 − 4)x² + (122/3 − 15π/2)x³ + …, x = 1/r0; r0 = 100: 0.0407952 against the exact 0.0407956 (CHK).
    r0 = 100.0
    b = r0 / math.sqrt(1.0 - 2.0 / r0)
    assert b == pytest.approx(101.015254455, abs=1e-9)
    x = 1.0 / r0
    series = 4 * x + (15 * math.pi / 4 - 4) * x**2 + (122 / 3 - 15 * math.pi / 2) * x**3
    assert series == pytest.approx(0.0407952, abs=5e-8)
    assert rt.deflection(b) == pytest.approx(0.0407956, abs=5e-8)


@pytest.mark.parametrize(("half_turns", "error"), [(1.0, 1.9e-3), (2.0, 4.8e-6), (3.0, 1.2e-8)])
def test_strong_deflection_follows_darwins_logarithm_to_its_stated_error(half_turns, error):
    # Darwin 1959, Proc. R. Soc. A249, 180; Luminet 1979, A&A 75, 228 (whose printed 5.19695 is a misprint of √27); MEM-H.
    coefficient = math.sqrt(27.0) * 216.0 * (7.0 - 4.0 * math.sqrt(3.0)) * math.exp(-math.pi)
    assert coefficient == pytest.approx(3.48228397530, rel=1e-11)
    law = math.sqrt(27.0) + coefficient * math.exp(-half_turns * math.pi)
    low, high = math.sqrt(27.0), 6.0
    for _ in range(60):  # the b that the exact deflection asks for
        b = 0.5 * (low + high)
        low, high = (b, high) if rt.deflection(b) > half_turns * math.pi else (low, b)
    assert abs(law / b - 1.0) == pytest.approx(error, rel=0.05)


def test_strong_field_coefficients():
    # Bozza 2002, PRD 66, 103001, Table I: ā = 1, b̄ = ln[216(7 − 4√3)] − π = −0.4002 (MEM-H, CHK).
    b_bar = math.log(216.0 * (7.0 - 4.0 * math.sqrt(3.0))) - math.pi
    assert b_bar == pytest.approx(-0.400230039755, abs=1e-12)
    critical = math.sqrt(27.0)
    for distance in (1e-5, 1e-7):
        b = critical * (1.0 + distance)
        assert rt.deflection(b) == pytest.approx(-math.log(b / critical - 1.0) + b_bar, abs=20 * distance)
    # Angular separation of the first relativistic image over θ∞, s/θ∞ = exp(b̄ − 2π) = 0.00125150, and r_m = 6.8219 mag.
    assert math.exp(b_bar - 2.0 * math.pi) == pytest.approx(0.0012514964, abs=1e-10)
    assert 2.5 * math.log10(math.exp(2.0 * math.pi)) == pytest.approx(6.8218818, abs=1e-7)


def test_rays_inside_the_critical_curve_are_captured():
    # Capture cross-section 27π (Hilbert 1917; Darwin 1959).
    for b in (0.0, 3.0, math.sqrt(27.0) * (1.0 - 1e-14)):
        assert rt.deflection(b) == math.inf
    assert math.isfinite(rt.deflection(math.sqrt(27.0) * (1.0 + 1e-14)))
    assert 27.0 * math.pi == pytest.approx(84.823, abs=1e-3)


def solar_limb(radius: float) -> float:
    """Deflection at the solar limb in arcseconds, for a solar radius in metres."""
    from astropy.constants import c

    unit = float((GM_SUN / c**2).to_value("m"))
    assert unit == pytest.approx(1476.62504, abs=1e-5)  # GM☉/c², IAU 2015 nominal (CHK)
    r0 = radius / unit
    return math.degrees(rt.deflection(r0 / math.sqrt(1.0 - 2.0 / r0))) * 3600.0


def test_light_at_the_solar_limb():
    # 1.7512″ for the IAU nominal radius 6.957e8 m (CHK 1.751190), 1.7505″ for 6.960e8 m (CHK 1.75044).
    assert solar_limb(6.957e8) == pytest.approx(1.751190, abs=1.5e-5)
    assert solar_limb(6.960e8) == pytest.approx(1.75044, abs=1.5e-5)


def test_light_at_the_solar_limb_agrees_with_the_astronomers_reference_library():
    """erfa.ld (the IAU's SOFA routines, from astropy's dependency) is first order in M: agreement to second order."""
    import erfa
    import numpy as np
    from astropy.constants import au

    schwarzschild_au = 2.0 * 1476.62504 / float(au.value)
    limb = 6.957e8 / float(au.value)
    # Observer at 1 au, a star just at the limb on the far side: unit vectors source, Sun → source, Sun → observer.
    elongation = math.asin(limb)
    direction = np.array([math.cos(elongation), math.sin(elongation), 0.0])
    sun_to_observer = np.array([-1.0, 0.0, 0.0])
    bent = erfa.ld(1.0, direction, direction, sun_to_observer, 1.0, 1e-9)
    angle = math.atan2(bent[1], bent[0]) - elongation
    # From the limb to the Earth a ray is bent by half of (1 + cos of the elongation) times the whole.
    whole = angle / (0.5 * (1.0 + math.cos(elongation)))
    assert math.degrees(whole) * 3600.0 == pytest.approx(solar_limb(6.957e8), rel=2e-5)
    assert schwarzschild_au == pytest.approx(
        1.97412574336e-8, rel=1e-5
    )  # SOFA's value of the Sun's 2GM/c² in au
