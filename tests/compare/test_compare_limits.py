"""A comparison in the limits where its answer is known: one scene, a Gaussian, a quadrature by scipy.

Units µas, Mpc and solar masses. No published source: every reference is a closed form or an integral done
here by another method.
"""

import math

import numpy as np
import pytest
from scipy import integrate, optimize, stats
from synthetic_scans import BIAS, factor, family_table, parameter, table_of

from ringwright.comparing.answering import compare_numbers
from ringwright.comparing.distributions import LogDensity, TwoPiece
from ringwright.comparing.formats import asymmetric
from ringwright.comparing.inputs import Observed
from ringwright.ring.outcomes import RingOutcome
from ringwright.units import THETA_G_OF_SUN

# Quantiles come from cells of a fortieth of a standard deviation, read linearly.
QUANTILE = 1e-3  # of a standard deviation
# A reading is linear between 120 nodes of the synthetic tables.
TABLE = 2e-5


def observed(value=42.0, error=3.0, resolution=(), **more):
    plus, minus = error if isinstance(error, tuple) else (error, error)
    return Observed("made up", TwoPiece(value, plus, minus), resolution, **more)


def test_one_scene_without_smoothing_gives_the_root():
    answer = compare_numbers(observed(error=42e-5), (table_of([11.0]),))
    assert answer.ring_only.theta_g.number == pytest.approx(42.0 / 11.0, rel=1e-8)
    assert answer.conversion_factor.number == pytest.approx(11.0, rel=1e-4)


def test_one_smoothed_scene_gives_the_root_of_its_reading():
    answer = compare_numbers(observed(error=42e-5, resolution=(20.0,)), (table_of([11.0]),))
    root = optimize.brentq(lambda t: 11.0 * t * (1.0 - BIAS * (20.0 / t / 11.0) ** 2) - 42.0, 3.0, 6.0)
    assert answer.ring_only.theta_g.number == pytest.approx(root, rel=TABLE)
    assert answer.conversion_factor.number == pytest.approx(42.0 / root, rel=1e-4)


def test_one_scene_with_a_gaussian_error_gives_the_gaussian():
    theta = compare_numbers(observed(flat=True), (table_of([11.0]),)).ring_only.theta_g
    sigma = 3.0 / 11.0
    for name, p in (("low95", 0.025), ("low68", 0.16), ("value", 0.5), ("high68", 0.84), ("high95", 0.975)):
        expected = 42.0 / 11.0 + sigma * stats.norm.ppf(p)
        assert getattr(theta, name).to_value("uas") == pytest.approx(expected, abs=QUANTILE * sigma)


def quadrature_quantile(density, p, low, high):
    total = integrate.quad(density, low, high, limit=400, points=[42.0 / 11.0])[0]
    return optimize.brentq(
        lambda x: integrate.quad(density, low, x, limit=400, points=[min(42.0 / 11.0, x)])[0] / total - p,
        low,
        high,
    )


def test_a_two_piece_error_and_the_logarithmic_prior_agree_with_quadrature():
    theta = compare_numbers(observed(error=(1.5, 3.1)), (table_of([11.0]),)).ring_only.theta_g

    def density(t):
        offset = 11.0 * t - 42.0
        return math.exp(-0.5 * (offset / (1.5 if offset > 0 else 3.1)) ** 2) / t

    for name, p in (("low68", 0.16), ("value", 0.5), ("high68", 0.84), ("low95", 0.025)):
        expected = quadrature_quantile(density, p, 42.0 / 30.0, 42.0 / 4.0)
        assert getattr(theta, name).to_value("uas") == pytest.approx(expected, abs=QUANTILE * 0.3)


def test_a_two_piece_normal_has_its_mode_at_the_value_and_its_mass_in_proportion():
    # P(x > mode) = plus/(plus + minus): a property of the distribution, e.g. Wallis 2014, from memory.
    normal = TwoPiece(16.8, 0.8, 0.7)
    assert integrate.quad(normal.density, 16.8, 30.0)[0] == pytest.approx(0.8 / 1.5, rel=1e-9)
    x = np.linspace(15.0, 19.0, 4001)
    assert x[np.argmax(normal.density(x))] == pytest.approx(16.8, abs=1e-3)
    points, weights = normal.nodes()
    mean = integrate.quad(lambda y: y * normal.density(y), 8.0, 16.8)[0]
    mean += integrate.quad(lambda y: y * normal.density(y), 16.8, 26.0)[0]
    assert weights @ points == pytest.approx(mean, rel=1e-6)


