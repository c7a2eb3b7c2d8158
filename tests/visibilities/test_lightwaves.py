"""Visibilities straight from the screen, against integrals and transforms that share none of its panels.

Face-on, V(u) = 2π ∫ I(b) J₀(2πub) b db between the exact images of the disk's edges, by SciPy's adaptive quadrature on
rays traced one by one. Inclined, where no one-dimensional form exists: samples of another layout summed by the fast
transform, other panels, and fewer terms. θ_g = 3.8 µas, so that 1 M on the screen is 18.4 prad and the critical curve's
fringe 5.22 Gλ.
"""

from __future__ import annotations

import itertools
import math

import numpy as np
import pytest
from scipy.integrate import quad_vec
from scipy.special import j0, spherical_jn

import emission as em
import raytrace as rt
import ringwright as rw
from raytrace import panels
from ringwright.errors import InputError
from ringwright.kernels.fourier import bessel_sums
from ringwright.lightwaves import interpolation_error, visibility
from ringwright.sampling import sample_light
from ringwright.visibilities import of_samples

THETA_G = 3.8e-6 / 206264.80624709636  # rad
FRINGE = 1.0 / (2.0 * math.sqrt(27.0) * THETA_G)
# Radii between which brightness is smooth enough for adaptive quadrature, dense inside the stable orbit's corner.
SMOOTH_BETWEEN = (3.0, 4.0, 5.9, 6.0, 10.0, 20.0)
TO_400 = np.array([0.0, 3.0, 40.0, 122.0, 250.0, 400.0]) * 1e9


class Counted(rt.Schwarzschild):
    """A Schwarzschild hole that counts the rays traced through it."""

    rays = 0

    def trace_rays(self, alpha, *rest):
        type(self).rays += alpha.size
        return super().trace_rays(alpha, *rest)


@pytest.fixture
def disk_scene(write_scene):
    """A scene of one power-law disk."""

    def made(inclination="0 deg", outer=10.0, edge_width=0.0, orders=3, inner=2.6, more=""):
        emitter = (
            f'[[emitter]]\nkind = "thin-disk"\n{more}\nprofile = {{ kind = "power-law", inner = "{inner} M", '
            f'outer = "{outer} M", slope = 3.0, edge_width = "{edge_width} M" }}\nflow = {{ kind = "circular" }}\n'
        )
        return rw.load_scene(write_scene(inclination=inclination, emitters=emitter, orders=orders))

    return made


def wavenumbers(baseline):
    return math.tau * THETA_G * np.asarray(baseline)


def seen(light, baseline, turn=0.0):
    k = wavenumbers(baseline)
    return sum(visibility(part, wavenumber=k, turn=np.full_like(k, turn)) for part in light)


def envelope(light, baseline, fringes=1):
    """Largest |V| within one or some fringes to either side."""
    around = np.asarray(baseline)[:, None] + np.linspace(-fringes, fringes, 256 * fringes + 1) * FRINGE
    values = np.abs(seen(light, np.abs(around).ravel())).reshape(around.shape)
    return values.max(axis=1)


def by_quadrature(scene, baseline):
    """2π ∫ I J₀ b db over every order, adaptively, between the exact edges."""
    disk = scene.emitters[0][1]
    radii = sorted({*disk.edges, *(r for r in SMOOTH_BETWEEN if disk.edges[0] < r < disk.edges[-1])})
    k = wavenumbers(baseline)

    def integrand(order):
        def value(b):
            hit = rt.trace(np.array([b]), np.array([0.0]), inclination=0.0, orders=order + 1).only(order)
            return float(em.shade(disk, hit)[0, 0, 0]) * b * j0(k * b)

        return value

    total = np.zeros_like(k)
    for order in range(scene.orders):
        ends = [float(rt.isoradial(r, order=order, angle=0.1, inclination=0.0)) for r in radii]
        for low, high in itertools.pairwise(ends):
            total += quad_vec(integrand(order), low, high, epsabs=1e-13, epsrel=1e-9, limit=20000)[0]
    return math.tau * total


@pytest.mark.parametrize(("outer", "edge_width"), [(10.0, 0.0), (10.0, 1.0), (50.0, 0.0), (50.0, 1.0)])
def test_a_face_on_disk_agrees_with_quadrature_up_to_400_gigalambda(disk_scene, outer, edge_width):
    scene = disk_scene(outer=outer, edge_width=edge_width)
    object.__setattr__(scene, "spacetime", Counted())
    Counted.rays = 0
    light = sample_light(scene, accuracy=1e-5)
    assert Counted.rays <= 20_000  # 1e5 are allowed for 1e-3
    exact, local = by_quadrature(scene, TO_400), envelope(light, TO_400)
    assert np.max(np.abs(seen(light, TO_400) - exact) / local) < 1e-6
    told = sum(
        interpolation_error(part, wavenumber=wavenumbers(TO_400), turn=np.zeros(TO_400.size))
        for part in light
    )
    assert np.all(np.abs(seen(light, TO_400) - exact) <= told + 1e-9 * local)
    fine = sample_light(scene, accuracy=1e-7)
    assert np.max(np.abs(seen(fine, TO_400) - exact) / local) < 1e-8


