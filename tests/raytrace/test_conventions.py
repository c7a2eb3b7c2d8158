"""The conventions of screens, angles, orders and momenta, one named test each, and the symmetries that follow from them."""

from __future__ import annotations

import math

import numpy as np
import pytest

import raytrace as rt

RANDOM = np.random.default_rng(4)
ALPHA, BETA = RANDOM.uniform(-15.0, 15.0, (2, 200))
ROUNDING = 1e-9


def same(first, second):
    np.testing.assert_allclose(first, second, rtol=ROUNDING, atol=ROUNDING)


@pytest.mark.parametrize("inclination", [0.4, 1.2, 2.3])
def test_mirror_in_alpha_leaves_crossings_and_delays(inclination):
    there = rt.trace(ALPHA, BETA, inclination=inclination, orders=4)
    mirrored = rt.trace(-ALPHA, BETA, inclination=inclination, orders=4)
    same(there.radius, mirrored.radius)
    same(there.delay, mirrored.delay)
    same(np.cos(there.azimuth), np.cos(mirrored.azimuth))
    same(np.sin(there.azimuth), -np.sin(mirrored.azimuth))
    same(there.momentum[2], -mirrored.momentum[2])


@pytest.mark.parametrize("inclination", [0.0, 0.4, 1.2])
def test_seen_from_below_with_beta_reversed_is_the_same(inclination):
    above = rt.trace(ALPHA, BETA, inclination=inclination, orders=4)
    below = rt.trace(ALPHA, -BETA, inclination=math.pi - inclination, orders=4)
    same(above.radius, below.radius)
    same(above.delay, below.delay)
    same(above.momentum[1], -below.momentum[1])


def test_the_momentum_is_null_and_toward_the_observer():
    hole = rt.Schwarzschild()
    hit = rt.trace(ALPHA, BETA, inclination=0.8, orders=3)
    metric = hole.metric(hit.radius, 0.5 * math.pi)
    p_r, p_theta, p_phi = hit.momentum
    square = (
        1.0 / metric.tt + p_r**2 / metric.rr + p_theta**2 / metric.theta_theta + p_phi**2 / metric.phi_phi
    )
    crossed = hit.status == rt.RayStatus.CROSSED
    scale = (1.0 / np.abs(metric.tt))[crossed]
    assert np.max(np.abs(square[crossed]) / scale) < 1e-10
    same(p_phi[crossed], np.broadcast_to(-ALPHA * math.sin(0.8), p_phi.shape)[crossed])
    # The direct image of the near side of a disk seen from above leaves it upward: θ falls.
    assert np.all(p_theta[0][crossed[0]] < 0.0)
    assert np.all(p_theta[1][crossed[1]] > 0.0)


def test_light_on_the_way_in_runs_outward_to_the_observer_and_turns_after_closest_approach():
    hit = rt.trace(
        0.0, 8.0, inclination=1.3, orders=2
    )  # over the top: lands on the far side after passing the hole
    assert hit.momentum[0, 0] < 0.0
    hit = rt.trace(0.0, -8.0, inclination=1.3, orders=1)  # the near side of the disk
    assert hit.momentum[0, 0] > 0.0


def test_the_far_side_of_the_disk_is_up_from_above_and_down_from_below():
    for inclination, up in ((0.6, 1.0), (math.pi - 0.6, -1.0)):
        far = rt.trace(0.0, 9.0 * up, inclination=inclination, orders=1)
        near = rt.trace(0.0, -9.0 * up, inclination=inclination, orders=1)
        assert abs(far.azimuth[0]) == pytest.approx(math.pi)
        assert near.azimuth[0] == pytest.approx(0.0, abs=1e-12)


def test_azimuth_face_on_is_the_angle_on_the_screen():
    hit = rt.trace(ALPHA, BETA, inclination=0.0, orders=1)
    crossed = hit.status[0] == rt.RayStatus.CROSSED
    same(hit.azimuth[0][crossed], np.arctan2(ALPHA, -BETA)[crossed])


def test_azimuth_grows_with_the_rotation_and_stays_within_its_range():
    hit = rt.trace(ALPHA, BETA, inclination=0.9, orders=4)
    found = hit.azimuth[np.isfinite(hit.azimuth)]
    assert found.max() <= math.pi
    assert found.min() > -math.pi
    # α < 0 approaches: there gas at azimuth −90° moves toward the observer at azimuth 0, so azimuth grows.
    assert rt.trace(-10.0, 0.0, inclination=0.9, orders=1).azimuth[0] == pytest.approx(-math.pi / 2)


