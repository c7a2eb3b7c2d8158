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

# Issue figures: relative error of the flux per order of a face-on disk.
AT_128, AT_512 = 1e-4, 1e-5
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


@pytest.mark.parametrize(("pixels", "tolerance"), [(128, AT_128), (512, AT_512)])
def test_flux_per_order_of_a_face_on_disk_agrees_with_quadrature(write_scene, quadrature, pixels, tolerance):
    image = rw.render(write_scene(inclination="0 deg", pixels=pixels, position_angle="20 deg"))
    share = quadrature / quadrature.sum()
    assert image.flux == pytest.approx(share, rel=1e-6)
    assert image.flux_in_field == pytest.approx(share, rel=tolerance)


@pytest.mark.parametrize("inclination", ["17 deg", "60 deg", "85 deg", "130 deg"])
def test_flux_does_not_depend_on_the_pixel_size(write_scene, inclination):
    coarse = rw.render(write_scene(inclination=inclination, pixels=40, field="110 M"))
    fine = rw.render(write_scene(inclination=inclination, pixels=400, field="110 M"))
    assert coarse.flux_in_field == pytest.approx(fine.flux_in_field, rel=2e-4)
    assert fine.flux_in_field == pytest.approx(fine.flux, rel=2e-5)


def test_a_pixel_holds_the_mean_over_its_area(write_scene):
    coarse = rw.render(write_scene(pixels=50)).total
    fine = rw.render(write_scene(pixels=250)).total
    summed = fine.reshape(50, 5, 50, 5).sum(axis=(1, 3))
    assert coarse == pytest.approx(summed, abs=AT_128 * float(coarse.max()))


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
    assert opaque.flux_in_field[1:] == pytest.approx(opaque.flux[1:], rel=1e-4)
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
