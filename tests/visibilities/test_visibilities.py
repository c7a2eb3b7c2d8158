"""Visibilities: the sign of the phase, the closed forms of rings and Gaussians, and the transforms against the sum.

The convention is V(u, v) = ∬ I exp[−2πi(ux + vy)] dx dy, x east, y north (OIFITS 2, Duvert, Young & Hummel 2017,
A&A 597, A8; from memory); it is typed out here wherever it is tested.
"""

from __future__ import annotations

import dataclasses
import subprocess
import sys
from itertools import pairwise

import finufft
import numpy as np
import pytest
from astropy import units
from astropy.io import fits
from astropy.wcs import WCS
from hypothesis import given
from hypothesis import strategies as st
from scipy.special import erf, ive, j0, j1, jn_zeros

import ringwright as rw
from ringwright import visibilities
from ringwright.errors import InputError
from ringwright.fits import UAS_PER_DEGREE, read_fits
from ringwright.image import Image
from ringwright.units import GLAMBDA
from ringwright.visibilities import of_image, of_samples, visibility

UAS = np.pi / 180.0 / 3.6e9
G = 1e9
# Sums in double precision of terms whose phases are below some hundred radians.
ROUNDING = 1e-12
# astropy.wcs gives microarcseconds to 1e-4 of one, from degrees: 2π · 5.8e9 · 4.8e-16 rad in phase, of 0.6 Jy.
SMALL_OFFSETS = 1e-5
# What the transforms are asked for by default, relative to the flux.
DEFAULT = 1e-9


def sky_image(light, pixel_uas=1.0, in_jansky=True):
    """An image on the sky whose orders, shape (order, y, x) or (y, x), hold this light."""
    stack = np.atleast_3d(light) if np.ndim(light) == 3 else np.asarray(light, dtype=np.float64)[None]
    flux = stack.sum(axis=(1, 2))
    return Image(
        name="invented",
        intensity=stack,
        pixel_m=pixel_uas / 4.0,
        theta_g_uas=4.0,
        frequency_hz=230e9,
        position_angle=0.0,
        in_jansky=in_jansky,
        flux=flux,
        flux_in_field=flux,
        band_width=np.ones(len(stack)),
    )


def in_m(image):
    return dataclasses.replace(image, theta_g_uas=None)


def offsets(ny, nx, pixel):
    """East (1, nx) and north (ny, 1) of the pixel centres, about the middle; row 0 south, column 0 east."""
    return (0.5 * (nx - 1) - np.arange(nx))[None, :] * pixel, (np.arange(ny) - 0.5 * (ny - 1))[
        :, None
    ] * pixel


def the_sum(x, y, flux, u, v):
    """The definition, term by term."""
    phase = -2j * np.pi * (np.multiply.outer(u, np.ravel(x)) + np.multiply.outer(v, np.ravel(y)))
    return np.exp(phase) @ np.ravel(flux)


def some_light(seed, n, m, reach=40.0 * UAS, longest=20.0 * G):
    random = np.random.default_rng(seed)
    x, y = random.uniform(-reach, reach, (2, n))
    u, v = random.uniform(-longest, longest, (2, m))
    return x, y, random.exponential(size=n), u, v


@pytest.fixture
def transforms(monkeypatch):
    """How often each transform was called."""
    calls = {"nufft2d2": 0, "nufft2d3": 0}

    def counted(name, function):
        def call(*args, **options):
            calls[name] += 1
            return function(*args, **options)

        return call

    for name in calls:
        monkeypatch.setattr(finufft, name, counted(name, getattr(finufft, name)))
    return calls


# The sign of the phase: an off-centre point source.


@pytest.mark.parametrize(("east", "north"), [(30.0, 0.0), (0.0, 20.0), (-12.0, 7.0)])
def test_a_source_to_the_east_or_north_turns_the_phase_backward(east, north):
    """30 µas east at 1 Gλ toward the east: −2π · 1e9 · 30 · 4.8481368e-12 = −0.9138523 rad."""
    value = of_samples([east * UAS], [north * UAS], [0.7], u=1.0 * G, v=0.0)
    assert np.angle(value) == pytest.approx(-0.9138523 * east / 30.0, abs=1e-6)
    assert abs(value) == pytest.approx(0.7, rel=ROUNDING)
    value = of_samples([east * UAS], [north * UAS], [0.7], u=0.0, v=1.0 * G)
    assert np.angle(value) == pytest.approx(-0.9138523 * north / 30.0, abs=1e-6)


