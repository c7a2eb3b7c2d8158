"""The table of readings against resolution: right at nodes, straight between, cut where outcomes change."""

from __future__ import annotations

import numpy as np
import pytest
from thin_ring import averaged_ring, exact_readings

from ringwright.errors import InputError
from ringwright.ring import RingOutcome
from ringwright.ring.estimator import read_ring
from ringwright.ring.readings import HALFWAY_TOLERANCE, LEAST_STEP, lost, readings

FIELD, PIXELS = 56.0, 256
PIXEL = FIELD / PIXELS
INNATE = 1.2  # [M] width that the ring of these tests has before any blur


@pytest.fixture(scope="module")
def image():
    return averaged_ring(PIXELS, PIXEL, 10.4, INNATE, 0.3, -0.2, parts=3)


@pytest.fixture(scope="module")
def table(image):
    return readings(image, PIXEL)


def test_nodes_hold_the_exact_diameter_of_the_blurred_ring(table):
    for x, diameter in zip(table.nodes, table.diameter, strict=True):
        total = np.hypot(max(x, table.finest), INNATE) / 10.4
        if total < 0.75:
            assert diameter / 10.4 == pytest.approx(exact_readings(total)[0], abs=0.001)


def test_nodes_stand_where_the_design_puts_them(table):
    regular = [0.0, *np.arange(1.0, 8.6, 0.75)]
    assert set(regular) - set(table.nodes) == {x for x in regular if x > table.nodes[-1]}
    assert np.all(np.diff(table.nodes) > 0.0)


def test_a_straight_line_between_nodes_misses_by_no_more_than_it_says(image, table):
    """Honesty of the stored error: at random places it is exceeded by no more than a quarter."""
    held = table.outcome == RingOutcome.RING
    x = np.random.default_rng(5).uniform(1.0, table.nodes[held][-1], 12)
    line = np.interp(x, table.nodes[held], table.diameter[held])
    read = [read_ring(image, PIXEL, at).diameter for at in x]
    assert table.halfway_error <= HALFWAY_TOLERANCE
    assert line == pytest.approx(read, rel=1.25 * table.halfway_error)


def test_a_change_of_outcome_is_placed_closely(table):
    change = np.flatnonzero(np.diff(table.outcome))
    assert change.size > 0
    assert np.all(np.diff(table.nodes)[change] <= LEAST_STEP)


def test_the_ring_is_lost_where_its_total_width_fills_it(image):
    """The central minimum of a blurred thin ring vanishes at 0.83255 of its diameter (CHK), here of a smaller ring."""
    small = readings(averaged_ring(128, 0.2, 6.0, INNATE, parts=3), 0.2)
    assert np.hypot(lost(small), INNATE) / 6.0 == pytest.approx(0.83255, abs=0.02)


def test_a_blob_has_no_reading_anywhere():
    axis = np.arange(64) - 31.5
    blob = np.exp(-(axis[:, None] ** 2 + axis**2) / 50.0)
    table = readings(blob, 0.5)
    assert np.all(table.outcome == RingOutcome.NO_RING)
    assert np.isnan(table.diameter).all()
    assert lost(table) == 0.0


def test_readings_refuse_what_is_no_image():
    with pytest.raises(InputError, match="finite image with two axes"):
        readings(np.full((8, 8), np.inf), 1.0)
    with pytest.raises(InputError, match="size of a pixel must be a positive"):
        readings(np.ones((8, 8)), -1.0)
