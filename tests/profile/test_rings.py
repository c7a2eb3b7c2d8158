"""The table of rings and the cuts: published limits of a full disk, rays traced one by one, closed forms of thin rings.

CHK marks values computed independently of this project with arbitrary-precision arithmetic. Lengths in M.
"""

from __future__ import annotations

import itertools
import math
from dataclasses import replace

import numpy as np
import pytest
from scipy.integrate import quad

import emission as em
import raytrace as rt
import ringwright as rw
from ringwright.errors import InputError
from ringwright.profiling.cuts import radial_cut
from ringwright.profiling.rings import LIMIT_DELAY, LIMIT_RATIO, ring_table
from ringwright.sampling import sample_light

DISK = """
[[emitter]]
kind = "thin-disk"
{more}
profile = {{ kind = "power-law", inner = "{inner} M", outer = "{outer} M", slope = {slope}, edge_width = "{edge} M" }}
flow = {{ kind = "{flow}" }}
"""
RING = """
[[emitter]]
kind = "thin-disk"
profile = {{ kind = "gaussian-ring", radius = "6 M", width = "{width} M" }}
flow = {{ kind = "static" }}
"""


@pytest.fixture
def scene_of(write_scene):
    """A scene of one disk."""

    def made(inclination=0.0, orders=3, position_angle=0.0, name="disk", text=None, **changes):
        disk = {
            "inner": 2.6,
            "outer": 20.0,
            "slope": 3.0,
            "edge": 0.0,
            "flow": "circular",
            "more": "",
            **changes,
        }
        return rw.load_scene(
            write_scene(
                name=name,
                inclination=f"{inclination} deg",
                position_angle=f"{position_angle} deg",
                orders=orders,
                emitters=text or DISK.format(**disk),
            )
        )

    return made


def table(scene, count=16, accuracy=1e-7, **more):
    return ring_table(scene, sample_light(scene, accuracy=accuracy), count=count, **more)


def test_bands_of_a_full_disk_have_the_published_widths_and_ratios(scene_of):
    # CHK, face-on, r from 2 to ∞: 1.152431, 0.0401304, 0.00171519; ratios 28.717, 23.397.
    found = table(scene_of(orders=4, inner=2.0, slope=3.0, edge=0.5))
    width = found.band_width[:, 0]
    assert width[0] == math.inf
    assert width[1:] == pytest.approx([1.152431, 0.0401304, 0.00171519], rel=4e-6)
    assert width[1] / width[2] == pytest.approx(28.717, abs=6e-4)
    assert width[2] / width[3] == pytest.approx(23.397, abs=6e-4)


def test_delays_of_the_circle_at_six_face_on(scene_of):
    # CHK: T1 − T0 = 20.3361, T2 − T1 = 16.5914, T3 − T2 = 16.3355; limit 3√3π = 16.32419 (Johnson et al. 2020).
    found = table(scene_of(orders=4), emitting_radius=6.0)
    assert found.delay[1:, 0] == pytest.approx([20.3361, 16.5914, 16.3355], abs=6e-5)
    assert pytest.approx(16.32419428, abs=5e-9) == LIMIT_DELAY
    assert found.delay[1:, 1] == pytest.approx(found.delay[1:, 2], rel=1e-9)
    assert np.isnan(found.delay[0]).all()


@pytest.mark.parametrize("inclination", [20.0, 75.0])
def test_every_order_is_turned_by_half_a_turn_after_the_one_before(scene_of, inclination):
    found = table(scene_of(inclination))
    assert found.rotation[1:] == pytest.approx(math.pi, abs=1e-9)


def test_high_orders_reach_their_limits(scene_of):
    # e^−π = 0.0432139183 of width and flux an order, in the limit (Johnson et al. 2020; CHK).
    found = table(scene_of(40.0, orders=6), accuracy=1e-8)
    assert pytest.approx(0.0432139183, abs=5e-11) == LIMIT_RATIO
    assert found.width_ratio[5] == pytest.approx(LIMIT_RATIO, rel=2e-4)
    assert found.flux_ratio[5] == pytest.approx(LIMIT_RATIO, rel=2e-4)
    assert abs(found.flux_ratio[1] / LIMIT_RATIO - 1.0) > 0.1