@pytest.mark.parametrize("inclination", ["17 deg", "60 deg", "80 deg"])
def test_one_by_one_and_all_at_once_agree(disk_scene, inclination):
    light = sample_light(disk_scene(inclination, outer=30.0), accuracy=1e-6)
    many = np.linspace(0.0, 300e9, 700)
    few = slice(0, None, 70)
    for part in light:
        together = seen([part], many, turn=0.4)
        alone = np.concatenate(
            [seen([part], many[index : index + 1], turn=0.4) for index in range(0, 700, 70)]
        )
        assert together[few] == pytest.approx(alone, abs=1e-12 * part.series.flux())


@pytest.mark.parametrize("inclination", [0.3, 1.1, 1.4])
def test_an_inclined_disk_agrees_with_a_sum_over_samples_of_another_layout(disk_scene, inclination):
    scene = disk_scene(f"{math.degrees(inclination)} deg", outer=12.0)
    screen = rt.screen(inclination=inclination, edges=(2.6, 2.9, 4.4, 6.0, 7.7, 12.0), tolerance=1e-9)
    disk = scene.emitters[0][1]
    flux = np.zeros(screen.alpha.size)
    for order in range(3):
        mine = screen.order == order
        hit = rt.trace(screen.alpha[mine], screen.beta[mine], inclination=inclination, orders=order + 1)
        flux[mine] = screen.weight[mine] * em.shade(disk, hit.only(order))[0, 0]
    # As far as the screen's own samples carry the phase around it.
    longest = 0.35 * min(len(band.angles) for band in screen.bands) / (math.tau * THETA_G * 15.0)
    baseline, turn = np.linspace(0.0, longest, 41), 0.7
    k = wavenumbers(baseline) / math.tau
    summed = of_samples(
        screen.alpha, screen.beta, flux, u=k * math.sin(turn), v=k * math.cos(turn), accuracy=1e-10
    )
    light = sample_light(scene, accuracy=1e-8)
    assert seen(light, baseline, turn) == pytest.approx(summed, abs=1e-7 * flux.sum())


@pytest.mark.parametrize("inclination", ["35 deg", "75 deg"])
def test_two_layouts_of_panels_agree_to_the_accuracy_asked_for(disk_scene, monkeypatch, inclination):
    scene, baseline = disk_scene(inclination, outer=20.0), np.linspace(0.0, 400e9, 101)
    for accuracy in (1e-4, 1e-6):
        one = sample_light(scene, accuracy=accuracy)
        with monkeypatch.context() as other:
            other.setattr(panels, "PANEL_RATIO", 1.37)
            two = sample_light(scene, accuracy=accuracy)
        assert two[0].series.coefficients.shape != one[0].series.coefficients.shape
        local = envelope(one, baseline)
        assert np.max(np.abs(seen(one, baseline) - seen(two, baseline)) / local) < 10.0 * accuracy
        flux = sum(part.series.flux() for part in one)
        assert np.max(np.abs(seen(one, baseline) - seen(two, baseline))) < accuracy * flux


def test_the_error_told_bounds_what_finer_sampling_changes(disk_scene):
    scene, baseline = disk_scene("70 deg", outer=20.0), np.linspace(0.0, 400e9, 101)
    k = wavenumbers(baseline)
    rough, fine = (sample_light(scene, accuracy=accuracy) for accuracy in (1e-3, 1e-8))
    for part, better in zip(rough, fine, strict=True):
        told = interpolation_error(part, wavenumber=k, turn=np.zeros_like(k))
        true = np.abs(seen([part], baseline) - seen([better], baseline))
        assert np.all(true <= told)


def test_the_sky_turns_with_the_source_and_the_reverse_baseline_is_the_conjugate(disk_scene):
    light = sample_light(disk_scene("50 deg"), accuracy=1e-6)
    baseline = np.linspace(0.0, 100e9, 21)
    # The scene's position angle enters as the turn alone; a further whole turn changes nothing.
    assert seen(light, baseline, 0.3 + math.tau) == pytest.approx(seen(light, baseline, 0.3), rel=1e-9)
    assert seen(light, baseline, 0.3 + math.pi) == pytest.approx(
        np.conj(seen(light, baseline, 0.3)), abs=1e-11
    )
    flux = sum(part.series.flux() for part in light)
    assert seen(light, baseline)[0] == pytest.approx(flux, rel=1e-12)


