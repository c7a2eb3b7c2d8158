"""Questions about light that have no answer are refused with a sentence; those that have one answer in the shape of the question."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
import pytest

import raytrace as rt


@dataclass(frozen=True)
class Other:
    """A spacetime about which nothing is known in closed form."""

    name = "other"
    horizon = 2.0


@pytest.mark.parametrize(
    ("path", "words"),
    [
        ((2.0, 9.0, 1.0), "outside the horizon at 2 M"),
        ((9.0, math.inf, 1.0), "must be finite"),
        ((9.0, 20.0, math.nan), "must be finite"),
        ((9.0, 20.0, 6.0, 2), "0 times or once"),
        ((6.0, 20.0, 9.0), "no ray of b = 9 M connects 6 M and 20 M"),  # 6 M lies inside its closest approach
        ((2.5, 20.0, 9.0), "no ray of b = 9 M connects"),  # the barrier stands between
        ((9.0, 20.0, 5.0, 1), "passing its closest approach between them"),  # captured: it has none
        ((9.0, 20.0, 0.0, 1), "passing its closest approach between them"),
        ((2.2, 2.4, 9.0, 1), "passing its closest approach between them"),
    ],
)
def test_light_that_no_ray_carries_has_no_time(path, words):
    with pytest.raises(ValueError, match=words):
        rt.light_time(*path)


@pytest.mark.parametrize(
    ("given", "words"),
    [
        ({"r": 2.0}, "no static observer at 2 M"),
        ({"r": [5.0, math.nan]}, "no static observer"),
        ({"r": 5.0, "direction": "sideways"}, "directions are radial and tangential"),
        ({"r": 5.0, "measured": "proper"}, "measures coordinate and local"),
    ],
)
def test_a_speed_of_light_needs_a_place_and_a_direction(given, words):
    with pytest.raises(ValueError, match=words):
        rt.light_speed(**given)


def test_a_shadow_needs_an_observer_who_can_stand_still():
    with pytest.raises(ValueError, match=r"no static observer at 1\.9 M"):
        rt.shadow_angle([3.0, 1.9])


def test_a_deflection_needs_a_finite_impact_parameter():
    with pytest.raises(ValueError, match="not finite"):
        rt.deflection([6.0, math.nan])
    with pytest.raises(ValueError, match=r"beyond 1e\+150 M"):
        rt.deflection(1e200)


@pytest.mark.parametrize("position", [(1e200, 0.0), (0.0, -1e160), (math.inf, 0.0)])
def test_a_ray_too_far_out_to_square_its_distance_is_refused_instead_of_called_escaped(position):
    with pytest.raises(ValueError, match=r"not finite or lies beyond 1e\+150 M"):
        rt.trace(*position, inclination=0.5)


@pytest.mark.parametrize("orders", ["three", math.nan, math.inf, None])
def test_a_count_of_orders_is_a_number(orders):
    with pytest.raises(ValueError, match="is a count of crossings and must be a whole number"):
        rt.trace(3.0, 4.0, inclination=0.5, orders=orders)


def test_a_ray_far_out_is_straight_and_deflected_by_four_over_b():
    hit = rt.trace(1e100, 0.0, inclination=0.5, orders=2)
    assert hit.radius[0] == pytest.approx(1e100, rel=1e-12)
    assert hit.status.tolist() == [rt.RayStatus.CROSSED, rt.RayStatus.ESCAPED]
    assert rt.deflection(1e100) * 1e100 == pytest.approx(4.0, rel=1e-12)


@pytest.mark.parametrize(
    "ask",
    [
        lambda hole: rt.deflection(6.0, spacetime=hole),
        lambda hole: rt.light_time(9.0, 20.0, 1.0, spacetime=hole),
        lambda hole: rt.shadow_angle(9.0, spacetime=hole),
    ],
    ids=["deflection", "light_time", "shadow_angle"],
)
def test_what_is_known_for_schwarzschild_only_says_so(ask):
    with pytest.raises(ValueError, match="Schwarzschild only, not for 'other'"):
        ask(Other())


@pytest.mark.parametrize("ask", [rt.deflection, rt.light_speed, rt.shadow_angle])
def test_scalars_in_give_scalars_out_and_arrays_keep_their_shape(ask):
    one = ask(7.0)
    many = ask([[7.0, 8.0, 9.0]])
    assert np.ndim(one) == 0
    assert many.shape == (1, 3)
    assert many[0, 0] == one


def test_captured_light_is_deflected_without_end():
    assert rt.deflection([0.0, 5.19, -5.19]).tolist() == [math.inf] * 3
    assert rt.deflection(-6.0) == rt.deflection(6.0)


def test_light_takes_as_long_back_as_forth():
    assert rt.light_time(7.0, 90.0, 6.0, 1) == rt.light_time(90.0, 7.0, -6.0, 1)
