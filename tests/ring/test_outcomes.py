"""Every outcome of the ring estimator is reached, and none of them hangs on rounding (docs/measuring.md)."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from thin_ring import blurred_ring

from ringwright.errors import InputError
from ringwright.ring import RingOutcome
from ringwright.ring.estimator import read_ring

PIXEL = 0.02


def grid(n=200):
    axis = (np.arange(n) - 0.5 * (n - 1)) * PIXEL
    return -axis[None, :], axis[:, None]  # east, north


def blob(east, north, size):
    e, v = grid()
    return np.exp(-((e - east) ** 2 + (v - north) ** 2) / (2.0 * size**2))


def edge_on_disk():
    """Two arcs, as a disk seen from its side shows: light left and right, dark above and below."""
    e, v = grid()
    r, angle = np.hypot(e, v), np.arctan2(e, v)
    ridge = np.exp(-((r - 0.5) ** 2) / (2.0 * 0.03**2))
    return ridge * np.exp(-(np.cos(angle) ** 2) / (2.0 * 0.25**2)) * (1.0 + 0.4 * np.sin(angle))


def test_a_closed_ring_is_a_ring():
    assert read_ring(blurred_ring(200, PIXEL, 1.0, 0.1), PIXEL, 0.2).outcome is RingOutcome.RING


def test_a_ring_whose_middle_is_filled_has_no_width():
    reading = read_ring(blurred_ring(200, PIXEL, 1.0, 0.1), PIXEL, 0.62)
    assert reading.outcome is RingOutcome.WIDTH_LIMIT
    assert np.isfinite(reading.diameter)
    assert reading.unresolved == 1.0
    assert np.isnan(reading.width)


def test_a_crescent_fainter_than_the_dynamic_range_is_open():
    image = blurred_ring(200, PIXEL, 1.0, 0.1, asymmetry=0.95, orientation=1.0)
    assert read_ring(image, PIXEL, 0.12).outcome is RingOutcome.OPEN
    assert read_ring(image, PIXEL, 0.12, dynamic_range=1e4).outcome is RingOutcome.RING


def test_the_arcs_of_an_edge_on_disk_are_not_a_ring():
    """Resolved they are two arcs, which do not close; blurred they are a bar without a dark middle."""
    fine = read_ring(edge_on_disk(), PIXEL, 0.1)
    assert fine.outcome in (RingOutcome.OPEN, RingOutcome.NO_RING)
    assert read_ring(edge_on_disk(), PIXEL, 0.6).outcome is RingOutcome.NO_RING


@pytest.mark.parametrize("place", [(0.0, 0.0), (0.31, -0.17), (1e-9, 0.0)])
def test_a_blob_is_not_a_ring_wherever_it_lies(place):
    assert read_ring(blob(*place, 0.2), PIXEL, 0.2).outcome is RingOutcome.NO_RING


def test_two_blobs_are_not_a_ring():
    image = blob(0.5, 0.0, 0.1) + 0.6 * blob(-0.5, 0.1, 0.1)
    assert read_ring(image, PIXEL, 0.2).outcome in (RingOutcome.NO_RING, RingOutcome.OPEN)


def test_a_bright_middle_inside_a_ring_is_not_a_dark_middle():
    image = blurred_ring(200, PIXEL, 1.0, 0.1) + 3.0 * blob(0.0, 0.0, 0.05)
    assert read_ring(image, PIXEL, 0.2).outcome is RingOutcome.NO_RING


def test_a_ring_at_the_edge_of_the_image_is_off_the_field():
    image = blurred_ring(66, PIXEL, 1.0, 0.1)  # 0.66 to the edge
    assert read_ring(image, PIXEL, 0.15).outcome is RingOutcome.RING
    assert read_ring(image, PIXEL, 0.2).outcome is RingOutcome.OFF_FIELD


def test_pixels_of_more_than_a_third_of_the_resolution_are_too_coarse():
    image = blurred_ring(200, PIXEL, 1.0, 0.1)
    assert read_ring(image, PIXEL, 3.0 * PIXEL).outcome is not RingOutcome.TOO_COARSE
    assert read_ring(image, PIXEL, 2.99 * PIXEL).outcome is RingOutcome.TOO_COARSE


def test_an_image_without_light_is_empty():
    assert read_ring(np.zeros((50, 50)), PIXEL, 0.2).outcome is RingOutcome.EMPTY


def test_every_outcome_has_a_sentence_and_only_the_mild_ones_a_diameter():
    assert all(outcome.sentence.endswith(".") for outcome in RingOutcome)
    mild = [RingOutcome.RING, RingOutcome.WIDTH_LIMIT, RingOutcome.OPEN]
    assert [outcome for outcome in RingOutcome if outcome.has_diameter] == mild


@settings(deadline=None, derandomize=True, max_examples=25)
@given(st.floats(-0.25, 0.25), st.floats(-0.25, 0.25), st.floats(0.15, 0.55), st.floats(0.0, 1.0))
def test_rounding_does_not_change_an_outcome(east, north, resolution, seed):
    """The last digits of a noise-free ring, altered, alter neither its outcome nor a shown digit."""
    image = blurred_ring(200, PIXEL, 1.0, 0.1, east, north)
    noise = np.random.default_rng(int(seed * 1e6)).standard_normal(image.shape)
    one, other = (read_ring(data, PIXEL, resolution) for data in (image, image * (1.0 + 1e-15 * noise)))
    assert one.outcome is other.outcome
    assert other.diameter == pytest.approx(one.diameter, rel=1e-9)


@pytest.mark.parametrize(
    ("change", "sentence"),
    [
        ({"resolution": -1.0}, "resolution must be a positive length"),
        ({"pixel": 0.0}, "size of a pixel must be positive"),
        ({"beam": 0.3}, "coarser than the resolution"),
        ({"image": np.full((50, 50), np.nan)}, "not finite"),
        ({"image": np.zeros(5)}, "two axes"),
    ],
)
def test_what_cannot_be_read_is_refused_with_a_sentence(change, sentence):
    given_ = {"image": np.ones((50, 50)), "pixel": PIXEL, "resolution": 0.2, **change}
    with pytest.raises(InputError, match=sentence):
        read_ring(given_.pop("image"), given_.pop("pixel"), given_.pop("resolution"), **given_)


@pytest.mark.parametrize("seed", range(6))
def test_a_knotted_lopsided_ring_is_found_though_its_light_sits_in_one_place(seed):
    """The flux centroid lies on a knot then, from which no ring is seen; the diameter still is the ring's to 12 %."""
    random = np.random.default_rng(seed)
    turn = random.uniform(0, 6)
    image = blurred_ring(200, PIXEL, 1.0, 0.12, asymmetry=0.5, orientation=turn)
    image = image / image.max()
    angle = random.uniform(0, 2 * np.pi)
    image += blob(0.5 * np.sin(angle), 0.5 * np.cos(angle), 0.07)
    reading = read_ring(image, PIXEL, 0.25)
    assert reading.outcome.has_diameter
    assert reading.diameter == pytest.approx(1.0, abs=0.12)