def test_the_mass_without_a_prior_is_theta_g_times_an_independent_distance():
    answer = compare_numbers(observed(distance=TwoPiece(16.8, 0.8, 0.7)), (table_of([11.0]),))
    rng = np.random.default_rng(5)
    # Drawn here by another route: a Gaussian in θ_g weighted by 1/θ_g, a two-piece normal by its two halves.
    theta = (42.0 + 3.0 * rng.standard_normal(400_000)) / 11.0
    half = np.abs(rng.standard_normal(theta.size))
    above = rng.random(theta.size) < 0.8 / 1.5
    distance = np.where(above, 16.8 + 0.8 * half, 16.8 - 0.7 * half)
    mass = theta * distance / THETA_G_OF_SUN
    order = np.argsort(mass)
    running = np.cumsum(1.0 / theta[order]) / np.sum(1.0 / theta)
    for name, p in (("low68", 0.16), ("value", 0.5), ("high68", 0.84)):
        drawn = np.interp(p, running, mass[order])
        assert getattr(answer.ring_only.mass, name).to_value("solMass") == pytest.approx(drawn, rel=1e-3)


def test_one_solar_mass_at_one_megaparsec_has_the_published_angle():
    # Computed independently with GM☉ of IAU 2015 (CHK): 6.5e9 M☉ at 16.8 Mpc → 3.81899 µas.
    assert pytest.approx(3.81899, abs=5e-6) == 6.5e9 / 16.8 * THETA_G_OF_SUN
    assert pytest.approx(5.12433, abs=5e-6) == 4.297e6 / 8.277e-3 * THETA_G_OF_SUN


@pytest.mark.parametrize("errors", [(1.2e9, 0.8), (0.15e9, 1.5), (0.7e9, 0.05)])
def test_a_prior_on_the_mass_is_marginalised_jointly_with_the_distance(errors):
    """p(θ_g, D) ∝ L(θ_g) π_M(θ_g c²D/G) π_D(D) D against a two-dimensional quadrature by scipy."""
    mass, distance = TwoPiece(5.5e9, errors[0], errors[0]), TwoPiece(16.8, errors[1], errors[1])
    answer = compare_numbers(observed(mass=mass, distance=distance), (table_of([11.0]),))
    d = np.linspace(16.8 - 7 * errors[1], 16.8 + 7 * errors[1], 1201)
    theta = np.linspace(2.0, 6.0, 4001)
    m = theta[:, None] * d / THETA_G_OF_SUN
    joint = stats.norm.pdf(11.0 * theta, 42.0, 3.0)[:, None] * stats.norm.pdf(m, 5.5e9, errors[0])
    joint *= stats.norm.pdf(d, 16.8, errors[1]) * d
    marginal = integrate.simpson(joint, x=d, axis=1)
    running = integrate.cumulative_simpson(marginal, x=theta, initial=0.0)
    running /= running[-1]
    got = answer.combined.theta_g
    sigma = got.plus
    for name, p in (("low68", 0.16), ("value", 0.5), ("high68", 0.84)):
        expected = np.interp(p, running, theta)
        assert getattr(got, name).to_value("uas") == pytest.approx(expected, abs=2e-3 * sigma)
    # The mass itself: sum the joint density below a mass.
    for name, p in (("low68", 0.16), ("value", 0.5), ("high68", 0.84)):
        at = getattr(answer.combined.mass, name).to_value("solMass")
        limit = at * THETA_G_OF_SUN / d
        column = integrate.cumulative_simpson(joint, x=theta, axis=0, initial=0.0)
        below = [np.interp(limit[j], theta, column[:, j]) for j in range(d.size)]
        share = integrate.simpson(below, x=d) / integrate.simpson(column[-1], x=d)
        assert share == pytest.approx(p, abs=2e-3)


