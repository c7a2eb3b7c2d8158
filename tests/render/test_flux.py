"""The light in the pixels is the light of the scene: fluxes against one-dimensional quadrature, areas against √27.

The oracle for a face-on disk integrates I(b) b db between the exact images of the disk's edges with SciPy's adaptive
quadrature, ray by ray; it shares no panel, series or pixel with the renderer. Lengths in M.
"""

from __future__ import annotations

import itertools
import math

import numpy as np
import pytest
from scipy.integrate import quad

import emission as em
import raytrace as rt
import ringwright as rw
from ringwright.errors import InputError
from ringwright.light import light_up
from ringwright.sampling import accuracy_note

# Flux per order, at any pixel size; neighbouring pixels agree on every side that they share, so that only the quadrature
# around the field is left.
FLUX = 1e-6
# What single pixels are good for, relative to the brightest.
PIXEL = 1e-4
EDGES = (2.6, 3.0, 4.0, 6.0, 10.0, 20.0, 40.0)


def face_on_flux(order: int) -> float:
    """2π ∫ I_n(b) b db of the default disk seen face-on, between the images of circles where I is smooth."""
    disk = em.ThinDisk(profile=em.PowerLaw(inner=2.6, outer=40.0, slope=3.7), flow=em.Circular())

    def intensity(b: float) -> float:
        hit = rt.trace(np.array([b]), np.array([0.0]), inclination=0.0, orders=order + 1).only(order)
        return float(em.shade(disk, hit)[0, 0, 0]) * b

    ends = [float(rt.isoradial(r, order=order, angle=0.0, inclination=0.0)) for r in EDGES]
    pieces = (quad(intensity, a, b, epsabs=0.0, epsrel=1e-8)[0] for a, b in itertools.pairwise(ends))
    return 2.0 * math.pi * sum(pieces)


@pytest.fixture(scope="module")
def quadrature() -> np.ndarray:
    return np.array([face_on_flux(order) for order in range(3)])


@pytest.mark.parametrize("pixels", [16, 128, 512])
def test_flux_per_order_of_a_face_on_disk_agrees_with_quadrature(write_scene, quadrature, pixels):
    image = rw.render(write_scene(inclination="0 deg", pixels=pixels, position_angle="20 deg"))
    share = quadrature / quadrature.sum()
    assert image.flux == pytest.approx(share, rel=FLUX)
    assert image.flux_in_field == pytest.approx(share, rel=FLUX)


def assert_pixels_hold_all_the_light(path):
    """Every order of a scene, shared among pixels of several sizes in a field that holds it all."""
    for lit in light_up(rw.load_scene(path), accuracy=1e-5):
        for side in (16, 41, 300):
            pixels = np.zeros((side, side))
            lit.add_to(pixels, 110.0 / side, math.radians(20.0))
            assert pixels.sum() == pytest.approx(lit.flux, rel=FLUX)


@pytest.mark.parametrize("inclination", ["0 deg", "17 deg", "60 deg", "85 deg", "130 deg"])
def test_pixels_of_any_size_hold_all_the_light_of_every_order(write_scene, inclination):
    assert_pixels_hold_all_the_light(write_scene(inclination=inclination, orders=4))


@pytest.mark.parametrize("inclination", ["17 deg", "60 deg", "80 deg"])
def test_pixels_of_any_size_hold_what_an_opaque_disk_leaves_visible(write_scene, inclination):
    # Two ways to the same flux: along the sides of pixels, and along arcs between the angles at which edges cross.
    opaque = OPAQUE.format(opaque="true")
    assert_pixels_hold_all_the_light(write_scene(inclination=inclination, emitters=opaque))


def test_a_field_that_cuts_the_light_holds_what_a_larger_one_holds_there(write_scene):
    whole = rw.render(write_scene(pixels=120, field="60 M"))
    middle = rw.render(write_scene(pixels=40, field="20 M"))
    assert middle.intensity / middle.flux.sum() == pytest.approx(
        whole.intensity[:, 40:80, 40:80] / whole.flux.sum(), abs=1e-12
    )