@pytest.mark.parametrize("shape", [(40, 50), (41, 50), (40, 51), (41, 51)])
def test_a_bright_pixel_is_a_source_at_its_right_ascension_and_declination(shape, tmp_path):
    """The offsets are those of astropy.wcs on the FITS file, east being larger right ascension."""
    light = np.zeros(shape)
    light[31, 7] = 0.6
    image = dataclasses.replace(sky_image(light, 0.8), position=(1.0, 0.0))
    path = image.to_fits(tmp_path / "one.fits")
    with fits.open(path) as hdus:
        wcs = WCS(hdus[0].header).celestial
    ra, dec = wcs.pixel_to_world_values(7, 31)
    east, north = (ra - 1.0) * UAS_PER_DEGREE, dec * UAS_PER_DEGREE
    assert (east > 0.0, north > 0.0) == (True, True)
    for u, v in ((2.0, 0.0), (0.0, 2.0), (3.0, -5.0)):
        expected = 0.6 * np.exp(-2j * np.pi * (u * G * east * UAS + v * G * north * UAS))
        assert of_image(image, u=u * G, v=v * G) == pytest.approx(expected, abs=SMALL_OFFSETS)
        angle = np.degrees(np.arctan2(u, v))
        found = visibility(path, baseline=np.hypot(u, v) * GLAMBDA, position_angle=f"{float(angle)!r} deg")
        assert found.to_value("Jy") == pytest.approx(expected, abs=SMALL_OFFSETS)


# Closed forms.

# Thin-ring visibility J0(πdu): nulls and extrema in units of 1/d (standard; Johnson et al. 2020; computed independently in
# arbitrary precision, digits shown are converged).
NULLS = (0.765480, 1.757095, 2.754567)
EXTREMA = {1.219670: -0.402759, 2.233131: 0.300116}


def ring_samples(diameter, count=400):
    angle = 2.0 * np.pi * np.arange(count) / count
    return 0.5 * diameter * np.sin(angle), 0.5 * diameter * np.cos(angle), np.full(count, 1.0 / count)


def test_a_thin_ring_of_points_is_a_bessel_function():
    d = 42.0 * UAS
    length, angle = np.linspace(0.0, 60.0, 241) / d, np.linspace(0.0, np.pi, 241)
    found = of_samples(*ring_samples(d), u=length * np.sin(angle), v=length * np.cos(angle))
    assert found == pytest.approx(j0(np.pi * d * length), abs=1e-12)


def test_the_nulls_and_extrema_of_a_thin_ring_are_where_the_table_has_them():
    d = 42.0 * UAS
    half_a_digit = 0.5e-6
    for null in NULLS:
        slope = np.pi * abs(j1(np.pi * null))
        assert abs(of_samples(*ring_samples(d), u=null / d, v=0.0)) <= slope * half_a_digit
    for place, value in EXTREMA.items():
        assert of_samples(*ring_samples(d), u=0.0, v=place / d).real == pytest.approx(value, abs=half_a_digit)
    # The same baselines in Gλ for d = 42 µas: 3.7593 and 8.629 (computed independently).
    assert np.array(NULLS[:2]) / d / G == pytest.approx([3.7593, 8.629], abs=6e-4)


def test_the_image_of_a_blurred_ring_has_the_visibility_of_a_thick_ring():
    """V = J0(πdu) exp(−π²w²u²/(4 ln 2)) for I ∝ exp(−(r² + R²)/2σ²) I0(rR/σ²) (exact)."""
    n, pixel, d, fwhm = 256, 0.5, 42.0, 5.0
    sigma = fwhm / np.sqrt(8.0 * np.log(2.0))
    r = np.hypot(*offsets(n, n, pixel))
    light = np.exp(-((r - 0.5 * d) ** 2) / (2.0 * sigma**2)) * ive(0, r * 0.5 * d / sigma**2)
    image = sky_image(light / light.sum(), pixel)
    u = np.linspace(0.0, 25.0, 101)
    thick = j0(np.pi * d * UAS * u * G) * np.exp(-((np.pi * fwhm * UAS * u * G) ** 2) / (4.0 * np.log(2.0)))
    for angle in (0.0, 30.0, 135.0):
        found = visibility(image, baseline=u * GLAMBDA, position_angle=angle * units.deg)
        assert found.to_value("Jy") == pytest.approx(thick, abs=3e-9)