def test_a_prior_on_theta_g_multiplies_the_likelihood():
    answer = compare_numbers(observed(theta_g=TwoPiece(3.62, 0.3, 0.3)), (table_of([11.0]),))
    precision = 1.0 / 0.3**2 + 1.0 / (3.0 / 11.0) ** 2
    mean = (3.62 / 0.3**2 + 42.0 / 11.0 / (3.0 / 11.0) ** 2) / precision
    sigma = precision**-0.5
    assert answer.combined.theta_g.number == pytest.approx(mean, abs=QUANTILE * sigma)
    assert answer.combined.theta_g.plus == pytest.approx(sigma * stats.norm.ppf(0.84), rel=2e-3)
    assert answer.combined.mass.value is None
    assert "no distance" in answer.combined.mass.reason


def test_the_deviation_sets_ring_only_against_the_prior():
    answer = compare_numbers(observed(flat=True, theta_g=TwoPiece(5.125, 0.022, 0.022)), (table_of([11.0]),))
    # Ratio of a Gaussian to a narrow Gaussian.
    expected = 42.0 / 11.0 / 5.125 - 1.0
    assert answer.deviation.number == pytest.approx(expected, abs=2e-4)
    assert answer.deviation.plus == pytest.approx(3.0 / 11.0 / 5.125 * stats.norm.ppf(0.84), rel=1e-2)


def test_doubling_every_grid_moves_no_quoted_digit():
    request = observed(
        resolution=(15.0, 25.0),
        error=(1.5, 3.1),
        mass=TwoPiece(6.2e9, 0.5e9, 0.4e9),
        distance=TwoPiece(16.8, 0.8, 0.7),
    )
    table = family_table()
    once, twice = (compare_numbers(request, (table,), refine=n) for n in (1, 2))
    for pick in (
        lambda c: c.ring_only.theta_g,
        lambda c: c.ring_only.mass,
        lambda c: c.combined.theta_g,
        lambda c: c.combined.mass,
        lambda c: c.conversion_factor,
        lambda c: c.deviation,
        lambda c: c.critical_curve_diameter,
    ):
        scale = 10.0 ** math.floor(math.log10(abs(pick(once).number)))
        assert asymmetric(pick(once), scale) == asymmetric(pick(twice), scale)
        assert pick(once).number == pytest.approx(pick(twice).number, abs=1e-3 * pick(once).plus)


def test_an_interval_of_resolutions_is_the_mean_of_its_likelihoods():
    table = table_of([11.0])
    answer = compare_numbers(observed(resolution=(10.0, 28.0)), (table,))
    theta = np.linspace(42.0 / 17.0, 42.0 / 8.0, 3000)
    total = np.zeros(theta.size)
    for r in np.linspace(10.0, 28.0, 721):
        inside = r / theta < 0.8 * 11.0
        k = 11.0 * (1.0 - BIAS * (r / theta / 11.0) ** 2)
        total += np.where(inside, stats.norm.pdf(k * theta, 42.0, 3.0), 0.0) / theta
    running = integrate.cumulative_trapezoid(total, theta, initial=0.0)
    for name, p in (("low68", 0.16), ("value", 0.5), ("high68", 0.84)):
        expected = np.interp(p, running / running[-1], theta)
        assert getattr(answer.ring_only.theta_g, name).to_value("uas") == pytest.approx(expected, rel=1e-3)


def test_the_numerical_error_of_a_reading_is_added():
    coarse = table_of([11.0], halfway_error=np.array([0.05]))
    sharp = compare_numbers(observed(flat=True), (table_of([11.0]),)).ring_only.theta_g
    wide = compare_numbers(observed(flat=True), (coarse,)).ring_only.theta_g
    assert wide.plus / sharp.plus == pytest.approx(math.hypot(3.0, 0.05 * 42.0) / 3.0, rel=2e-3)


def test_outcomes_are_never_crossed():
    """A scene whose ring is missing between two nodes has no likelihood there, and only there."""
    table = table_of([11.0], nodes=9)
    lost = table.node[0, 4] < 20.0 / (42.0 / 10.0)
    assert lost
    outcome = table.outcome.copy()
    outcome[0, 4] = RingOutcome.NO_RING
    broken = table_of([11.0], nodes=9, outcome=outcome)
    theta = compare_numbers(observed(resolution=(20.0,), error=8.0), (broken,)).families[0].posterior
    x = 20.0 / np.exp(theta.grid.centres)
    gap = (x > table.node[0, 3]) & (x < table.node[0, 5])
    assert gap.any()
    assert not theta.cells[gap].any()
    assert theta.cells[~gap & (x < table.node[0, 8])].all()


