"""Envelopes, nulls, carriers and diameters by fringe spacing, on signals whose answers are known.

Bessel functions and Fourier facts from any table; thin-ring visibilities as used by Johnson et al. 2020, Sci. Adv. 6, eaaz1310.
"""

from __future__ import annotations

import math

import numpy as np
import pytest
from scipy.special import j0

import raytrace as rt
import ringwright as rw
from ringwright.profiling.fringes import (
    Fringes,
    View,
    first_carried,
    fringes,
    minima,
    nulls,
    trusted_baseline,
)
from ringwright.profiling.sight import EARTH_DIAMETER, first_sight
from ringwright.profiling.spacing import _spacing, ring_diameters
from ringwright.sampling import sample_light

THETA_G = 3.8e-6 / 206264.80624709636  # rad
VIEW = View(THETA_G, 0.0, 1.0, 1.0 / (2.0 * math.sqrt(27.0) * THETA_G))
RING = """
[[emitter]]
kind = "thin-disk"
profile = {{ kind = "gaussian-ring", radius = "{radius} M", width = "{width} M" }}
flow = {{ kind = "static" }}
"""


def ring_light(write_scene, radius=6.0, width=0.05, inclination="0 deg", orders=3):
    scene = rw.load_scene(
        write_scene(inclination=inclination, orders=orders, emitters=RING.format(radius=radius, width=width))
    )
    return sample_light(scene, accuracy=1e-6)


def made_up(*envelopes, error=0.0):
    """Fringes of given envelopes per order along one direction."""
    envelope = np.array(envelopes)[:, None, :]
    count = envelope.shape[2]
    return Fringes(
        np.linspace(0.0, 1e12, count),
        np.array([0.3]),
        envelope.astype(complex),
        envelope,
        envelope.sum(axis=0),
        np.full((1, count), error),
    )


def test_minima_of_a_cosine_are_found_to_a_thousandth_of_a_step():
    place = np.linspace(0.0, 10.0, 401)
    found, least = minima(place, np.abs(np.cos(2.0 * place)))
    expected = (np.arange(6) + 0.5) * (math.pi / 2.0)
    assert found == pytest.approx(expected, abs=2e-5)
    assert np.all(least < 2e-3)


def test_nulls_of_a_thin_ring_are_those_of_j0(write_scene):
    # 0.765480, 1.757095, 2.754567 over the diameter: any table of Bessel functions (CHK).
    light = [part for part in ring_light(write_scene, width=0.005) if part.order == 1]
    found = fringes(light, VIEW, orders=2, longest=30e9, position_angle=np.array([0.3]))
    diameter = 2.0 * float(rt.isoradial(6.0, order=1, angle=0.1, inclination=0.0)) * THETA_G
    place, depth = nulls(light, VIEW, found, 0)
    assert place[:3] * diameter == pytest.approx([0.765480, 1.757095, 2.754567], rel=1e-5)
    assert np.all(depth < 5e-3)


def test_the_envelope_is_the_largest_amplitude_within_a_fringe(write_scene):
    light = ring_light(write_scene)
    found = fringes(light, VIEW, orders=3, longest=60e9, position_angle=np.array([0.0]))
    for column in (0, 40, 100):
        near = np.abs(found.baseline - found.baseline[column]) <= VIEW.fringe * 1.001
        expected = np.abs(found.visibility[1, 0, near]).max()
        assert found.envelope[1, 0, column] == pytest.approx(expected, rel=1e-12)
    assert found.total == pytest.approx(found.visibility.sum(axis=0))
    assert found.total[0, 0].real == pytest.approx(sum(part.series.flux() for part in light), rel=1e-9)


def test_fringes_turn_with_the_scene(write_scene):
    light = ring_light(write_scene, inclination="50 deg")
    angles = np.array([0.2, 1.1])
    plain = fringes(light, VIEW, orders=3, longest=60e9, position_angle=angles)
    turned = fringes(
        light, View(THETA_G, 0.4, 1.0, VIEW.fringe), orders=3, longest=60e9, position_angle=angles + 0.4
    )
    assert turned.visibility == pytest.approx(plain.visibility, abs=1e-10)


@pytest.mark.parametrize("order", [1, 2])
def test_spacing_gives_the_diameter_of_a_thin_ring_within_its_error(write_scene, order):
    light = ring_light(write_scene, width=0.05)
    expected = 2.0 * float(rt.isoradial(6.0, order=order, angle=0.1, inclination=0.0))
    angles = np.arange(8) * (math.tau / 8)
    found = ring_diameters(light, VIEW, order=order, width=0.002, longest=400e9, position_angle=angles)
    assert found.note == ""
    assert np.all(np.abs(found.diameter - expected) <= found.error)
    assert np.all(found.error < 0.01)


