"""First calibration: truths drawn from the stated prior, observed with noise, fall inside the 68 % interval
68 % of the time.

Required: 300 truths, 68 ± 6 % inside (one binomial standard deviation is 2.7 %). A control with halved
intervals must fail the same check.
"""

import math

import numpy as np
import pytest
from synthetic_scans import INNER, LOST, SLOPE, factor, family_table, unsmoothed_factor

from ringwright.comparing.answering import compare_numbers
from ringwright.comparing.distributions import TwoPiece
from ringwright.comparing.inputs import Observed

TRUTHS = 300
EXPECTED, ALLOWED = 0.68, 0.06
SIGMA, RESOLUTION = 2.5, 20.0  # [µas]
PRIOR = TwoPiece(4.3, 0.5, 0.5)  # on θ_g [µas]
WIDE = (1.5, 9.0)  # θ_g [µas] of truths for ring_only, flat in the logarithm


def truths(rng, draw_theta):
    """θ_g, inner edge and slope of scenes with a ring, from the prior: continuous, so none of them is in
    the scan.
    """
    while True:
        theta = draw_theta(rng)
        inner, slope = rng.uniform(*INNER), rng.uniform(*SLOPE)
        if RESOLUTION / theta < LOST * unsmoothed_factor(inner, slope):
            yield theta, inner, slope


def outcomes(draw_theta, pick, **prior):
    """Interval (low, median, high) and truth for every drawn observation."""
    rng = np.random.default_rng(2024)
    table = family_table(scenes=128, nodes=40)
    rows = []
    for theta, inner, slope in truths(rng, draw_theta):
        reads = theta * factor(inner, slope, RESOLUTION / theta)
        seen = reads + SIGMA * rng.standard_normal()
        answer = compare_numbers(
            Observed("drawn", TwoPiece(seen, SIGMA, SIGMA), (RESOLUTION,), **prior), (table,)
        )
        estimate = pick(answer)
        rows.append(
            (estimate.number - estimate.minus, estimate.number, estimate.number + estimate.plus, theta)
        )
        if len(rows) == TRUTHS:
            return np.array(rows)
    raise AssertionError("no truths were drawn")


def inside(rows, shrink=1.0):
    low, middle, high, truth = rows.T
    return np.mean((truth > middle - shrink * (middle - low)) & (truth < middle + shrink * (high - middle)))


@pytest.fixture(scope="module")
def combined():
    return outcomes(
        lambda rng: PRIOR.mode + PRIOR.plus * rng.standard_normal(),
        lambda c: c.combined.theta_g,
        theta_g=PRIOR,
    )


@pytest.fixture(scope="module")
def ring_only():
    return outcomes(lambda rng: math.exp(rng.uniform(*np.log(WIDE))), lambda c: c.ring_only.theta_g)


def test_combined_intervals_hold_the_truth_as_often_as_they_say(combined):
    assert inside(combined) == pytest.approx(EXPECTED, abs=ALLOWED)


def test_ring_only_intervals_hold_the_truth_as_often_as_they_say(ring_only):
    assert inside(ring_only) == pytest.approx(EXPECTED, abs=ALLOWED)


def test_control_halved_intervals_are_caught(combined, ring_only):
    for rows in (combined, ring_only):
        assert abs(inside(rows, shrink=0.5) - EXPECTED) > ALLOWED