def test_a_thin_ring_of_gas_has_the_radius_and_the_width_of_its_image(scene_of):
    # Radii at r = 6 and db/dr there, n = 0, 1, 2: CHK. A narrow Gaussian of FWHM w appears with FWHM w·db/dr and
    # second moment w·db/dr / √(8 ln 2).
    width = 0.02
    found = table(scene_of(text=RING.format(width=width), orders=3))
    radii, slopes = (6.93214848, 5.47891372, 5.20798959), (1.0092948, 0.06563866, 0.002434655)
    for order, (radius, slope) in enumerate(zip(radii, slopes, strict=True)):
        assert found.peak[order] == pytest.approx(radius, abs=2e-4 * slope)
        assert found.mean[order] == pytest.approx(radius, abs=2e-4 * slope)
        assert found.fwhm[order] == pytest.approx(width * slope, rel=2e-4)
        assert found.width[order] == pytest.approx(width * slope / math.sqrt(8.0 * math.log(2.0)), rel=2e-4)
        assert found.peak_offset[order] == pytest.approx(radius - math.sqrt(27.0), abs=2e-4 * slope)


def test_strong_deflection_gives_the_radii_of_high_orders(scene_of):
    # b_n = √27 [1 + F e^{−(n+½)π}], F = 216 (2−√3)(√3−s)/(√3+s), s = √(1+6/r) (Bozza & Scarpetta 2007, form re-derived);
    # at r = 6 its error is 8e-6 for n = 2 (CHK) and smaller beyond.
    found = table(scene_of(text=RING.format(width=0.02), orders=5))
    s = math.sqrt(2.0)
    factor = 216.0 * (2.0 - math.sqrt(3.0)) * (math.sqrt(3.0) - s) / (math.sqrt(3.0) + s)
    for order, error in ((2, 1e-5), (3, 1e-6), (4, 1e-6)):
        expected = math.sqrt(27.0) * (1.0 + factor * math.exp(-(order + 0.5) * math.pi))
        assert found.mean[order, 0] == pytest.approx(expected, rel=error)


def test_a_narrow_annulus_is_as_wide_as_its_edges_are_apart(scene_of):
    # Second moment of a uniform bar: its length over √12.
    found = table(scene_of(inner=9.0, outer=9.02, slope=0.0, flow="static"))
    for order in range(3):
        ends = [float(rt.isoradial(r, order=order, angle=0.1, inclination=0.0)) for r in (9.0, 9.02)]
        assert found.fwhm[order] == pytest.approx(ends[1] - ends[0], rel=1e-6)
        assert found.width[order] == pytest.approx((ends[1] - ends[0]) / math.sqrt(12.0), rel=1e-4)


@pytest.mark.parametrize("inclination", [0.0, 50.0])
def test_half_maximum_may_lie_at_a_jump_within_the_light(scene_of, inclination):
    # A bright annulus on a faint disk of gas at rest: the light falls through half its maximum at the annulus' edges.
    changes = {"slope": 0.0, "edge": 0.0, "flow": "static"}
    text = DISK.format(inner=3.0, outer=20.0, more="strength = 0.1", **changes)
    text += DISK.format(inner=9.0, outer=12.0, more="", **changes)
    scene = scene_of(inclination, text=text)
    found = table(scene, count=8)
    angle = found.position_angle + 0.5 * math.pi
    for order in range(3):
        inner, outer = (
            rt.isoradial(r, order=order, angle=angle, inclination=scene.inclination) for r in (9.0, 12.0)
        )
        assert found.fwhm[order] == pytest.approx(outer - inner, rel=1e-7)


