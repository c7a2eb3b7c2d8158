"""The bracketing root finder of isoradials: exact roots, jumps, and brackets without a root."""

from __future__ import annotations

import numpy as np
from scipy.optimize import brentq

from raytrace.roots import bracketed_roots


def test_roots_agree_with_the_reference_library():
    powers = np.array([1.0, 2.0, 3.0, 7.0])
    found = bracketed_roots(lambda x, i: x ** powers[i] - 0.3, np.zeros(4), np.full(4, 2.0))
    expected = [brentq(lambda x, p=p: x**p - 0.3, 0.0, 2.0, xtol=1e-15) for p in powers]
    np.testing.assert_allclose(found, expected, rtol=1e-14)


def test_a_jump_is_found_to_the_last_place():
    found = bracketed_roots(lambda x, _: np.where(x < 0.7, -1.0, 1.0), np.zeros(1), np.ones(1))
    np.testing.assert_allclose(found, 0.7, rtol=1e-15)


def test_a_bracket_without_a_change_of_sign_has_no_root():
    found = bracketed_roots(lambda x, i: x + np.array([1.0, -0.5])[i], np.zeros(2), np.ones(2))
    assert np.isnan(found[0])
    assert found[1] == 0.5


def test_values_that_are_not_numbers_give_no_root():
    assert np.isnan(bracketed_roots(lambda x, _: np.full_like(x, np.nan), np.zeros(1), np.ones(1))).all()