def test_the_axis_of_symmetry_makes_static_light_real_across_it(write_scene):
    static = (
        '[[emitter]]\nkind = "thin-disk"\nprofile = { kind = "power-law", inner = "4 M", outer = "12 M", slope = 2.0 }\n'
        'flow = { kind = "static" }\n'
    )
    light = sample_light(rw.load_scene(write_scene(inclination="60 deg", emitters=static)), accuracy=1e-6)
    # Baselines along α: the image of a static disk is even in α, and brighter for β on one side.
    along_alpha = seen(light, np.linspace(0.0, 60e9, 13), turn=math.pi / 2.0)
    along_beta = seen(light, np.linspace(0.0, 60e9, 13), turn=0.0)
    flux = along_alpha[0].real
    assert np.max(np.abs(along_alpha.imag)) < 1e-10 * flux
    assert np.max(np.abs(along_beta.imag)) > 1e-2 * flux


RING = """
[[emitter]]
kind = "thin-disk"
profile = {{ kind = "gaussian-ring", radius = "6 M", width = "{width} M" }}
flow = {{ kind = "static" }}
"""


def test_a_thin_ring_has_the_nulls_and_extrema_of_j0(write_scene):
    # Nulls of J₀(πdu) at 0.765480, 1.757095, 2.754567 /d, extrema −0.402759 at 1.219670 /d and +0.300116 at
    # 2.233131 /d: any table of Bessel functions (computed independently); used for rings by Johnson et al. 2020.
    scene = rw.load_scene(write_scene(inclination="0 deg", emitters=RING.format(width=0.01)))
    light = [part for part in sample_light(scene, accuracy=1e-6) if part.order == 1]
    diameter = 2.0 * float(rt.isoradial(6.0, order=1, angle=0.0, inclination=0.0)) * THETA_G
    flux = light[0].series.flux()
    for null in (0.765480, 1.757095, 2.754567):
        assert seen(light, [null / diameter])[0].real / flux == pytest.approx(0.0, abs=3e-6)
    for place, value in ((1.219670, -0.402759), (2.233131, 0.300116)):
        assert seen(light, [place / diameter])[0].real / flux == pytest.approx(value, abs=3e-6)


def test_envelopes_fall_as_a_thin_ring_and_as_a_sharp_edge_do(write_scene, disk_scene):
    # u^−½ of a thin ring (Johnson et al. 2020, Sci. Adv. 6, eaaz1310) and u^−3/2 of a jump in brightness (the
    # asymptotic Hankel transform of a step; common practice).
    ring = rw.load_scene(write_scene(inclination="0 deg", emitters=RING.format(width=0.01), name="ring"))
    thin = [part for part in sample_light(ring, accuracy=1e-6) if part.order == 2]
    near, far = envelope(thin, np.array([50e9, 200e9]))
    assert far / near == pytest.approx(4.0**-0.5, rel=0.02)
    sharp = sample_light(disk_scene(outer=10.0, inner=6.0, orders=1), accuracy=1e-7)
    near, far = envelope(sharp, np.array([500e9, 2000e9]), fringes=4)  # its two edges beat
    assert far / near == pytest.approx(4.0**-1.5, rel=0.05)


def test_an_opaque_disk_has_the_visibility_of_what_it_leaves_visible(disk_scene):
    for inclination in ("0 deg", "30 deg", "70 deg"):
        scene = disk_scene(inclination, inner=6.0, outer=15.0, more="opaque = true").replace(
            "view.pixels", 512
        )
        light = sample_light(scene, accuracy=1e-6)
        image = rw.render(scene.replace("view.field", "50 M"))
        flux = np.array([seen([part], [0.0])[0].real for part in light])
        assert flux / flux.sum() == pytest.approx(image.flux, abs=3e-7)
        # On a short baseline pixels are good to the square of their phase.
        k, turn = 0.5, 0.3
        north, east, _ = image.axes
        phase = k * (east * math.sin(-turn) + north[:, None] * math.cos(-turn))
        pixels = np.sum(image.total * np.exp(-1j * phase))
        whole = (
            sum(visibility(part, wavenumber=np.array([k]), turn=np.array([turn]))[0] for part in light)
            / flux.sum()
        )
        assert whole == pytest.approx(pixels, abs=5e-5)


def test_a_backdrop_is_refused(write_scene):
    scene = rw.load_scene(write_scene(emitters='[[emitter]]\nkind = "backdrop"\n', orders=1))
    with pytest.raises(InputError, match="leave the backdrop out"):
        seen(sample_light(scene, accuracy=1e-4), [1e9])


@pytest.mark.parametrize("omega", [0.0, 1e-5, 9e-4, 2e-3, 0.3, 4.0, 11.9, 13.1, 24.9, 60.0, 900.0])
@pytest.mark.parametrize("count", [1, 2, 13, 49])
def test_spherical_bessel_sums_agree_with_scipy(omega, count):
    # scipy.special.spherical_jn (NIST DLMF 10.47): the kernel's three recurrences against it.
    for order in range(count):
        row = np.zeros(49)
        row[order] = 1.0
        assert sum(bessel_sums(omega, row, count)) == pytest.approx(spherical_jn(order, omega), abs=5e-12)