def test_a_gaussian_source_is_a_gaussian_and_its_pixels_add_their_own_square():
    """Pixels that hold integrals over their areas: the closed form times sinc(u·dx) sinc(v·dx)."""
    sigma, pixel, n = 6.0, 4.0, 40
    edges = (np.arange(n + 1) - 0.5 * n) * pixel / (np.sqrt(2.0) * sigma)
    share = 0.5 * np.diff(erf(edges))
    image = sky_image(0.5 * share[:, None] * share[None, :], pixel)
    # Longest where the first alias, at 1/dx − u, is still below 1e-9.
    for u, v in ((0.0, 0.0), (4.0, 0.0), (0.0, 9.0), (9.0, -7.0)):
        a, b = u * G * UAS, v * G * UAS
        gaussian = 0.5 * np.exp(-2.0 * (np.pi * sigma) ** 2 * (a**2 + b**2))
        found = of_image(image, u=u * G, v=v * G)
        assert found == pytest.approx(gaussian * np.sinc(a * pixel) * np.sinc(b * pixel), abs=2e-9)


def test_the_envelope_of_a_thin_ring_falls_as_the_root_of_the_baseline():
    """|J0(z)| → √(2/(πz)) at its extrema: between far extrema the ratio is that of u^−1/2 (standard)."""
    d = 42.0 * UAS
    extrema = [place / (np.pi * d) for place in np.diff(jn_zeros(1, 60)).cumsum() + jn_zeros(1, 1)[0]]
    peaks = np.abs(of_samples(*ring_samples(d, 1000), u=np.array(extrema[10:]), v=0.0))
    for (first, near), (second, far) in pairwise(zip(extrema[10:], peaks, strict=True)):
        assert near / far == pytest.approx(np.sqrt(second / first), rel=1e-4)


# Relations that hold for any light.

angles = st.floats(-np.pi, np.pi)
lengths = st.floats(0.0, 50.0)
shifts = st.floats(-60.0, 60.0)
seeds = st.integers(0, 1000)


@given(seeds, lengths, angles)
def test_the_visibility_at_zero_is_the_flux_and_opposite_baselines_are_conjugate(seed, length, angle):
    x, y, flux, _, _ = some_light(seed, 30, 1)
    u, v = length * G * np.sin(angle), length * G * np.cos(angle)
    found = of_samples(x, y, flux, u=[0.0, u, -u], v=[0.0, v, -v])
    assert found[0] == pytest.approx(flux.sum(), rel=ROUNDING)
    assert found[2] == pytest.approx(np.conj(found[1]), abs=ROUNDING * flux.sum())
    image = sky_image(flux.reshape(5, 6))
    found = of_image(image, u=[0.0, u, -u], v=[0.0, v, -v])
    assert found[0] == pytest.approx(flux.sum(), rel=DEFAULT)
    assert found[2] == pytest.approx(np.conj(found[1]), abs=DEFAULT * flux.sum())


@given(seeds, shifts, shifts)
def test_shifting_the_source_turns_the_phase_only(seed, east, north):
    x, y, flux, u, v = some_light(seed, 30, 20)
    still = of_samples(x, y, flux, u=u, v=v)
    moved = of_samples(x + east * UAS, y + north * UAS, flux, u=u, v=v)
    turn = np.exp(-2j * np.pi * UAS * (u * east + v * north))
    assert moved == pytest.approx(still * turn, abs=ROUNDING * flux.sum())
    assert np.abs(moved) == pytest.approx(np.abs(still), abs=ROUNDING * flux.sum())


