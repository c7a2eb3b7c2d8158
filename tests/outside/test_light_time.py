"""How long light takes near a mass: travel times, echoes, coordinate speeds, and the shadow from close by.

Tags as in test_light_bending.py. Constants of the Sun are IAU 2015 nominal values.
"""

from __future__ import annotations

import itertools
import math

import pytest
from scipy.integrate import quad

import raytrace as rt

GM_SUN_SECONDS = 4.92549095e-6  # GM☉/c³, IAU 2015 nominal (CHK)
AU_SECONDS = 499.004784  # light time for one astronomical unit (handbook value)
SOLAR_RADIUS_SECONDS = 6.957e8 / 299_792_458.0


def first_order(r0: float, far: float) -> float:
    """√(R² − r0²) + 2 ln[(R + √(R² − r0²))/r0] + √((R − r0)/(R + r0)): Weinberg 1972, section 8.7 (MEM-H)."""
    root = math.sqrt(far**2 - r0**2)
    return root + 2.0 * math.log((far + root) / r0) + math.sqrt((far - r0) / (far + r0))


@pytest.mark.parametrize(
    ("r0", "far", "exact", "approximate"),
    [(10.0, 1000.0, 1012.744325, 1011.536633), (1000.0, 1e5, 100006.596248, 100006.586509)],
)
def test_one_way_travel_from_closest_approach(r0, far, exact, approximate):
    b = r0 / math.sqrt(1.0 - 2.0 / r0)  # b(10) = 11.180339887 (CHK)
    assert rt.light_time(r0, far, b) == pytest.approx(exact, rel=1e-9)
    assert first_order(r0, far) == pytest.approx(approximate, abs=6e-7)


@pytest.mark.parametrize(
    ("orbit_au", "microseconds"),
    [(0.387098, 220.2), (0.723332, 232.6), (1.523679, 247.2)],
    ids=["Mercury", "Venus", "Mars"],
)
def test_radar_echoes_at_the_solar_limb(orbit_au, microseconds):
    # (4GM/c³) ln(4 r_e r_p/d²), Shapiro 1964, PRL 13, 789; sizes CHK with R☉ = 6.957e8 m. The exact time in these coordinates exceeds
    # the logarithm by 4GM/c³ = 19.70 µs, which depends on the coordinates and is not part of the quoted figure.
    unit = GM_SUN_SECONDS
    earth, planet, limb = (
        seconds / unit for seconds in (AU_SECONDS, orbit_au * AU_SECONDS, SOLAR_RADIUS_SECONDS)
    )
    quoted = 4.0 * unit * math.log(4.0 * earth * planet / limb**2) * 1e6
    assert quoted == pytest.approx(microseconds, abs=0.06)
    b = limb / math.sqrt(1.0 - 2.0 / limb)
    flat = math.sqrt(earth**2 - limb**2) + math.sqrt(planet**2 - limb**2)
    extra = 2.0 * (rt.light_time(earth, planet, b, turns=1) - flat) * unit * 1e6
    assert extra == pytest.approx(quoted + 19.70, abs=0.3)


def test_a_radial_ray_takes_the_tortoise_time():
    # Exact, from dr/dt = 1 − 2/r.
    expected = (100.0 - 3.0) + 2.0 * math.log((100.0 - 2.0) / (3.0 - 2.0))
    assert rt.light_time(3.0, 100.0, 0.0) == pytest.approx(expected, rel=1e-13)
    assert rt.light_time(100.0, 3.0, 0.0) == pytest.approx(expected, rel=1e-13)


def test_light_time_agrees_with_quadrature_of_the_metric():
    def rate(r: float, b: float) -> float:
        return 1.0 / ((1.0 - 2.0 / r) * math.sqrt(1.0 - b**2 / r**2 * (1.0 - 2.0 / r)))

    for near, far, b in ((2.1, 30.0, 4.0), (6.0, 80.0, 5.5), (2.05, 2.2, 6.0)):
        expected = quad(rate, near, far, args=(b,), epsabs=0.0, epsrel=1e-12, limit=200)[0]
        assert rt.light_time(near, far, b) == pytest.approx(expected, rel=1e-9)