def test_spacing_gives_the_width_of_an_inclined_ring_between_tangents(write_scene):
    light = ring_light(write_scene, radius=8.0, width=0.05, inclination="60 deg")
    angles = np.arange(16) * (math.tau / 16)
    found = ring_diameters(light, VIEW, order=1, width=0.004, longest=300e9, position_angle=angles)
    screen = np.linspace(0.0, math.tau, 4001)
    b = rt.isoradial(8.0, order=1, angle=screen, inclination=math.radians(60.0))
    for angle, diameter, error in zip(angles, found.diameter, found.error, strict=True):
        # At position angle 0 the baseline runs along +β, screen angle 90°; at 90° along −α.
        along = b * np.cos(screen - (angle + 0.5 * math.pi))
        assert abs(diameter - float(along.max() - along.min())) <= max(2.0 * error, 0.01)


def test_the_error_of_a_spacing_covers_a_drift_of_the_spacing():
    number = np.arange(20.0)
    slope, error = _spacing(5.0 * number + 0.02 * number**2)
    assert abs(slope - 5.0) <= 4.0 * error
    assert error > 0.1
    even, none = _spacing(5.0 * number + 1.0)
    assert (even, none) == pytest.approx((5.0, 0.0), abs=1e-9)
    assert math.isnan(_spacing(np.array([1.0, 2.0]))[0])


def test_j0_itself_gives_its_diameter():
    baseline = np.linspace(1.2, 60.0, 4000)
    slope, error = _spacing(minima(baseline, np.abs(j0(math.pi * baseline)))[0])
    assert abs(slope - 1.0) <= error < 2e-3


def test_a_ring_with_too_few_fringes_says_so(write_scene):
    light = ring_light(write_scene)
    found = ring_diameters(light, VIEW, order=1, width=2.0, longest=400e9, position_angle=np.zeros(1))
    assert np.isnan(found.diameter).all()
    assert "fewer than 4 fringes" in found.note
    assert "resolved across its width" in found.note
    short = ring_diameters(light, VIEW, order=1, width=0.01, longest=20e9, position_angle=np.zeros(1))
    assert "before the baselines end" in short.note


def test_who_carries_the_envelope():
    length = np.linspace(0.0, 1e12, 4001)
    falling, rising = np.exp(-length / 5e10), np.full_like(length, 1e-3)
    found = made_up(falling, rising)
    first = first_carried(found, 1, VIEW)[0]
    assert first == pytest.approx(5e10 * math.log(1e3), rel=2e-3)
    assert first_carried(found, 0, VIEW)[0] == 0.0
    assert math.isnan(first_carried(found, 1, VIEW, above=2e-3)[0])


def test_a_moment_ahead_is_not_carrying():
    length = np.linspace(0.0, 1e12, 4001)
    blip = np.where(np.abs(length - 3e11) < 0.4 * VIEW.fringe, 10.0, 1e-6)
    assert math.isnan(first_carried(made_up(np.ones_like(length), blip), 1, VIEW)[0])


def test_an_order_that_falls_behind_again_carries_only_from_then_on():
    length = np.linspace(0.0, 1e12, 4001)
    zero = np.where((length > 2e11) & (length < 3e11), 1e-3, np.where(length < 5e11, 1.0, 1e-4))
    one, two = np.full_like(length, 0.1), np.where(length > 8e11, 1.0, 1e-5)
    found = made_up(zero, one, two)
    assert first_carried(found, 1, VIEW)[0] == pytest.approx(5e11, abs=1e9)
    # What a higher order takes over afterwards does not count against it.
    assert first_carried(found, 2, VIEW)[0] == pytest.approx(8e11, abs=1e9)


def test_baselines_beyond_the_accuracy_are_known():
    length = np.linspace(0.0, 1e12, 4001)
    found = made_up(np.exp(-length / 1e11), error=1e-4)
    assert trusted_baseline(found, 0.01) == pytest.approx(1e11 * math.log(100.0), rel=1e-2)
    assert trusted_baseline(made_up(np.ones(50)), 0.01) == 1e12


def test_the_first_sight_of_order_1_is_set_beside_the_earth():
    length = np.linspace(0.0, 1e12, 20001)
    found = made_up(np.exp(-length / 1.5e9), np.full_like(length, 5e-3))
    for frequency, where in ((230e9, "Earth diameters, on the ground"), (43e9, "beyond the ground")):
        sight = first_sight(found, VIEW, sensitivity=1e-3, frequency=frequency, unit="Jy")
        assert where in sight.sentence
        # Length = baseline in wavelengths × c/ν; the Earth's diameter is twice 6378.1 km (IAU 2015 B3).
        assert sight.length == pytest.approx(sight.baseline * 299_792_458.0 / frequency)
        assert sight.earth_diameters == pytest.approx(sight.length / 12_756_200.0)
        assert sight.ground_frequency == pytest.approx(sight.baseline * 299_792_458.0 / EARTH_DIAMETER)
    faint = first_sight(found, VIEW, sensitivity=1e-2, frequency=230e9, unit="Jy")
    assert math.isnan(faint.baseline)
    assert "below the sensitivity of 10 mJy" in faint.sentence
    never = first_sight(
        made_up(np.ones(4001), np.full(4001, 0.1)), VIEW, sensitivity=0.0, frequency=None, unit="Jy"
    )
    assert "no baseline below 1000 Gλ" in never.sentence