@given(seeds, angles)
def test_rotating_the_source_rotates_its_visibilities(seed, turn):
    """By `turn` from north through east, as position angles count."""
    x, y, flux, u, v = some_light(seed, 30, 20)

    def rotated(east, north):
        return (
            east * np.cos(turn) + north * np.sin(turn),
            north * np.cos(turn) - east * np.sin(turn),
        )

    (x2, y2), (u2, v2) = rotated(x, y), rotated(u, v)
    still = of_samples(x, y, flux, u=u, v=v)
    assert of_samples(x2, y2, flux, u=u2, v=v2) == pytest.approx(still, abs=ROUNDING * flux.sum())


@given(st.integers(1, 24), st.integers(1, 24), seeds)
def test_an_image_of_any_shape_is_the_sum_over_its_pixel_centres(ny, nx, seed):
    random = np.random.default_rng(seed)
    light = random.exponential(size=(ny, nx))
    u, v = random.uniform(-0.5, 0.5, (2, 40)) / (2.0 * UAS)
    u[:4], v[:4] = (
        np.array([0.5, -0.5, 0.5, 0.0]) / (2.0 * UAS),
        np.array([0.5, 0.5, -0.5, 0.5]) / (2.0 * UAS),
    )
    east, north = np.broadcast_arrays(*offsets(ny, nx, 2.0 * UAS))
    found = of_image(sky_image(light, 2.0), u=u, v=v)
    assert found == pytest.approx(the_sum(east, north, light, u, v), abs=DEFAULT * light.sum())


def test_a_quarter_turn_of_the_picture_is_a_quarter_turn_of_the_baselines():
    random = np.random.default_rng(5)
    light = random.exponential(size=(33, 48))
    baseline = random.uniform(0.0, 60.0, 50) * GLAMBDA
    angle = random.uniform(0.0, 360.0, 50)
    # With row 0 south and column 0 east this takes the northernmost row to the easternmost column.
    turned = np.rot90(light, -1)
    assert turned[0, 0] == light[-1, 0]
    before = visibility(sky_image(light), baseline=baseline, position_angle=angle * units.deg)
    after = visibility(sky_image(turned), baseline=baseline, position_angle=(angle + 90.0) * units.deg)
    assert after.value == pytest.approx(before.value, abs=2 * DEFAULT * light.sum())


# The transforms against the sum.


@pytest.mark.parametrize("accuracy", [1e-2, 1e-3, 1e-6, 1e-9, 1e-11])
@pytest.mark.parametrize("kind", ["many", "one bright"])
def test_samples_are_transformed_to_the_accuracy_that_is_asked_for(accuracy, kind, transforms):
    """One bright sample among dark ones is the worst case: nothing averages its error."""
    x, y, flux, u, v = some_light(7, 3000, 300)
    if kind == "one bright":
        flux = np.full(3000, 1e-15)
        flux[np.argmax(np.hypot(x, y))] = 1.0
    found = of_samples(x, y, flux, u=u, v=v, accuracy=accuracy)
    assert transforms["nufft2d3"] == 1
    assert np.abs(found - the_sum(x, y, flux, u, v)).max() < accuracy * flux.sum()


@pytest.mark.parametrize("accuracy", [1e-2, 1e-3, 1e-6, 1e-9, 1e-11])
@pytest.mark.parametrize("kind", ["many", "one bright"])
def test_pixels_are_transformed_to_the_accuracy_that_is_asked_for(accuracy, kind, transforms):
    random = np.random.default_rng(8)
    light = random.exponential(size=(128, 96))
    if kind == "one bright":
        light = np.zeros((128, 96))
        light[0, 0] = 1.0
    u, v = random.uniform(-0.5, 0.5, (2, 100)) / UAS
    east, north = np.broadcast_arrays(*offsets(128, 96, UAS))
    found = of_image(sky_image(light), u=u, v=v, accuracy=accuracy)
    assert transforms["nufft2d2"] == 1
    assert np.abs(found - the_sum(east, north, light, u, v)).max() < accuracy * light.sum()


