"""A thin disk: which crossings shine, with which power of the redshift, and how the slant path brightens."""

from __future__ import annotations

import numpy as np
import pytest

import emission as em
from raytrace.contract import RayStatus

ROUNDING = 1e-13
FLAT = em.PowerLaw(inner=2.0, outer=50.0, slope=0.0)


def disk(profile=FLAT, flow=None, **options):
    return em.ThinDisk(profile=profile, flow=flow or em.Static(), **options)


def doppler(hole, r, spin_part):
    """Boost of gas on a circular orbit as seen by an observer at rest there: γ(1 − β n_φ), special
    relativity alone."""
    f = hole.f(r)
    speed = np.sqrt(1.0 / (r - 2.0))  # locally measured, r²Ω²/f
    return (1.0 - speed * spin_part * np.sqrt(f) / r) / np.sqrt(1.0 - speed**2)


@pytest.mark.parametrize("s", [-2.0, 0.0, 1.0])
def test_a_spectrum_that_falls_dims_what_is_redshifted(s, schwarzschild, light):
    # I_ν ∝ ν^−s. Redshifted light was emitted at a higher frequency: with s > 0 the source was fainter there.
    radius = np.array([3.0, 6.0, 20.0])
    hit = light.at(schwarzschild, radius)
    image = em.shade(disk(spectral_index=s), hit, spacetime=schwarzschild)[0, 0]
    emitted_over_observed = 1.0 / np.sqrt(1.0 - 2.0 / radius)
    emitted = emitted_over_observed ** (-s)
    np.testing.assert_allclose(image, emitted / emitted_over_observed**3, rtol=ROUNDING)


def test_the_opposite_sign_of_the_spectral_index_is_another_image(schwarzschild, light):
    # The trade also writes I_ν ∝ ν^+α. Taking α for s would change a factor g² in the middle of the disk.
    hit = light.at(schwarzschild, [6.0])
    falling = em.shade(disk(spectral_index=1.0), hit, spacetime=schwarzschild)
    rising = em.shade(disk(spectral_index=-1.0), hit, spacetime=schwarzschild)
    np.testing.assert_allclose(falling / rising, 2.0 / 3.0, rtol=ROUNDING)


def test_a_bolometric_disk_carries_the_fourth_power(schwarzschild, light):
    hit = light.at(schwarzschild, [10.0])
    thermal = disk(profile=em.PageThorne(outer=50.0))
    expected = (1.0 - 2.0 / 10.0) ** 2 * thermal.profile.brightness(10.0)
    np.testing.assert_allclose(em.shade(thermal, hit, spacetime=schwarzschild), expected, rtol=ROUNDING)


def test_orders_add_in_a_thin_disk_and_the_first_hides_the_rest_in_an_opaque_one(schwarzschild, light):
    # Columns: met by all orders; order 0 passes through the hole in the disk; order 0 beyond the disk;
    # never met.
    ring = em.PowerLaw(inner=4.0, outer=20.0, slope=0.0)
    orders = light.stack(
        light.at(schwarzschild, [10.0, 3.0, 30.0, 2.5]),
        light.at(schwarzschild, [5.0, 6.0, 3.5, 2.2]),
        light.at(schwarzschild, [4.0, 5.0, 8.0, 2.1]),
    )
    thin = em.shade(disk(ring), orders, spacetime=schwarzschild)[0] > 0.0
    opaque = em.shade(disk(ring, opaque=True), orders, spacetime=schwarzschild)[0] > 0.0
    np.testing.assert_array_equal(thin, [[1, 0, 0, 0], [1, 1, 0, 0], [1, 1, 1, 0]])
    np.testing.assert_array_equal(opaque, [[1, 0, 0, 0], [0, 1, 0, 0], [0, 0, 1, 0]])


def test_an_order_that_never_crosses_hides_nothing(schwarzschild, light):
    hit = light.at(schwarzschild, [10.0])
    late = light.stack(light.missed(hit, RayStatus.ESCAPED), hit)
    image = em.shade(disk(opaque=True), late, spacetime=schwarzschild)[0]
    np.testing.assert_array_equal(image > 0.0, [[False], [True]])


def test_the_slant_path_of_gas_at_rest_is_the_local_angle(schwarzschild, light):
    # At rest, |cos| = p_θ/r over the local energy 1/√f.
    r, b, lam = 8.0, 5.0, 3.0
    hit = light.at(schwarzschild, r, spin_part=lam, impact=b)
    ratio = em.shade(disk(slant=True), hit, spacetime=schwarzschild) / em.shade(
        disk(), hit, spacetime=schwarzschild
    )
    np.testing.assert_allclose(
        1.0 / ratio, np.sqrt(b**2 - lam**2) * np.sqrt(1.0 - 2.0 / r) / r, rtol=ROUNDING
    )