def test_flux_per_order_agrees_with_quadrature_of_rays(scene_of):
    scene = scene_of()
    disk = scene.emitters[0][1]
    found = table(scene)

    def shone(b, order):
        hit = rt.trace(np.array([b]), np.array([0.0]), inclination=0.0, orders=order + 1).only(order)
        return float(em.shade(disk, hit)[0, 0, 0]) * b

    for order in range(3):
        ends = [
            float(rt.isoradial(r, order=order, angle=0.1, inclination=0.0))
            for r in (2.6, 3.0, 4.0, 5.9, 6.0, 10.0, 20.0)
        ]
        pieces = (quad(shone, a, b, args=(order,), epsrel=1e-9)[0] for a, b in itertools.pairwise(ends))
        expected = math.tau * sum(pieces)
        assert found.flux[order] == pytest.approx(expected, rel=1e-7)
        assert found.angular_flux[order] == pytest.approx(expected / math.tau, rel=1e-7)
    assert found.fraction.sum() == pytest.approx(1.0)


@pytest.mark.parametrize(("inclination", "count"), [(35.0, 128), (80.0, 256)])
def test_fluxes_per_angle_add_up_to_the_flux_of_the_light(scene_of, inclination, count):
    scene = scene_of(inclination)
    light = sample_light(scene, accuracy=1e-7)
    found = ring_table(scene, light, count=count)
    # Both sum the same series without an error of their own.
    assert found.angular_flux.mean(axis=1) * math.tau == pytest.approx(found.flux, rel=1e-13)
    assert found.flux == pytest.approx([part.series.flux() for part in light], rel=1e-12)


# Seen askew a few angles do not hold the light; an opaque disk hides order 1 besides, behind edges that a sum over equally
# spaced angles finds to one step only.
@pytest.mark.parametrize(
    ("inclination", "more", "tolerance"), [(84.0, "", 1e-7), (60.0, "opaque = true", 2e-5)]
)
def test_fluxes_do_not_depend_on_how_many_position_angles_there_are(scene_of, inclination, more, tolerance):
    scene = scene_of(inclination, inner=6.0, more=more)
    light = sample_light(scene, accuracy=1e-6)
    few, many = (ring_table(scene, light, count=count) for count in (4, 4096))
    assert few.flux == pytest.approx(many.flux, rel=1e-12)
    assert many.angular_flux.mean(axis=1) * math.tau == pytest.approx(few.flux, rel=tolerance)
    assert abs(few.angular_flux[1].mean() * math.tau / few.flux[1] - 1.0) > 0.05


@pytest.mark.parametrize("inclination", [0.0, 70.0])
def test_a_disk_that_ends_at_the_circle_of_half_the_light_has_half_the_light(scene_of, inclination):
    whole = table(scene_of(inclination, orders=1), count=4)
    middle = whole.emitting_radius
    part = table(scene_of(inclination, orders=1, outer=f"{middle:.12f}", name="inside"), count=4)
    assert part.flux[0] == pytest.approx(0.5 * whole.flux[0], rel=1e-6)


@pytest.mark.parametrize("inclination", [0.0, 50.0])
def test_a_cut_shows_what_rays_see(scene_of, inclination):
    scene = scene_of(inclination)
    disk, angle = scene.emitters[0][1], 0.7
    cut = radial_cut(sample_light(scene, accuracy=1e-8), angle=angle, orders=3)
    corners = np.diff(cut.distance) == 0.0
    beside = np.concatenate([[True], corners]) | np.concatenate([corners, [True]])
    smooth = np.flatnonzero(~beside)
    b = cut.distance[smooth]
    hit = rt.trace(b * math.cos(angle), b * math.sin(angle), inclination=math.radians(inclination), orders=3)
    seen = em.shade(disk, hit)[0]
    assert cut.intensity[:, smooth] == pytest.approx(seen, abs=2e-7 * float(seen.max()))
    assert cut.total == pytest.approx(cut.intensity.sum(axis=0))
    # Every order has enough samples on its own band, however thin.
    assert np.all((cut.intensity > 0.0).sum(axis=1) > 100)


def test_a_sharp_edge_is_drawn_as_a_jump(scene_of):
    cut = radial_cut(sample_light(scene_of(), accuracy=1e-6), angle=0.3, orders=3)
    inner = float(rt.isoradial(2.6, order=0, angle=0.3, inclination=0.0))
    at = np.flatnonzero(np.abs(cut.distance - inner) < 1e-12)
    assert at.size == 2 or cut.distance[0] == pytest.approx(inner)
    assert cut.intensity[0, at[-1]] > 0.0