def test_few_samples_or_baselines_far_out_are_summed_to_rounding(transforms):
    for n, m, longest in ((300, 300, 20.0 * G), (5000, 200, 1e13)):
        x, y, flux, u, v = some_light(9, n, m, longest=longest)
        found = of_samples(x, y, flux, u=u, v=v, accuracy=1e-2)
        # Phases reach 2π·1e13·2e-10 rad, whose rounding is 2e-16 of them.
        assert np.abs(found - the_sum(x, y, flux, u, v)).max() < 1e-11 * flux.sum()
    assert transforms["nufft2d3"] == 0


@pytest.mark.parametrize("n", [16, 15])
def test_at_the_grid_frequencies_an_image_is_the_fast_fourier_transform(n):
    """numpy.fft counts from the corner, toward the north and toward the west: conjugate the columns, mend the phase."""
    random = np.random.default_rng(11)
    light = random.exponential(size=(n, n))
    k = np.fft.fftfreq(n)  # cycles per pixel
    middle = np.exp(2j * np.pi * k * 0.5 * (n - 1))
    expected = n * np.fft.ifft(np.fft.fft(light, axis=0), axis=1)
    expected = expected * middle[:, None] * np.conj(middle)[None, :]
    found = of_image(sky_image(light, 2.0), u=k[None, :] / (2.0 * UAS), v=k[:, None] / (2.0 * UAS))
    assert found == pytest.approx(expected, abs=DEFAULT * light.sum())


# Images and files.


def test_orders_add_up_to_the_whole():
    light = np.random.default_rng(3).exponential(size=(3, 20, 20))
    image, baselines = sky_image(light), {"u": np.linspace(0.0, 50.0 * G, 11), "v": 3.0 * G}
    orders = [of_image(image, order=n, **baselines) for n in range(3)]
    assert sum(orders) == pytest.approx(of_image(image, **baselines), abs=3 * DEFAULT * light.sum())
    assert abs(of_image(image, u=0.0, v=0.0, order=1)) == pytest.approx(light[1].sum())


def test_a_rendered_scene_gives_the_flux_in_its_field_from_memory_and_from_either_file(write_scene, tmp_path):
    sky = 'mass = "9.2e9 solMass"\ndistance = "21 Mpc"'
    scene = write_scene(hole=sky, more='[source]\ntotal_flux = "0.6 Jy"\n', field="300 uas")
    image = rw.render(scene)
    found = rw.visibility(image, baseline=["0 Glambda", "2 Gλ"], position_angle="40 deg")
    assert found.unit == units.Jy
    assert found[0].value == pytest.approx(image.flux_in_field.sum(), rel=DEFAULT)
    for path in (image.save(tmp_path / "a.h5"), image.to_fits(tmp_path / "a.fits")):
        again = rw.visibility(path, baseline=["0 Glambda", "2 Gλ"], position_angle="40 deg")
        assert again.to_value("Jy") == pytest.approx(found.value, abs=1e-6)  # HDF5 keeps single precision


def test_an_image_without_a_flux_density_gives_shares():
    light = np.full((4, 4), 1.0 / 32.0)  # half of the light is in the field
    found = visibility(sky_image(light, in_jansky=False), baseline="0 Glambda", position_angle="0 deg")
    assert found.unit == units.dimensionless_unscaled
    assert found.value == pytest.approx(0.5)


@pytest.mark.parametrize(
    ("bunit", "flux", "unit"),
    [
        ("Jy/pixel", 80.0, "Jy"),
        ("mJy/pixel", 0.08, "Jy"),
        ("JY/PIXEL ", 80.0, "Jy"),
        # 80 pixels of 0.64 µas², and 1 µas² = (4.8481368e-12 rad)² = 2.3504e-23 sr.
        ("MJy/sr", 80.0 * 0.64 * 2.3504430e-23 * 1e6, "Jy"),
        ("Jy uas-2", 80.0 * 0.64, "Jy"),
        # The area of a Gaussian beam is π/(4 ln 2) FWHM² = 1.1330900 · 16 µas².
        ("Jy/beam", 80.0 * 0.64 / (1.1330900 * 16.0), "Jy"),
        ("K", 1.0, ""),
        (None, 1.0, ""),
    ],
)
def test_a_fits_image_is_read_in_its_own_unit(tmp_path, bunit, flux, unit):
    header = fits.Header({"CTYPE1": "RA---SIN", "CTYPE2": "DEC--SIN", "CRPIX1": 5.5, "CRPIX2": 4.5})
    header.update({"CDELT1": -0.8 / UAS_PER_DEGREE, "CDELT2": 0.8 / UAS_PER_DEGREE})
    if bunit:
        header["BUNIT"] = bunit
    if bunit == "Jy/beam":
        header["BMAJ"] = header["BMIN"] = 4.0 / UAS_PER_DEGREE
    fits.PrimaryHDU(np.ones((8, 10)), header).writeto(tmp_path / "a.fits")
    found = visibility(tmp_path / "a.fits", baseline="0 Glambda", position_angle="0 deg")
    assert found.unit == units.Unit(unit)
    assert found.value == pytest.approx(flux, rel=1e-6)