def test_orders_are_half_turns_apart():
    alpha, beta = 3.0, 4.25
    hit = rt.trace(alpha, beta, inclination=0.5, orders=4)
    for order in range(3):
        if hit.status[order + 1] == rt.RayStatus.CROSSED:
            turned = (hit.azimuth[order + 1] - hit.azimuth[order]) % (2.0 * math.pi)
            assert turned == pytest.approx(math.pi)


def test_labels_jump_across_edge_on_but_the_crossings_together_do_not():
    above = rt.trace(4.0, -3.3, inclination=math.pi / 2 - 1e-9, orders=3)
    below = rt.trace(4.0, -3.3, inclination=math.pi / 2 + 1e-9, orders=3)
    assert below.radius[0] == pytest.approx(above.radius[1], rel=1e-6)
    assert above.radius[0] > 1e8


def test_edge_on_the_first_crossing_is_a_half_turn_away_on_either_side():
    for beta in (6.0, -6.0):
        hit = rt.trace(4.0, beta, inclination=math.pi / 2, orders=1)
        assert abs(hit.azimuth[0]) == pytest.approx(math.pi)
    assert (
        rt.trace(2.0, 0.0, inclination=math.pi / 2, orders=2).status.tolist() == [rt.RayStatus.IN_PLANE] * 2
    )


def test_a_radial_ray_falls_in_without_a_crossing():
    hit = rt.trace(0.0, 0.0, inclination=0.4, orders=2)
    assert hit.status.tolist() == [rt.RayStatus.CAPTURED] * 2
    assert hit.fate == rt.RayStatus.CAPTURED


def test_a_delay_of_a_nearly_radial_ray_is_that_of_a_radial_one():
    hit = rt.trace(0.0, -1e-3, inclination=math.pi / 2 - 1e-4, orders=1)
    r = hit.radius[0]
    assert hit.delay[0] == pytest.approx(-r - 2.0 * math.log(r / 2.0 - 1.0), abs=1e-6)


def test_scalars_in_give_one_column_less():
    one = rt.trace(5.0, 2.0, inclination=0.3)
    many = rt.trace([5.0], [2.0], inclination=0.3)
    assert one.radius.shape == (3,)
    assert one.momentum.shape == (3, 3)
    assert many.radius.shape == (3, 1)
    same(one.radius, many.radius[:, 0])


def test_what_is_not_asked_for_is_none():
    hit = rt.trace(5.0, 2.0, inclination=0.3, azimuth=False, delay=False, momentum=False)
    assert (hit.azimuth, hit.delay, hit.momentum) == (None, None, None)


@pytest.mark.parametrize(
    ("given", "words"),
    [
        ({"alpha": [1.0, 2.0], "beta": [1.0]}, "one-dimensional arrays of one length"),
        ({"alpha": [[1.0]], "beta": [[1.0]]}, "one-dimensional arrays of one length"),
        ({"alpha": math.nan, "beta": 1.0}, "not finite"),
        ({"alpha": 1.0, "beta": 1.0, "orders": 0}, "count of crossings"),
        ({"alpha": 1.0, "beta": 1.0, "orders": True}, "count of crossings"),
        ({"alpha": 1.0, "beta": 1.0, "inclination": 4.0}, "outside 0 to π"),
    ],
)
def test_what_makes_no_sense_is_refused(given, words):
    with pytest.raises(ValueError, match=words):
        rt.trace(**{"inclination": 0.3, **given})


def test_circular_orbits_end_at_the_photon_orbit():
    orbit = rt.Schwarzschild().circular_orbit(6.0)
    assert float(orbit.energy) == pytest.approx(math.sqrt(8.0 / 9.0), rel=1e-15)
    assert float(orbit.angular_momentum) == pytest.approx(math.sqrt(12.0), rel=1e-15)
    with pytest.raises(ValueError, match="photon orbit at 3 M"):
        rt.Schwarzschild().circular_orbit([5.0, 3.0])


def test_many_threads_may_trace_at_once():
    from concurrent.futures import ThreadPoolExecutor

    expected = rt.trace(ALPHA, BETA, inclination=0.7).radius
    with ThreadPoolExecutor(4) as pool:
        for found in pool.map(lambda _: rt.trace(ALPHA, BETA, inclination=0.7).radius, range(16)):
            np.testing.assert_array_equal(found, expected)