@pytest.mark.parametrize("spin_part", [-4.0, 0.0, 4.0])
def test_the_slant_path_of_orbiting_gas_is_aberrated(spin_part, schwarzschild, light):
    # Special relativity at the place: cos′ = cos / [γ(1 − β·n)] for a normal across the motion.
    r, b = 10.0, 6.0
    hit = light.at(schwarzschild, r, spin_part=spin_part, impact=b)
    slant = em.shade(disk(flow=em.Circular(), slant=True), hit, spacetime=schwarzschild)
    plain = em.shade(disk(flow=em.Circular()), hit, spacetime=schwarzschild)
    at_rest = np.sqrt(b**2 - spin_part**2) * np.sqrt(schwarzschild.f(r)) / r
    np.testing.assert_allclose(plain / slant, at_rest / doppler(schwarzschild, r, spin_part), rtol=ROUNDING)


def test_grazing_light_stays_finite(schwarzschild, light):
    hit = light.at(schwarzschild, [8.0], spin_part=5.0, impact=5.0)
    slant = em.shade(disk(slant=True), hit, spacetime=schwarzschild)
    plain = em.shade(disk(), hit, spacetime=schwarzschild)
    np.testing.assert_allclose(slant / plain, 1000.0, rtol=ROUNDING)


def test_the_edges_hold_the_kink_of_the_motion_where_it_lies_within():
    wide = disk(em.PowerLaw(inner=2.6, outer=50.0, slope=3.7), em.Circular())
    narrow = disk(em.PowerLaw(inner=7.0, outer=50.0, slope=3.7), em.Circular())
    assert wide.edges == (2.6, 6.0, 50.0)
    assert narrow.edges == (7.0, 50.0)
    assert disk().edges == (2.0, 50.0)


def test_another_spacetime_goes_all_the_way_through(charged, light):
    # A charged hole the package has never heard of: g² = f for gas at rest, g = 1/u^t face-on for orbits.
    radius = np.array([charged.horizon * 1.01, charged.isco * 0.9, 12.0])
    hit = light.at(charged, radius)
    at_rest = em.shade(disk(em.PowerLaw(inner=2.0, outer=50.0, slope=0.0)), hit, spacetime=charged)[0, 0]
    expected = np.where(radius >= 2.0, charged.f(radius) ** 1.5, 0.0)
    np.testing.assert_allclose(at_rest, expected, rtol=ROUNDING)
    blend = disk(flow=em.Blend(orbit_fraction=0.4, fall_fraction=0.3))
    assert np.all(np.isfinite(em.shade(blend, hit, spacetime=charged)))


def test_backdrop_shines_once_where_the_ray_comes_from_infinity(schwarzschild, light):
    hit = light.at(schwarzschild, [5.0, 6.0, 7.0])
    hit.fate[1] = RayStatus.CAPTURED
    image = em.shade(em.Backdrop(), light.stack(hit, hit), spacetime=schwarzschild)
    np.testing.assert_array_equal(image, [[[1.0, 0.0, 1.0], [0.0, 0.0, 0.0]]])


@pytest.mark.parametrize("s", [-3.5, 11.0, float("nan")])
def test_spectra_that_no_source_has_are_refused(s):
    with pytest.raises(ValueError, match=r"is outside -3 to 10; it is s in I ∝ ν\^−s"):
        disk(spectral_index=s)


def test_a_bolometric_profile_takes_no_spectral_index():
    with pytest.raises(ValueError, match="a bolometric profile has no spectrum"):
        disk(profile=em.PageThorne(outer=50.0), spectral_index=1.0)


@pytest.mark.parametrize("frequency", [0.0, -1.0, float("inf"), float("nan")])
def test_an_impossible_frequency_is_refused(frequency, schwarzschild, light):
    with pytest.raises(ValueError, match="is not positive and finite"):
        em.shade(disk(), light.at(schwarzschild, [7.0]), spacetime=schwarzschild, frequency=frequency)


def test_frequency_and_time_leave_a_scale_free_emitter_as_it_is(schwarzschild, light):
    hit = light.at(schwarzschild, [3.0, 7.0], impact=1.0)
    plain = em.shade(disk(spectral_index=1.0), hit, spacetime=schwarzschild)
    dated = em.shade(disk(spectral_index=1.0), hit, spacetime=schwarzschild, frequency=3.45e11, time=70.0)
    np.testing.assert_array_equal(plain, dated)


def test_shade_refuses_an_answer_of_another_shape(schwarzschild, light):
    class Flat(em.Backdrop):
        def intensity(self, hit, *, spacetime, frequency, time):
            return np.zeros(hit.status.shape)

    with pytest.raises(ValueError, match=r"Flat returned intensities of shape \(1, 2\)"):
        em.shade(Flat(), light.at(schwarzschild, [7.0, 8.0]), spacetime=schwarzschild)
