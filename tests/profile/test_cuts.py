"""Cuts at their corners: jumps at the edges of the light and behind something opaque, and what has no cut.

The oracle is a ray traced beside each corner. Lengths in M.
"""

from __future__ import annotations

import math

import numpy as np
import pytest

import emission as em
import raytrace as rt
import ringwright as rw
from ringwright.errors import InputError
from ringwright.profiling.cuts import radial_cut
from ringwright.sampling import sample_light

DISK = """
[[emitter]]
kind = "thin-disk"
opaque = {opaque}
profile = {{ kind = "power-law", inner = "{inner} M", outer = "{outer} M", slope = 3.0 }}
flow = {{ kind = "circular" }}
"""
# A step off a corner that rays are traced at, far below the scale on which brightness changes there.
BESIDE = 1e-7


def disk(inner, outer, opaque=False):
    return DISK.format(inner=inner, outer=outer, opaque=str(opaque).lower())


@pytest.fixture
def cut_of(write_scene):
    """The scene that some disks make and its cut along a screen angle."""

    def made(*disks, angle, inclination=50.0, orders=3):
        path = write_scene(inclination=f"{inclination} deg", orders=orders, emitters="".join(disks))
        scene = rw.load_scene(path)
        return scene, radial_cut(sample_light(scene, accuracy=1e-8), angle=angle, orders=orders)

    return made


def traced(scene, distance, angle):
    """Brightness per order along a screen angle, ray by ray, were nothing opaque; shape (orders, n)."""
    b = np.asarray(distance)
    hit = rt.trace(
        b * math.cos(angle), b * math.sin(angle), inclination=scene.inclination, orders=scene.orders
    )
    return sum(strength * em.shade(emitter, hit)[0] for strength, emitter in scene.emitters)


def test_the_light_begins_and_ends_with_a_jump_from_and_to_nothing(cut_of):
    scene, cut = cut_of(disk(2.6, 20.0), angle=0.3)
    ends = rt.isoradial(np.array([2.6, 20.0]), order=0, angle=0.3, inclination=scene.inclination)
    first, last = cut.distance[[0, -1]]
    assert cut.distance[[1, -2]] == pytest.approx([first, last], abs=0.0)
    assert [first, last] == pytest.approx(ends, rel=1e-9)
    assert cut.intensity[:, [0, -1]] == pytest.approx(0.0, abs=0.0)
    inside = traced(scene, [first + BESIDE, last - BESIDE], 0.3)[0]
    assert cut.intensity[0, [1, -2]] == pytest.approx(inside, rel=1e-5)


@pytest.mark.parametrize("angle", [0.2, 1.3, -2.0])
def test_every_jump_is_drawn_at_one_distance_with_what_rays_see_to_either_side(cut_of, angle):
    # Disks with a sharp edge at 9 M within the other's light; both sides of every corner, every order.
    scene, cut = cut_of(disk(2.6, 20.0), disk(9.0, 12.0), angle=angle)
    left = np.flatnonzero(np.diff(cut.distance) == 0.0)
    bright = cut.intensity.max()
    for order in range(3):
        for radius in (9.0, 12.0):
            edge = rt.isoradial(radius, order=order, angle=angle, inclination=scene.inclination)
            at = left[np.argmin(np.abs(cut.distance[left] - edge))]
            step = 1e-6 * (cut.distance[at + 2] - edge)
            seen = traced(scene, [edge - step, edge + step], angle)[order]
            assert cut.distance[at] == pytest.approx(edge, rel=1e-9)
            assert cut.intensity[order, [at, at + 1]] == pytest.approx(seen, rel=1e-5, abs=1e-7 * bright)
            assert abs(np.diff(seen)[0]) > 1e-3 * seen.max()


def test_distances_ascend_and_light_is_never_negative(cut_of):
    for inclination in (0.0, 50.0, 85.0):
        _, cut = cut_of(disk(2.6, 20.0), disk(4.0, 7.0), angle=1.0, inclination=inclination)
        assert np.all(np.diff(cut.distance) >= 0.0)
        assert np.all(cut.intensity >= 0.0)
        assert np.isfinite(cut.intensity).all()


def test_light_behind_an_opaque_disk_ends_where_the_front_begins(write_scene):
    # Toward the near side order 1 comes to lie across the inner edge of the direct image: bright before it, dark behind.
    scene = rw.load_scene(write_scene(inclination="75 deg", orders=2, emitters=disk(6.0, 15.0, opaque=True)))
    light = sample_light(scene, accuracy=1e-8)

    def image(radius, order, angle):
        return rt.isoradial(radius, order=order, angle=angle, inclination=scene.inclination)

    angles = -np.linspace(0.05, 1.5, 100)
    inner, front, outer = image(6.0, 1, angles), image(6.0, 0, angles), image(15.0, 1, angles)
    across = np.flatnonzero((inner + 0.02 < front) & (front < outer - 0.02))
    assert across.size > 0
    for angle, edge in zip(angles[across], front[across], strict=True):
        cut = radial_cut(light, angle=float(angle), orders=2)
        at = np.flatnonzero((np.diff(cut.distance) == 0.0) & (np.abs(cut.distance[1:] - edge) < 1e-7))[-1]
        inside = traced(scene, [edge - BESIDE], angle)[1, 0]
        assert cut.intensity[1, at] == pytest.approx(inside, rel=1e-5)
        assert np.all(cut.intensity[1, at + 1 :] == 0.0)


def test_light_from_infinity_has_no_cut(write_scene):
    scene = rw.load_scene(write_scene(emitters='[[emitter]]\nkind = "backdrop"\n', orders=1))
    with pytest.raises(InputError, match="fills whatever field is drawn and has no profile of its own"):
        radial_cut(sample_light(scene, accuracy=1e-3), angle=0.0, orders=1)
