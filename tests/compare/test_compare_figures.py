"""The pictures of a comparison are written as PNGs, and not at all when there is nothing to draw."""

import numpy as np
import pytest
from synthetic_scans import family_table, parameter, table_of

from ringwright.comparing.answering import compare_numbers
from ringwright.comparing.distributions import TwoPiece
from ringwright.comparing.inputs import Observed
from ringwright.figures.comparison import draw_comparison, factors, predicted

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
    assert labels == ["view.inclination [deg]", "emitter.flow", "posterior of k, relative to its peak"]
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