def test_a_passage_is_two_ways_to_the_closest_approach():
    b, r0 = 10.0 / math.sqrt(0.8), 10.0
    there, back = rt.light_time(r0, 50.0, b), rt.light_time(r0, 70.0, b)
    assert rt.light_time(50.0, 70.0, b, turns=1) == pytest.approx(there + back, rel=1e-9)


def test_coordinate_light_is_slow_and_local_light_is_not():
    # Coordinate speed 1 − 2/r along the radius and √(1 − 2/r) across it; a local observer always measures 1 (common practice, no source).
    for r in (2.1, 3.0, 6.0, 100.0):
        assert rt.light_speed(r) == pytest.approx(1.0 - 2.0 / r, rel=1e-14)
        assert rt.light_speed(r, direction="tangential") == pytest.approx(math.sqrt(1.0 - 2.0 / r), rel=1e-14)
        for direction in ("radial", "tangential"):
            assert rt.light_speed(r, direction=direction, measured="local") == pytest.approx(1.0, rel=1e-14)


def test_an_echo_over_a_fixed_proper_length_takes_longer_the_nearer_it_runs():
    # Common practice, no source: without bound at the horizon.
    def proper(low: float, high: float) -> float:
        # ∫ dr/√(1 − 2/r) by r = 2 + x², smooth at the horizon.
        return quad(lambda x: 2.0 * math.sqrt(2.0 + x * x), math.sqrt(low - 2.0), math.sqrt(high - 2.0))[0]

    def echo(low: float) -> float:
        from scipy.optimize import brentq

        high = brentq(lambda r: proper(low, r) - 1.0, low + 1e-9, low + 1.0)
        return 2.0 * rt.light_time(low, high, 0.0)

    times = [echo(r) for r in (1000.0, 20.0, 6.0, 3.0, 2.1, 2.001, 2.0 + 1e-9)]
    assert times[0] == pytest.approx(2.0, rel=2e-3)
    assert all(near > far for far, near in itertools.pairwise(times))
    assert times[-1] > 60.0


@pytest.mark.parametrize(
    ("r", "degrees"),
    [
        (2.5, 111.640506),
        (3.0, 90.0),
        (6.0, 45.0),
        (10.0, 27.6945615),
        (50.0, 5.84417829),
        (100.0, 2.94855520),
        (1000.0, 0.297421073),
    ],
)
def test_shadow_of_a_near_observer(r, degrees):
    # sin²α = 27(1 − 2/r)/r², Synge 1966, MNRAS 131, 463; review Perlick & Tsupko 2022, Phys. Rep. 947, 1 (formula MEM-H, values CHK).
    assert math.degrees(rt.shadow_angle(r)) == pytest.approx(degrees, rel=2e-9)


@pytest.mark.parametrize(
    ("given", "words"),
    [
        ((6.0, 500.0, 20.0, 0), "without a turning point"),
        ((20.0, 30.0, 5.0, 1), "passing its closest approach"),
        ((1.9, 5.0, 1.0, 0), "outside the horizon"),
        ((20.0, 30.0, 8.0, 2), "0 times or once"),
    ],
)
def test_a_ray_that_does_not_exist_is_refused(given, words):
    with pytest.raises(ValueError, match=words):
        rt.light_time(*given)


def test_what_has_no_static_observer_is_refused():
    with pytest.raises(ValueError, match="no static observer at 2 M"):
        rt.light_speed(2.0)
    with pytest.raises(ValueError, match="no static observer"):
        rt.shadow_angle(1.5)
    with pytest.raises(ValueError, match="directions are radial and tangential"):
        rt.light_speed(5.0, direction="sideways")
    with pytest.raises(ValueError, match="not finite"):
        rt.deflection(math.nan)