def test_turning_the_scene_turns_the_table_and_nothing_else(scene_of):
    plain = table(scene_of(50.0), count=24)
    turned = table(scene_of(50.0, position_angle=30.0, name="turned"), count=24)
    for name in ("peak", "mean", "width", "fwhm", "angular_flux", "band_inner", "mean_offset"):
        assert np.roll(getattr(plain, name), 2, axis=1) == pytest.approx(getattr(turned, name), rel=1e-7)
    assert turned.flux == pytest.approx(plain.flux, rel=1e-9)


def test_the_approaching_side_is_brighter_at_ninety_degrees_from_the_axis(scene_of):
    found = table(scene_of(50.0), count=4)
    north, east, south, west = found.angular_flux[0]
    assert east > 2.0 * west
    assert north != pytest.approx(south, rel=1e-2)


def test_an_opaque_disk_hides_an_order_or_leaves_it(scene_of):
    # Face-on, order 1 of a disk that begins inside lies within the direct image: hidden; of one that begins at 10 M its
    # image, at 5.67 to 5.9 M (CHK), lies in the hole of the direct one at 10.96 M: seen.
    hidden = table(scene_of(inner=2.6, outer=20.0, more="opaque = true"))
    assert hidden.flux[1:] == pytest.approx([0.0, 0.0], abs=1e-12 * hidden.flux[0])
    assert np.isnan(hidden.width[1:]).all()
    assert "order 1 carries no light: an opaque disk in front hides it" in hidden.notes
    seen = table(scene_of(inner=10.0, outer=20.0, more="opaque = true", name="open"))
    clear = table(scene_of(inner=10.0, outer=20.0, name="clear"))
    assert seen.flux[1] == pytest.approx(clear.flux[1], rel=1e-12)
    assert seen.notes == ()


def test_an_opaque_cut_is_dark_behind_the_direct_image(scene_of):
    scene = scene_of(70.0, inner=6.0, outer=15.0, more="opaque = true")
    light = sample_light(scene, accuracy=1e-7)
    for angle in (0.4, 2.0, -1.2):
        cut = radial_cut(light, angle=angle, orders=3)
        ends = [
            float(rt.isoradial(r, order=0, angle=angle, inclination=math.radians(70.0))) for r in (6.0, 15.0)
        ]
        covered = (cut.distance > ends[0] + 1e-6) & (cut.distance < ends[1] - 1e-6)
        assert np.all(cut.intensity[1:, covered] == 0.0)


def test_two_layouts_of_panels_give_the_same_table(scene_of, write_scene):
    split = DISK.format(inner=2.6, outer=20.0, slope=3.0, edge=0.0, flow="static", more="") + DISK.format(
        inner=4.4, outer=7.7, slope=3.0, edge=0.0, flow="static", more="strength = 1e-9"
    )
    one = table(scene_of(60.0, flow="static"))
    two = table(scene_of(60.0, text=split, name="split"))
    for name in ("peak", "mean", "width", "fwhm", "angular_flux"):
        assert getattr(two, name) == pytest.approx(getattr(one, name), rel=2e-6)


@pytest.mark.parametrize("position_angle", [0.0, 90.0])
def test_edge_on_rays_within_the_plane_are_left_out(scene_of, position_angle):
    # At 90° exactly the rays toward ±α run in the plane of the disk and have no crossing.
    found = table(scene_of(90.0, position_angle=position_angle), count=8, accuracy=1e-4)
    assert np.isfinite(found.delay[1:]).all()
    assert found.rotation[1:] == pytest.approx(math.pi, abs=1e-9)
    assert np.all(found.flux > 0.0)


def test_an_order_that_is_hidden_at_some_angles_says_at_how_many(scene_of):
    found = table(
        scene_of(70.0, inner=6.0, outer=15.0, orders=2, more="opaque = true"), count=32, accuracy=1e-4
    )
    dark = int(np.isnan(found.width[1]).sum())
    assert 0 < dark < 32
    assert np.all((found.angular_flux[1] == 0.0) == np.isnan(found.peak[1]))
    assert f"order 1 is hidden by an opaque disk in front at {dark} of 32 position angles" in found.notes


