"""The error budget adds up and names the right causes.

Variances of ln θ_g or ln M. Reference: closed forms for sums of independent uniform numbers, and the
variance of the posterior itself.
"""

import math

import numpy as np
import pytest
from scipy.stats import qmc
from synthetic_scans import family_table, parameter, table_of

from ringwright.comparing import formats
from ringwright.comparing.answering import compare_numbers
from ringwright.comparing.distributions import TwoPiece
from ringwright.comparing.inputs import Observed
from ringwright.comparing.wording import paper_line, summary

MILKY_WAY = TwoPiece(8.277e-3, 3.4e-5, 3.4e-5)


def observed(error=3.0, distance=None, resolution=()):
    return Observed("made up", TwoPiece(42.0, error, error), resolution, distance=distance)


def additive_table(first, second, both=0.0, scenes=4096):
    """ln k₀ = ln 11 + first p + second q + both (p q), with p and q uniform from −1 to 1."""
    p, q = 2.0 * qmc.Sobol(2, seed=8).random(scenes).T - 1.0
    parameters = (parameter("emitter.p", p, (-1, 1), unit=""), parameter("emitter.q", q, (-1, 1), unit=""))
    return table_of(11.0 * np.exp(first * p + second * q + both * p * q), parameters=parameters, nodes=3)


@pytest.mark.parametrize("resolution", [(), (20.0,)])
def test_the_budget_adds_up_to_the_variance_of_the_posterior(resolution):
    answer = compare_numbers(
        observed(distance=TwoPiece(16.8, 0.8, 0.7), resolution=resolution), (family_table(),)
    )
    budget = answer.budget
    assert budget.quantity == "ln M"
    assert sum(budget.parts.values()) == pytest.approx(budget.emission, rel=1e-12)
    assert budget.measurement + budget.emission + budget.distance == pytest.approx(budget.total, rel=1e-12)
    # The mass posterior is computed another way: a mixture of shifted copies.
    assert answer.curves.mass.variance() == pytest.approx(budget.total, rel=1e-4)
    assert answer.curves.theta_g.variance() == pytest.approx(budget.measurement + budget.emission, rel=1e-4)


def test_without_a_distance_the_budget_is_that_of_theta_g():
    budget = compare_numbers(observed(), (family_table(),)).budget
    assert budget.quantity == "ln theta_g"
    assert budget.distance is None
    assert "distance" not in budget.to_json()


def test_first_order_shares_are_the_variances_of_the_terms():
    # Var(a p) = a²/3 and Var(c p q) = c²/9 for p, q uniform from −1 to 1: arithmetic.
    budget = compare_numbers(observed(), (additive_table(0.10, 0.05, 0.08),)).budget
    assert budget.parts["emitter.p"] == pytest.approx(0.10**2 / 3.0, rel=0.02)
    assert budget.parts["emitter.q"] == pytest.approx(0.05**2 / 3.0, rel=0.04)
    assert budget.parts["joint"] == pytest.approx(0.08**2 / 9.0, rel=0.05)


def test_a_parameter_without_effect_has_no_share():
    table = additive_table(0.1, 0.0, scenes=256)
    budget = compare_numbers(observed(), (table,)).budget
    assert budget.parts["emitter.q"] < 0.02 * budget.emission


def test_a_list_is_split_by_its_choices():
    which = np.repeat([0.0, 1.0, 2.0], 100)
    varied = parameter("emitter.flow", which, (np.nan, np.nan), "list", "", ("circular", "blend", "fall"))
    table = table_of(np.array([9.0, 11.0, 13.0])[which.astype(int)], parameters=[varied], nodes=3)
    budget = compare_numbers(observed(), (table,)).budget
    expected = np.var(np.log([9.0, 11.0, 13.0]))
    assert budget.parts["emitter.flow"] == pytest.approx(expected, rel=1e-3)
    assert budget.parts["joint"] == pytest.approx(0.0, abs=1e-3 * expected)


def test_measurement_is_the_relative_error_of_the_diameter():
    budget = compare_numbers(observed(error=0.42), (table_of([11.0]),)).budget
    assert math.sqrt(budget.measurement) == pytest.approx(0.01, rel=1e-3)
    assert budget.emission == pytest.approx(0.0, abs=1e-15)


def test_an_emission_that_dominates_is_said_because_it_was_computed():
    wide, narrow = additive_table(0.3, 0.1), additive_table(0.05, 0.02)
    dominated = compare_numbers(observed(), (wide,))
    assert dominated.budget.ratio > 2.0
    assert "contributes at least twice the measurement's standard deviation" in summary(dominated)
    assert [item.code for item in dominated.warnings] == ["emission-dominates"]
    other = compare_numbers(observed(), (narrow,))
    assert other.budget.ratio < 2.0
    assert "at least twice" not in summary(other)


def test_several_families_share_the_prior_and_are_a_line_of_their_own():
    near, far = family_table(family="horizon"), family_table(inner=(6.0, 8.0), family="stable orbit", seed=4)
    pooled = compare_numbers(observed(distance=MILKY_WAY), (near, far))
    assert [item.family for item in pooled.families] == ["horizon", "stable orbit"]
    first, second = (item.ring_only.theta_g.number for item in pooled.families)
    assert second < pooled.ring_only.theta_g.number < first
    means = [np.log(item.curves.theta_g.nodes(4001)[0]).mean() for item in pooled.families]
    assert pooled.budget.parts["family"] == pytest.approx(0.25 * (means[0] - means[1]) ** 2, rel=0.02)
    assert sum(pooled.budget.parts.values()) == pytest.approx(pooled.budget.emission, rel=1e-12)
    assert any("cannot choose between emitter families" in note for note in pooled.notes)
    assert "cannot choose" not in summary(compare_numbers(observed(), (near,)))


def test_the_line_for_a_paper_names_every_part():
    answer = compare_numbers(
        observed(distance=TwoPiece(16.8, 0.8, 0.7), resolution=(20.0,)), (family_table(),)
    )
    line = paper_line(answer.families[0], answer)
    assert line.startswith("θ_g = ")
    for part in (
        "µas",
        f"; M = {formats.mass(answer.ring_only.mass)} (±",
        " measurement, ± ",
        " emission, ± ",
        " distance)",
        "× 10⁹ M☉",
        "68 %",
        "ring only",
        "flat in ln θ_g",
    ):
        assert part in line


def test_json_holds_the_promised_keys():
    request = observed(distance=TwoPiece(16.8, 0.8, 0.7))
    plain = compare_numbers(request, (family_table(),)).to_json()
    for key in (
        "ring_only",
        "combined",
        "conversion_factor",
        "critical_curve_diameter",
        "deviation",
        "budget",
    ):
        assert key in plain
    assert set(plain["ring_only"]["mass"]) == {"value", "unit", "low68", "high68", "low95", "high95"}
    assert plain["ring_only"]["mass"]["unit"] == "solMass"
    assert plain["ring_only"]["theta_g"]["unit"] == "uas"
    assert set(plain["scenes"]) == {"total", "effective", "excluded"}
    assert plain["combined"] is None
    assert plain["observation"]["diameter"] == {"value": 42.0, "unit": "uas", "plus": 3.0, "minus": 3.0}
    assert plain["observation"]["resolution"]["value"] == []
    # 2√27 (Hilbert 1917): the diameter of the critical curve of a hole without spin.
    ratio = plain["critical_curve_diameter"]["value"] / plain["ring_only"]["theta_g"]["value"]
    assert ratio == pytest.approx(2 * math.sqrt(27))
