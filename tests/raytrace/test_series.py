"""Bands cut at the critical curve, and what is sampled on them interpolated anywhere with an error that is bounded.

The oracle for an interpolant is a ray traced at the place that it is asked for; band widths are published numbers.
"""

from __future__ import annotations

import math

import numpy as np
import pytest

import raytrace as rt
from raytrace.series import BandSeries, equally_spaced, trigonometric_weights

HORIZON, OUTER = 2.1, 50.0
# Band of a full disk seen face-on, from b(r = 2) to b(r → ∞), orders 1 to 3 [M]: computed independently with
# arbitrary-precision arithmetic.
FULL_BANDS = {1: 1.152431, 2: 0.0401304, 3: 0.00171519}


@pytest.mark.parametrize(("order", "width"), FULL_BANDS.items())
def test_face_on_bands_have_the_widths_of_a_full_disk(order, width):
    ends = (rt.isoradial(r, order=order, angle=0.3, inclination=0.0) for r in (2.0, math.inf))
    inner, outer = ends
    assert outer - inner == pytest.approx(width, rel=4e-6)


def test_the_direct_image_has_no_farthest_circle():
    assert rt.isoradial(math.inf, order=0, angle=0.3, inclination=0.5) == math.inf


def test_bands_of_orders_above_0_are_cut_at_the_critical_curve_and_at_the_stable_orbit():
    screen = rt.screen(inclination=0.9, edges=(HORIZON, OUTER), orders=3)
    for band in screen.bands:
        assert 6.0 in band.radii
        assert np.all(band.widths > 0.0)
        if band.order > 0:
            at = band.radii.tolist().index(3.0)
            assert np.all(band.offsets[at] == 0.0)
            assert band.edges[at] == pytest.approx(math.sqrt(27.0), rel=1e-15)


def test_an_emitter_that_ends_at_the_photon_orbit_keeps_its_own_edge():
    for edges in ((3.0, 20.0), (2.2, 3.0)):
        band = rt.screen(inclination=0.9, edges=edges, orders=2).bands[1]
        own = rt.isoradial(3.0, order=1, angle=band.angles, inclination=0.9)
        assert band.edges[edges.index(3.0) and -1] == pytest.approx(own, rel=1e-14)


def test_the_critical_curve_never_crosses_a_neighbouring_edge():
    # The critical ray meets the plane at 3.0 to 3.2 M in order 1: an emitter's edge may stand just there.
    band = rt.screen(inclination=1.2, edges=(2.5, 3.05, 3.1, 20.0), orders=2).bands[1]
    assert np.all(band.widths > 0.0)


def traced(band, inclination, distance, angle):
    hit = rt.trace(
        distance * np.cos(angle),
        distance * np.sin(angle),
        inclination=inclination,
        orders=band.order + 1,
        azimuth=False,
        delay=False,
        momentum=False,
    )
    return (HORIZON / hit.radius[band.order]) ** 3


@pytest.mark.parametrize("inclination", [0.0, 0.4, 1.2, 1.5])
@pytest.mark.parametrize("tolerance", [1e-3, 1e-5, 1e-8])
def test_the_error_told_bounds_the_error_of_the_interpolant(inclination, tolerance):
    screen = rt.screen(inclination=inclination, edges=(HORIZON, OUTER), orders=4, tolerance=tolerance)
    values = np.concatenate(
        [traced(b, inclination, b.distance.ravel(), _angles(b)) for b in screen.bands], axis=0
    )
    draw = np.random.default_rng(7)
    for band, series, told in zip(screen.bands, screen.interpolate(values), screen.error, strict=True):
        phi = draw.uniform(0.0, 2.0 * math.pi, 1500)
        edges = band.curve(phi) + series.at_angles(phi)[0]
        b = edges[0] + (edges[-1] - edges[0]) * draw.uniform(1e-3, 1.0 - 1e-3, phi.size)
        error = float(np.max(np.abs(series(b, phi) - traced(band, inclination, b, phi))))
        assert error <= told
        assert told < 3.0 * tolerance + 1e-9


def _angles(band):
    return np.broadcast_to(band.angles, band.shape).ravel()


def test_outside_its_band_a_series_is_zero():
    screen = rt.screen(inclination=0.5, edges=(4.0, 10.0), orders=2)
    ones = screen.interpolate(np.ones(screen.alpha.size))
    for series in ones:
        edges = series.band.edges
        assert series(edges[0] - 1e-3, series.band.angles) == pytest.approx(0.0, abs=0.0)
        assert series(edges[-1] + 1e-3, series.band.angles) == pytest.approx(0.0, abs=0.0)
        assert series(0.5 * (edges[0] + edges[-1]), series.band.angles) == pytest.approx(1.0)
        assert series.flux() == pytest.approx(screen.weight[screen.order == series.band.order].sum())


def test_values_that_do_not_fit_the_samples_are_refused():
    screen = rt.screen(inclination=0.5, edges=(4.0, 10.0), orders=1)
    with pytest.raises(ValueError, match="do not fit the screen's"):
        screen.interpolate([1.0, 2.0])


def test_both_ways_to_interpolate_around_the_screen_agree_with_a_trigonometric_polynomial():
    count = 16
    sampled = (np.arange(count) + 0.5) * (2.0 * math.pi / count)

    def polynomial(phi):
        return 1.0 + np.cos(3.0 * phi) - 0.4 * np.sin(7.0 * phi)

    fine = np.arange(40) * (2.0 * math.pi / 40)
    assert equally_spaced(polynomial(sampled), 40) == pytest.approx(polynomial(fine), abs=1e-14)
    anywhere = np.array([0.0, 0.1, 2.0, -3.0, *sampled[:2]])
    weights = trigonometric_weights(count, anywhere)
    assert polynomial(sampled) @ weights == pytest.approx(polynomial(anywhere), abs=1e-14)


def test_samples_come_back_from_their_series():
    band = rt.screen(inclination=0.5, edges=(4.0, 10.0), orders=1).bands[0]
    values = 1.0 / band.distance
    assert BandSeries.of(band, values).values == pytest.approx(values, rel=1e-13)


def test_steep_views_are_refined_although_their_tails_grow_at_first():
    screen = rt.screen(inclination=math.radians(88.5), edges=(2.6, 20.0), orders=2, tolerance=1e-3)
    assert np.all(screen.error < 3e-3)