def test_baselines_and_directions_broadcast_and_scalars_stay_scalars():
    image = sky_image(np.eye(8))
    found = visibility(
        image, baseline=np.linspace(0.0, 9.0, 5)[:, None] * GLAMBDA, position_angle=[0, 1, 2] * units.rad
    )
    assert found.shape == (5, 3)
    assert visibility(image, baseline="8 Glambda", position_angle="30 deg").shape == ()
    assert np.ndim(of_samples(0.0, 0.0, 1.0, u=1.0, v=2.0)) == 0
    assert of_samples([], [], [], u=[1.0, 2.0], v=0.0).tolist() == [0.0, 0.0]
    assert of_samples([1.0], [1.0], [1.0], u=[], v=0.0).shape == (0,)
    assert of_image(image, u=np.zeros((0, 2)), v=0.0).shape == (0, 2)


@pytest.mark.parametrize(
    ("text", "wavelengths"),
    [("8 Glambda", 8e9), ("8 Gλ", 8e9), ("8000Mlambda", 8e9), ("3 kλ", 3e3), ("8e9 lambda", 8e9)],
)
def test_baselines_are_written_in_wavelengths(text, wavelengths):
    image = sky_image(np.eye(8))
    found = visibility(image, baseline=text, position_angle="0 deg").value
    assert found == pytest.approx(of_image(image, u=0.0, v=wavelengths), abs=1e-12)


# What is refused.


def test_a_baseline_with_fringes_finer_than_two_pixels_is_refused_with_the_longest_that_is_carried():
    """1/(2 · 5 µas) = 20.6265 Gλ."""
    image = sky_image(np.ones((8, 8)), 5.0)
    of_image(image, u=20.6264 * G, v=-20.6264 * G)
    for u, v in ((20.6266, 0.0), (0.0, 20.6266), (-30.0, 0.0), (1.0, -30.0)):
        with pytest.raises(
            InputError, match=r"pixels of 5 µas carry baselines up to 20\.63 Gλ.*smaller pixels, or use"
        ):
            of_image(image, u=[0.0, u * G], v=[0.0, v * G])


def test_blank_pixels_are_refused(tmp_path):
    light = np.ones((6, 6))
    path = sky_image(light).to_fits(tmp_path / "blank.fits")
    light[2, 1:4] = np.nan
    with fits.open(path, mode="update") as hdus:
        hdus[0].data[0, 0] = light
    for image in (sky_image(light), read_fits(path), path):
        with pytest.raises(
            InputError, match=r"3 of 36 pixels of 'invented' are blank.*set those that are dark to 0"
        ):
            visibility(image, baseline="1 Glambda", position_angle="0 deg")


def test_an_image_in_units_of_m_is_refused():
    with pytest.raises(InputError, match=r"'invented' is in units of M.*give the scene theta_g"):
        of_image(in_m(sky_image(np.ones((4, 4)))), u=0.0, v=0.0)