def test_a_thin_ring_is_even_and_no_pixel_holds_more_than_its_share(write_scene):
    # Face-on, order 2 is a ring of even brightness 0.04 M wide at 5.2 M: by sectors of 10° it must not flicker, and a pixel
    # holds no more than the longest arc within it, √2 of its side and a little for the curve.
    image = rw.render(write_scene(inclination="0 deg", pixels=150, field="30 M", orders=3))
    north, east, _ = image.axes
    ring = image.intensity[2]
    sector = ((np.degrees(np.arctan2(east, north[:, None])) % 360.0) // 10.0).astype(int)
    held = np.bincount(sector.ravel(), weights=ring.ravel(), minlength=36)
    # A pixel belongs to the sector of its centre, so a sector is right to one pixel in its arc of 0.9 M.
    assert held == pytest.approx(held.mean(), rel=2.0 * image.pixel_m / (5.2 * math.radians(10.0)))
    assert held.reshape(4, 9).sum(axis=1) == pytest.approx(held.sum() / 4.0, rel=1e-6)
    per_length = image.flux[2] / (2.0 * math.pi * 5.2)
    assert ring.max() <= per_length * math.sqrt(2.0) * image.pixel_m * 1.05
    lit = ring > 0.0
    radius = np.hypot(east, north[:, None])
    assert np.all(np.abs(radius[lit] - 5.2) < 0.75 * image.pixel_m + 0.05)


def test_a_pixel_holds_the_mean_over_its_area(write_scene):
    coarse = rw.render(write_scene(pixels=50)).total
    fine = rw.render(write_scene(pixels=250)).total
    summed = fine.reshape(50, 5, 50, 5).sum(axis=(1, 3))
    assert coarse == pytest.approx(summed, abs=PIXEL * float(coarse.max()))


def test_turning_the_sky_by_a_right_angle_turns_the_image(write_scene):
    image = rw.render(write_scene(position_angle="0 deg")).total
    turned = rw.render(write_scene(position_angle="90 deg")).total
    # North goes to east, and columns run from east to west: a turn counter-clockwise as seen on the page.
    assert turned == pytest.approx(np.rot90(image[::-1])[::-1], abs=1e-7 * float(image.max()))


def test_the_approaching_side_is_brightest_at_ninety_degrees_from_the_position_angle(write_scene):
    for inclination in ("20 deg", "160 deg"):
        image = rw.render(write_scene(inclination=inclination, position_angle="0 deg", pixels=101))
        north, east, _ = image.axes
        bright = np.unravel_index(np.argmax(image.intensity[0]), image.intensity[0].shape)
        assert east[bright[1]] > 0.0  # PA + 90° = east
        assert abs(north[bright[0]]) < abs(east[bright[1]])


def test_the_dark_disk_of_a_backdrop_has_the_radius_of_the_critical_curve(write_scene):
    # √27 GM/c²: Hilbert 1917; shadow edge in Narayan, Johnson & Gammie 2019 ApJL 885 L33, abstract (ABS).
    image = rw.render(
        write_scene(emitters='[[emitter]]\nkind = "backdrop"\n', field="16 M", pixels=161, orders=1)
    )
    bright = float(image.total.max())
    dark_area = float((1.0 - image.total / bright).sum()) * image.pixel_m**2
    assert math.sqrt(dark_area / math.pi) == pytest.approx(math.sqrt(27.0), rel=1e-5)


OPAQUE = """
[[emitter]]
kind = "thin-disk"
opaque = {opaque}
profile = {{ kind = "power-law", inner = "6 M", outer = "40 M", slope = 3.0 }}
flow = {{ kind = "circular" }}
"""


def test_an_opaque_disk_shows_its_first_crossing_only(write_scene):
    thin = rw.render(write_scene(emitters=OPAQUE.format(opaque="false")))
    opaque = rw.render(write_scene(emitters=OPAQUE.format(opaque="true"), name="opaque"))
    thin_light = thin.intensity[0] / thin.flux[0]
    assert opaque.intensity[0] / opaque.flux[0] == pytest.approx(thin_light, abs=1e-9)
    # Higher orders survive only inside the disk's inner edge or beyond its outer one.
    assert 0.0 < opaque.flux[1] / opaque.flux[0] < 0.9 * thin.flux[1] / thin.flux[0]
    assert opaque.flux_in_field[1:] == pytest.approx(opaque.flux[1:], rel=FLUX)
    # Ray by ray: where the direct image covers the second crossing, order 1 is dark.
    north, east, _ = opaque.axes
    hit = rt.trace(-east, np.full_like(east, north[30]), inclination=math.radians(30.0), orders=1)
    covered = (hit.radius[0] > 7.5) & (hit.radius[0] < 35.0)
    assert covered.sum() > 20
    assert np.all(opaque.intensity[1, 30, covered] == 0.0)


def test_light_outside_the_field_and_thin_orders_are_reported_with_the_figure(write_scene):
    image = rw.render(write_scene(field="20 M", pixels=20))
    assert any("% of the light of order 0 falls outside the field of 20 M" in note for note in image.notes)
    assert any("ring of order 2" in note and "of a pixel" in note for note in image.notes)
    assert rw.render(write_scene(pixels=400, field="100 M", orders=1)).notes == ()


def test_the_accuracy_asked_for_and_reached_is_kept(write_scene, tmp_path):
    rough = rw.render(write_scene(inclination="60 deg"), accuracy=1e-3)
    fine = rw.render(write_scene(inclination="60 deg"), accuracy=1e-8)
    assert np.all(rough.interpolation_error > 10.0 * fine.interpolation_error)
    assert np.all(fine.interpolation_error < 3e-8)
    # What was told for the rough one bounds how far its brightest pixel is off.
    assert rough.total == pytest.approx(
        fine.total, abs=float(rough.interpolation_error.max() * fine.total.max())
    )
    again = rw.Image.open(fine.save(tmp_path / "fine.h5"))
    assert again.accuracy == 1e-8
    assert again.interpolation_error == pytest.approx(fine.interpolation_error)
    assert again.summary()["accuracy_asked"] == 1e-8


def test_an_accuracy_that_is_not_reached_is_said_with_the_figure():
    assert accuracy_note([1e-6, 2.9e-5], 1e-5) == ()
    (note,) = accuracy_note([1e-6, 0.4], 1e-5)
    assert note == "brightness is interpolated to 0.4 of its maximum, not to the 1e-05 asked for"


def test_an_image_within_a_tenth_of_a_degree_of_edge_on_carries_that_note(write_scene):
    image = rw.render(write_scene(inclination="89.98 deg", orders=1))
    assert any("not to the 1e-05 asked for" in note for note in image.notes)


def test_a_product_without_the_accuracy_still_opens(write_scene, tmp_path):
    import h5py

    path = rw.render(write_scene()).save(tmp_path / "old.h5")
    with h5py.File(path, "r+") as file:
        del file["interpolation_error"]
        del file["intensity"].attrs["accuracy_asked"]
    old = rw.Image.open(path)
    assert old.accuracy is None
    assert old.interpolation_error is None
    assert old.save(tmp_path / "new.h5").is_file()


@pytest.mark.parametrize("accuracy", [0.0, 1e-13, 0.2, math.nan])
def test_an_accuracy_that_is_none_is_refused(write_scene, accuracy):
    with pytest.raises(InputError, match=r"not a relative error from 1e-12 to 0\.1"):
        rw.render(write_scene(), accuracy=accuracy)


def test_no_valid_scene_gives_nan_or_negative_light(write_scene):
    for inclination in ("0 deg", "90 deg", "89.9 deg", "180 deg"):
        image = rw.render(write_scene(inclination=inclination, pixels=48), maps=True)
        assert np.isfinite(image.intensity).all()
        assert (image.intensity >= 0.0).all()


def test_maps_hold_the_crossings_of_the_pixel_centres(write_scene):
    image = rw.render(write_scene(inclination="0 deg", pixels=33, field="40 M"), maps=True)
    north, east, _ = image.axes
    b = float(np.hypot(north[20], east[25]))
    radius = image.maps["crossing_radius"][0, 20, 25]
    assert float(rt.isoradial(radius, order=0, angle=0.3, inclination=0.0)) == pytest.approx(b, rel=1e-10)
    # Face-on circular orbit: g = √(1 − 3/r) (0.70710678 at r = 6, from energy and angular velocity).
    if radius > 6.0:
        expected = math.sqrt(1.0 - 3.0 / radius)
        assert image.maps["redshift_factor"][0, 20, 25] == pytest.approx(expected, rel=1e-10)
