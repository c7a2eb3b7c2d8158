"""The pictures of a comparison are written as PNGs, and not at all when there is nothing to draw."""

import numpy as np
import pytest
from synthetic_scans import family_table, parameter, table_of

from ringwright.comparing.answering import compare_numbers
from ringwright.comparing.distributions import TwoPiece
from ringwright.comparing.inputs import Observed
from ringwright.figures.comparison import draw_comparison
from ringwright.figures.diameters import predicted
from ringwright.figures.factors import factors
from ringwright.figures.posteriors import posteriors

DISTANCE = TwoPiece(16.8, 0.8, 0.7)


def observed(**more):
    return Observed("made up", TwoPiece(42.0, 3.0, 3.0), (20.0,), **more)


@pytest.mark.parametrize("prior", [{}, {"distance": DISTANCE, "mass": TwoPiece(6.2e9, 4e8, 4e8)}])
def test_three_pictures_are_written(tmp_path, prior):
    answer = compare_numbers(observed(**prior), (family_table(), family_table(inner=(6, 8), family="far")))
    written = draw_comparison(answer, tmp_path / "first")
    assert [path.name for path in written] == [
        "first-posterior.png",
        "first-factor.png",
        "first-diameter.png",
    ]
    for path in written:
        assert path.read_bytes().startswith(b"\x89PNG")


def test_nothing_is_drawn_where_nothing_fits(tmp_path):
    answer = compare_numbers(observed(), (table_of(np.full(64, 40.0)),))
    assert draw_comparison(answer, tmp_path / "none") == []
    assert list(tmp_path.iterdir()) == []


def test_every_parameter_has_a_panel_with_its_unit():
    angle = np.linspace(0.0, 1.5, 128)
    which = np.arange(128.0) % 3
    table = table_of(
        np.full(128, 11.0),
        parameters=[
            parameter("view.inclination", angle, (0.0, 1.5), "cosine_range", "rad"),
            parameter("emitter.flow", which, (np.nan, np.nan), "list", "", ("circular", "blend", "fall")),
        ],
    )
    figure = factors(compare_numbers(observed(), (table,)))
    labels = [axes.get_xlabel() for axes in figure.axes if axes.get_visible()]
    assert labels == ["inclination [deg]", "motion of the gas", "posterior of k, highest step = 1"]
    assert [tick.get_text() for tick in figure.axes[1].get_xticklabels()] == ["circular", "blend", "fall"]


def test_a_predicted_diameter_is_what_the_scene_reads():
    table = table_of([11.0])
    theta = np.array([3.0, 4.0, 1.0])
    read = predicted(observed(), table, theta)[0]
    # k₀ (1 − 0.36 (x/k₀)²), and no ring beyond x = 0.8 k₀: the formula of the synthetic scan.
    assert read[:2] == pytest.approx(
        [3 * 11 * (1 - 0.36 * (20 / 33) ** 2), 4 * 11 * (1 - 0.36 * (20 / 44) ** 2)], rel=1e-4
    )
    assert np.isnan(read[2])


def heights(axes):
    """Left edge and height of every step of every distribution."""
    return [(patch.get_data().edges, patch.get_data().values) for patch in axes.patches]


def test_posteriors_show_the_numbers_of_the_answer():
    answer = compare_numbers(observed(distance=DISTANCE), (family_table(),))
    upper, mass, lower, _ = posteriors(answer).axes
    theta = answer.ring_only.theta_g
    bars = [line.get_xdata() for line in lower.lines if len(line.get_xdata()) == 2]
    for low, high in ((theta.low68, theta.high68), (theta.low95, theta.high95)):
        assert any(bar == pytest.approx([low.value, high.value]) for bar in bars)
    assert any(line.get_xdata() == pytest.approx([theta.number]) for line in lower.lines)
    ((edges, values),) = heights(upper)
    share = values * np.diff(edges)
    inside = (edges[:-1] > theta.low95.value) & (edges[1:] < theta.high95.value)
    assert share[inside].sum() / share.sum() == pytest.approx(0.95, abs=0.08)  # whole steps only
    assert edges[0] >= upper.get_xlim()[0]
    assert mass.get_title(loc="left") == "Mass"


def test_a_posterior_that_is_cut_says_so():
    whole = posteriors(compare_numbers(observed(), (family_table(),)))
    cut = posteriors(compare_numbers(observed(), (family_table(lost=0.5),)))
    assert "is cut on the side of small" not in whole.get_supxlabel()
    assert "is cut on the side of small" in cut.get_supxlabel()


def test_of_several_families_each_has_a_row_and_few_are_drawn_over_each_other():
    prior = {"distance": DISTANCE, "mass": TwoPiece(6.2e9, 4e8, 4e8)}
    answer = compare_numbers(observed(**prior), (family_table(), family_table(inner=(6, 8), family="far")))
    upper, _, lower, _ = posteriors(answer).axes
    names = [label.get_text().replace("\n", " ") for label in lower.get_yticklabels()]
    assert names == [
        "made up",
        "made up, with the prior",
        "far",
        "far, with the prior",
        "families pooled",
        "prior on the scale",
    ]
    assert len(upper.patches) == 3
