"""Radial profiles: values, edges, smoothness, tables read and refused."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.interpolate import PchipInterpolator

import emission as em

ROUNDING = 1e-13


def test_a_power_law_is_one_at_its_inner_edge_and_falls_with_its_slope():
    profile = em.PowerLaw(inner=2.6, outer=50.0, slope=3.7)
    assert profile.edges == (2.6, 50.0)
    assert profile.brightness(2.6) == 1.0
    np.testing.assert_allclose(profile.brightness([5.2, 26.0]), [2.0**-3.7, 10.0**-3.7], rtol=ROUNDING)
    np.testing.assert_array_equal(profile.brightness([2.5999, 50.001]), [0.0, 0.0])


def test_smoothed_edges_stay_within_the_support_and_leave_the_middle_alone():
    sharp = em.PowerLaw(inner=3.0, outer=13.0, slope=2.0)
    smooth = em.PowerLaw(inner=3.0, outer=13.0, slope=2.0, edge_width=1.5)
    assert smooth.edges == (3.0, 4.5, 11.5, 13.0)
    middle = np.linspace(4.5, 11.5, 50)
    np.testing.assert_array_equal(smooth.brightness(middle), sharp.brightness(middle))
    np.testing.assert_allclose(smooth.brightness(3.75) / sharp.brightness(3.75), 0.5, rtol=ROUNDING)
    np.testing.assert_array_equal(smooth.brightness([3.0, 13.0]), [0.0, 0.0])


@pytest.mark.parametrize("edge", [3.0, 4.5, 11.5, 13.0])
def test_smoothed_edges_have_two_continuous_derivatives(edge):
    # The third derivative of 6x⁵ − 15x⁴ + 10x³ jumps by 60/width³, so second differences across an edge
    # agree to O(h).
    profile, h = em.PowerLaw(inner=3.0, outer=13.0, slope=0.0, edge_width=1.5), 1e-4
    r = edge + h * np.array([-2.0, -1.0, 0.0, 1.0, 2.0])
    second = np.diff(profile.brightness(r), 2) / h**2
    assert np.ptp(second) <= 3.0 * h * 60.0 / 1.5**3


def test_touching_ramps_count_as_one_edge():
    assert em.PowerLaw(inner=3.0, outer=5.0, slope=0.0, edge_width=1.0).edges == (3.0, 4.0, 5.0)


def test_a_gaussian_ring_has_its_fwhm():
    ring = em.GaussianRing(radius=6.0, width=2.0)
    np.testing.assert_allclose(ring.brightness([5.0, 6.0, 7.0]), [0.5, 1.0, 0.5], rtol=ROUNDING)
    np.testing.assert_allclose(
        em.GaussianRing(radius=20.0, width=2.0).edges, 20.0 + 6.3145 * np.array([-1, 1]), atol=1e-3
    )


def test_a_gaussian_ring_ends_where_nothing_is_left_or_at_the_horizon():
    far, near = em.GaussianRing(radius=20.0, width=2.0), em.GaussianRing(radius=4.0, width=2.0)
    np.testing.assert_allclose(far.brightness(far.edges[1] * (1.0 - 1e-15)), 1e-12, rtol=1e-9)
    assert far.brightness(far.edges[1] * (1.0 + 1e-12)) == 0.0
    assert near.edges[0] == 2.0


@pytest.mark.parametrize(
    ("make", "words"),
    [
        (
            lambda: em.PowerLaw(inner=1.9, outer=9.0, slope=1.0),
            "an inner edge at 1.9 M lies inside the horizon",
        ),
        (lambda: em.PowerLaw(inner=9.0, outer=9.0, slope=1.0), "does not lie outside the inner one"),
        (lambda: em.PowerLaw(inner=3.0, outer=float("inf"), slope=1.0), "an outer edge at inf M"),
        (lambda: em.PowerLaw(inner=float("nan"), outer=9.0, slope=1.0), "an inner edge at nan M"),
        (lambda: em.PowerLaw(inner=3.0, outer=5.0, slope=1.0, edge_width=1.1), "does not fit twice"),
        (lambda: em.PowerLaw(inner=3.0, outer=5.0, slope=1.0, edge_width=-0.1), "does not fit twice"),
        (lambda: em.PowerLaw(inner=2.0, outer=1e9, slope=-9.0), "a positive slope falls outward"),
        (lambda: em.PowerLaw(inner=2.0, outer=9.0, slope=float("nan")), "a positive slope falls outward"),
        (lambda: em.GaussianRing(radius=1.0, width=1.0), "a ring of radius 1 M lies inside the horizon"),
        (lambda: em.GaussianRing(radius=5.0, width=0.0), "must be positive and finite"),
        (lambda: em.PageThorne(outer=6.0), "its outer edge must lie outside 6 M"),
        (lambda: em.Table(radii=(3.0,), values=(1.0,)), "at least two radii"),
        (lambda: em.Table(radii=(3.0, 4.0), values=(1.0,)), "given are 2 and 1"),
        (lambda: em.Table(radii=(3.0, 3.0), values=(1.0, 1.0)), "ascend from row to row"),
        (lambda: em.Table(radii=(1.5, 3.0), values=(1.0, 1.0)), "the first radius of the table, 1.5 M"),
        (lambda: em.Table(radii=(2.0, 3.0), values=(1.0, -1.0)), "nowhere negative"),
        (lambda: em.Table(radii=(2.0, 3.0), values=(0.0, 0.0)), "somewhere positive"),
    ],
)
def test_what_cannot_be_is_refused_in_words(make, words):
    with pytest.raises(ValueError, match=words):
        make()


def test_page_thorne_refuses_a_hole_it_does_not_hold_for(charged, schwarzschild):
    profile = em.PageThorne(outer=30.0)
    assert profile.brightness(9.0, spacetime=schwarzschild) > 0.0
    with pytest.raises(ValueError, match="innermost stable orbit is at 6 M"):
        profile.brightness(9.0, spacetime=charged)


knots = st.lists(st.tuples(st.floats(0.01, 5.0), st.floats(0.0, 1e3)), min_size=3, max_size=20).filter(
    lambda rows: any(value > 1e-3 for _, value in rows)
)


@given(rows=knots)
@settings(deadline=None, derandomize=True, max_examples=150)
def test_a_table_never_overshoots_its_rows(rows):
    radii = 2.0 + np.cumsum([step for step, _ in rows])
    values = np.array([value for _, value in rows])
    table = em.Table(radii=radii, values=values)
    np.testing.assert_allclose(table.brightness(radii), values, rtol=ROUNDING, atol=1e-12)
    for i in range(len(rows) - 1):
        between = table.brightness(np.linspace(radii[i], radii[i + 1], 40))
        slack = 1e-12 * values.max()
        assert between.min() >= min(values[i : i + 2]) - slack
        assert between.max() <= max(values[i : i + 2]) + slack


def test_a_table_agrees_with_the_library_away_from_its_ends():
    # scipy.interpolate.PchipInterpolator has the same interior slopes; its three-point end slopes differ
    # from ours.
    radii = np.geomspace(2.0, 40.0, 15)
    values = np.sin(radii) ** 2 / radii
    table = em.Table(radii=radii, values=values)
    r = np.linspace(radii[1], radii[-2], 500)
    np.testing.assert_allclose(
        table.brightness(r), PchipInterpolator(radii, values)(r), rtol=1e-11, atol=1e-14
    )


def test_a_long_table_offers_only_its_ends_as_edges():
    radii = np.linspace(2.0, 40.0, 300)
    assert em.Table(radii=radii, values=1.0 / radii).edges == (2.0, 40.0)
    assert em.Table(radii=radii[:5], values=1.0 / radii[:5]).edges == tuple(radii[:5])


ECSV = """# %ECSV 1.0
# ---
# datatype:
# - {{name: radius, unit: {unit}, datatype: float64}}
# - {{name: brightness, unit: Jy, datatype: float64}}
radius brightness
2.5 1.0
4.0 0.25
"""


@pytest.mark.parametrize(
    "text",
    [
        "2.5 1.0\n4.0 0.25\n",
        "radius,brightness\n2.5,1.0\n4.0,0.25\n",
        "# made up\n\n2.5\t1.0\n4.0\t0.25",
        ECSV.format(unit="'1'"),
    ],
    ids=["plain", "csv", "tabs", "ecsv"],
)
def test_tables_are_read_from_common_text(text, tmp_path):
    path = tmp_path / "profile.txt"
    path.write_text(text, encoding="utf-8")
    assert em.Table.read(path) == em.Table(radii=(2.5, 4.0), values=(1.0, 0.25))


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ("2.5 1.0\n4.0 zero\n", r"profile.txt, line 2: '4.0 zero' is not two numbers"),
        ("r I\nmore words\n", r"profile.txt, line 2"),
        ("2.5 1.0 7\n", r"profile.txt, line 1: 3 columns where two are due"),
        ("# nothing\n", r"profile.txt has no rows"),
        ("5 1\n4 1\n", r"profile.txt: the radii of a table of brightness must be finite and ascend"),
        ("5 1\n6 nan\n", r"profile.txt: the brightness in a table must be finite"),
        (ECSV.format(unit="uas"), r"profile.txt gives the radius in uas"),
    ],
)
def test_a_bad_table_names_file_and_line(text, words, tmp_path):
    path = tmp_path / "profile.txt"
    path.write_text(text, encoding="utf-8")
    with pytest.raises(ValueError, match=words):
        em.Table.read(path)