@pytest.mark.parametrize(
    ("baseline", "angle", "sentence"),
    [
        (
            8e9,
            "0 deg",
            r'the baseline: 8000000000\.0 has no unit; write it as text with one, like "8 Glambda"',
        ),
        ("8e9", "0 deg", "the baseline: '8e9' has no unit"),
        (np.array([1.0, 2.0]), "0 deg", r"the baseline: 1\.0 has no unit"),
        (
            units.Quantity(8e9),
            "0 deg",
            r"the baseline: 8000000000\.0 is not a baseline; give one like 8 Glambda",
        ),
        ("8000 km", "0 deg", "the baseline: '8000 km' is not a baseline"),
        ("8 Glamda", "0 deg", "'Glamda' is not a unit; did you mean 'Glambda'"),
        ("8 Glambda", 0.5, "the position angle of the baseline: 0.5 has no unit"),
        ("8 Glambda", "30 Glambda", "the position angle of the baseline: '30 Glambda' is not an angle"),
        (np.nan * GLAMBDA, "0 deg", "some baselines are not finite"),
        (
            [1.0, 2.0] * GLAMBDA,
            [1.0, 2.0, 3.0] * units.deg,
            r"baselines and position angles of shapes \(2,\) and \(3,\) do not go together",
        ),
    ],
)
def test_what_is_no_baseline_is_refused_with_the_fix(baseline, angle, sentence):
    with pytest.raises(InputError, match=sentence):
        visibility(sky_image(np.ones((4, 4))), baseline=baseline, position_angle=angle)


def test_what_cannot_be_summed_is_refused_with_a_sentence(tmp_path):
    with pytest.raises(InputError, match=r"every sample needs one x.*\(2,\), \(2,\) and \(1,\)"):
        of_samples([0.0, 1.0], [0.0, 1.0], [1.0], u=0.0, v=0.0)
    with pytest.raises(InputError, match="some samples have an x, y or flux that is not finite"):
        of_samples([0.0, np.nan], [0.0, 1.0], [1.0, 1.0], u=0.0, v=0.0)
    with pytest.raises(InputError, match=r"u and v of shapes \(2,\) and \(3,\) do not go together"):
        of_samples([0.0], [0.0], [1.0], u=[0.0, 1.0], v=[0.0, 1.0, 2.0])
    for accuracy in (0.0, 1e-16, 0.5, np.nan):
        with pytest.raises(InputError, match=r"between 1e-11 and 0\.01, not"):
            of_samples([0.0], [0.0], [1.0], u=0.0, v=0.0, accuracy=accuracy)
    with pytest.raises(InputError, match="has the orders 0 to 0, and no order 1"):
        of_image(sky_image(np.ones((4, 4))), u=0.0, v=0.0, order=1)
    path = sky_image(np.ones((4, 4))).to_fits(tmp_path / "a.fits")
    with pytest.raises(InputError, match="its light is not known by order"):
        of_image(read_fits(path), u=0.0, v=0.0, order=0)
    dark = dataclasses.replace(read_fits(path), data=np.zeros((4, 4)), unit="K")
    with pytest.raises(InputError, match="add up to 0, so there is no light"):
        of_image(dark, u=0.0, v=0.0)
    with pytest.raises(InputError, match="there is no such file"):
        visibility(tmp_path / "absent.h5", baseline="1 Glambda", position_angle="0 deg")


def test_what_does_not_fit_in_memory_is_refused_before_work_starts(monkeypatch, transforms):
    monkeypatch.setattr("ringwright.machine.memory_limit", lambda: 100_000)
    x, y, flux, u, v = some_light(7, 3000, 300)
    with pytest.raises(
        InputError, match=r"3000 samples on 300 baselines need about 0\.0 GiB.*shorter baselines"
    ):
        of_samples(x, y, flux, u=u, v=v)
    with pytest.raises(InputError, match=r"an image of 96 by 128 pixels need about.*fewer pixels"):
        of_image(sky_image(np.ones((128, 96))), u=0.0, v=0.0)
    assert transforms == {"nufft2d2": 0, "nufft2d3": 0}


def test_the_transforms_are_loaded_only_by_what_needs_them():
    code = (
        "import sys, ringwright.cli, ringwright.rendering, ringwright.visibilities as vis\n"
        "vis.of_samples([0.0], [0.0], [1.0], u=1e9, v=0.0)\n"
        "print('finufft' in sys.modules)"
    )
    run = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert run.stdout.strip() == "False"
    assert visibilities.THREADS == 1  # the same digits on one worker or many