def test_an_open_ring_counts_for_nothing():
    table = table_of([11.0, 13.0])
    outcome = table.outcome.copy()
    outcome[1] = RingOutcome.OPEN
    answer = compare_numbers(observed(), (table_of([11.0, 13.0], outcome=outcome),))
    alone = compare_numbers(observed(), (table_of([11.0]),))
    assert answer.ring_only.theta_g.number == pytest.approx(alone.ring_only.theta_g.number, rel=1e-3)
    assert answer.scenes.excluded == pytest.approx(0.5)


def test_a_diameter_alone_leaves_every_scene_its_prior_weight():
    answer = compare_numbers(observed(), (table_of([9.0, 11.0, 16.0]),))
    assert answer.families[0].posterior.shares() == pytest.approx(np.full(3, 1 / 3), rel=1e-6)
    assert answer.scenes.effective == pytest.approx(3.0)


def test_the_flat_prior_favours_a_small_conversion_factor():
    answer = compare_numbers(observed(flat=True), (table_of([9.0, 16.0]),))
    shares = answer.families[0].posterior.shares()
    assert shares[0] / shares[1] == pytest.approx(16.0 / 9.0, rel=1e-6)
    assert "favours a small" in answer.prior["theta_g, ring only"]


def test_a_prior_on_a_scene_parameter_replaces_that_of_the_scan():
    """Weights are new over old density: a scan that is uniform in the cosine, made normal in the angle."""
    cosine = 1.0 - (np.arange(4096) + 0.5) / 4096
    angle = np.arccos(cosine)
    varied = parameter("view.inclination", angle, (0.0, math.pi / 2), kind="cosine_range", unit="rad")
    table = table_of(9.0 + 2.0 * angle, parameters=[varied])
    prior = TwoPiece(math.radians(40.0), math.radians(5.0), math.radians(5.0))
    answer = compare_numbers(observed(scene_priors={"view.inclination": prior}), (table,))
    shares = answer.families[0].posterior.shares()
    mean = shares @ angle
    assert math.degrees(mean) == pytest.approx(40.0, abs=0.05)
    assert math.degrees(math.sqrt(shares @ (angle - mean) ** 2)) == pytest.approx(5.0, rel=0.01)
    words = answer.prior["made up: view.inclination"]
    assert "40° ± 5°" in words
    assert "uniform in the cosine from 0° to 90°" in words


def test_a_log_range_is_a_prior_in_the_logarithm():
    values = np.geomspace(2.0, 20.0, 2001)
    varied = parameter("emitter.profile.outer", values, (2.0, 20.0), kind="log_range")
    table = table_of(np.full(values.size, 11.0), parameters=[varied])
    answer = compare_numbers(
        observed(scene_priors={"emitter.profile.outer": TwoPiece(9.0, 1.0, 1.0)}), (table,)
    )
    shares = answer.families[0].posterior.shares()
    assert shares @ values == pytest.approx(9.0, abs=0.01)


def test_the_truth_of_a_product_of_two_lognormals_is_a_lognormal():
    u = np.linspace(-3.0, 3.0, 4001)
    first = LogDensity.from_cells(u, stats.norm.pdf(0.5 * (u[1:] + u[:-1]), 0.0, 0.3))
    x = np.linspace(-2.4, 2.4, 301)
    weight = stats.norm.pdf(x, 0.0, 0.4)
    both = first.times(np.exp(x), weight / weight.sum())
    assert both.variance() == pytest.approx(0.25, rel=1e-3)
    assert math.log(both.quantile(0.84)) == pytest.approx(0.5 * stats.norm.ppf(0.84), rel=1e-3)


def test_the_synthetic_family_reads_what_its_formula_says():
    table = family_table(scenes=8)
    k = factor(table.parameters[0].values, table.parameters[1].values, 4.0)
    read = [np.interp(4.0, table.node[i, :-1], table.diameter[i, :-1]) for i in range(8)]
    assert read == pytest.approx(k, rel=TABLE)