def test_an_order_in_which_nothing_shines_has_no_shape_and_says_so(scene_of):
    scene = scene_of(30.0)
    *light, last = sample_light(scene, accuracy=1e-4)
    dark = replace(last, series=replace(last.series, coefficients=0.0 * last.series.coefficients))
    found = ring_table(scene, [*light, dark], count=8)
    assert found.notes == ("order 2 carries no light: nothing of the emitter is seen in it",)
    assert np.isnan([found.peak[2], found.mean[2], found.width[2], found.fwhm[2]]).all()
    assert found.flux[2] == found.flux_ratio[2] == 0.0
    assert math.isnan(found.width_ratio[2])


def test_half_maximum_points_are_those_that_rays_find(scene_of):
    # Inclined, smooth edges: brightness traced ray by ray on a fine grid between the images of the disk's edges.
    scene, angle = scene_of(50.0, edge=1.5, inner=3.0), 0.5 * math.pi
    found = table(scene, count=8)
    for order in range(3):
        low, high = rt.isoradial(
            np.array([3.0, 20.0]), order=order, angle=angle, inclination=scene.inclination
        )
        b = np.linspace(low, high, 20001)
        hit = rt.trace(b * math.cos(angle), b * math.sin(angle), inclination=scene.inclination, orders=3)
        seen = em.shade(scene.emitters[0][1], hit)[0, order]
        above = b[seen >= 0.5 * seen.max()]
        step = b[1] - b[0]
        assert found.peak[order, 0] == pytest.approx(b[np.argmax(seen)], abs=step)
        assert found.fwhm[order, 0] == pytest.approx(above[-1] - above[0] + step, abs=1.01 * step)
        mean = np.sum(b * seen) / np.sum(seen)
        spread = math.sqrt(np.sum((b - mean) ** 2 * seen) / np.sum(seen))
        assert found.mean[order, 0] == pytest.approx(mean, abs=1e-5 * (high - low))
        assert found.width[order, 0] == pytest.approx(spread, rel=1e-5)


def test_light_from_infinity_has_no_table(write_scene):
    scene = rw.load_scene(write_scene(emitters='[[emitter]]\nkind = "backdrop"\n', orders=1))
    with pytest.raises(InputError, match="has no profile of its own"):
        table(scene)


def test_light_from_the_photon_orbit_itself_is_resolved_in_every_order(scene_of):
    # A narrow ring of gas on the photon orbit: its images crowd upon the critical curve; radii at r = 3, CHK.
    ring = RING.replace("6 M", "3 M").format(width=0.02)
    found = table(scene_of(text=ring, orders=4))
    for order, radius in enumerate((3.88426557, 5.18991324, 5.19614030, 5.19615240)):
        assert found.mean[order] == pytest.approx(radius, abs=0.02 * math.exp(-math.pi * order))
        assert np.all(found.width[order] > 0.0)
    assert np.all(found.flux > 0.0)


def test_a_disk_whose_direct_image_lies_within_the_band_of_order_1_keeps_both_apart(scene_of):
    # Face-on, r = 4.2 to 5 appears directly at 5.11 to 5.92 M, within what order 1 can reach, 5.015 to 6.168 M (CHK).
    scene = scene_of(inner=4.2, outer=5.0, flow="static")
    light = sample_light(scene, accuracy=1e-7)
    found = ring_table(scene, light, count=8)
    assert np.all((found.peak[0] > 5.015) & (found.peak[0] < 6.168))
    cut = radial_cut(light, angle=0.2, orders=3)
    both = (cut.intensity[0] > 0.0) & (cut.intensity[1] > 0.0)
    assert both.any()
    assert cut.total[both] == pytest.approx((cut.intensity[0] + cut.intensity[1] + cut.intensity[2])[both])
    assert found.flux == pytest.approx([part.series.flux() for part in light], rel=1e-12)
