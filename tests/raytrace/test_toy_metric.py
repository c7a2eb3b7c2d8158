"""The seam for other metrics: a toy spacetime from this file runs through the whole job, from a scene file to a ring.

The toy is a Schwarzschild hole seen through a lens that halves the screen: every ray behaves as the one at twice its screen position.
So its image must be half as large, which nothing in the pipeline knows.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
import pytest

import raytrace as rt
import ringwright as rw
from raytrace import registry


@dataclass(frozen=True)
class Halved(rt.Schwarzschild):
    """Rays of a Schwarzschild hole on a screen of half the size."""

    name = "halved"

    def critical_radius(self, inclination, angle):
        return 0.5 * super().critical_radius(inclination, angle)

    def trace_rays(self, alpha, beta, inclination, orders, azimuth, delay, momentum):
        return super().trace_rays(2.0 * alpha, 2.0 * beta, inclination, orders, azimuth, delay, momentum)


@pytest.fixture
def halved(monkeypatch):
    monkeypatch.setitem(registry.SPACETIMES, "halved", Halved)


def test_a_toy_metric_meets_the_contract():
    assert isinstance(Halved(), rt.Spacetime)
    assert not isinstance(object(), rt.Spacetime)


def test_isoradials_and_critical_curve_follow_the_metric():
    there = rt.isoradial(6.0, order=1, angle=0.4, inclination=0.5, spacetime=Halved())
    assert there == pytest.approx(0.5 * rt.isoradial(6.0, order=1, angle=0.4, inclination=0.5), rel=1e-12)
    curve = rt.critical_curve(inclination=0.5, angle=0.0, spacetime=Halved())
    assert curve == pytest.approx(0.5 * math.sqrt(27.0))


def test_a_scene_in_a_toy_metric_is_rendered_and_measured(halved, write_scene):
    toy = rw.render(write_scene(name="toy", hole='spacetime = "halved"', field="30 M", pixels=128))
    plain = rw.render(write_scene(name="plain", field="60 M", pixels=128))
    assert toy.total == pytest.approx(plain.total, abs=1e-6 * float(np.max(plain.total)))
    small = rw.measure(toy, resolution="2 M")
    large = rw.measure(plain, resolution="4 M")
    assert float(small.diameter.value) == pytest.approx(0.5 * float(large.diameter.value), rel=1e-6)


def test_an_unknown_spacetime_is_refused_with_the_known_ones(write_scene):
    with pytest.raises(
        rw.SceneError, match=r"spacetime 'schwarzchild' is not known; did you mean 'schwarzschild'\?"
    ):
        rw.load_scene(write_scene(hole='spacetime = "schwarzchild"'))
