"""`rt.screen`: areas of bands, panels on the images of the edges, and an error estimate that is honest."""

from __future__ import annotations

import math

import numpy as np
import pytest

import raytrace as rt


def test_face_on_bands_have_the_published_widths():
    # Widths of the bands of a full disk, r from the horizon to infinity, and their ratios (computed independently):
    # n = 1: 1.152431, n = 2: 0.0401304. Here the outer edge is finite, so the area is compared with the edges' images.
    found = rt.screen(inclination=0.0, edges=(2.0, 50.0), orders=4)
    for order, band in enumerate(found.bands):
        inner, outer = (rt.isoradial(r, order=order, angle=0.0, inclination=0.0) for r in (2.0, 50.0))
        assert band.weight.sum() == pytest.approx(math.pi * (outer**2 - inner**2), rel=1e-9)


def test_panel_edges_lie_on_the_images_of_the_emitters_edges():
    found = rt.screen(inclination=0.7, edges=(2.6, 6.0, 40.0), orders=2)
    for band in found.bands:
        assert {2.6, 6.0, 40.0, 3.0} <= set(band.radii)
        at = band.radii.tolist().index(6.0)
        image = rt.isoradial(6.0, order=band.order, angle=band.angles, inclination=0.7)
        assert band.edges[at] == pytest.approx(image, rel=1e-14)


@pytest.mark.parametrize("inclination", [0.0, 0.5, 1.3])
def test_the_error_estimate_bounds_the_true_error(inclination):
    def flux(found: rt.Screen, order: int) -> float:
        mine = found.order == order
        hit = rt.trace(found.alpha[mine], found.beta[mine], inclination=inclination, orders=order + 1)
        return float(np.sum(found.weight[mine] * hit.radius[order] ** -3.0))

    rough = rt.screen(inclination=inclination, edges=(2.6, 40.0), tolerance=1e-3)
    exact = rt.screen(inclination=inclination, edges=(2.6, 40.0), tolerance=1e-10)
    for order in range(3):
        error = abs(flux(rough, order) / flux(exact, order) - 1.0)
        assert error <= rough.error[order] + 1e-11


def test_what_makes_no_sense_is_refused():
    with pytest.raises(ValueError, match="inside the horizon at 2 M"):
        rt.screen(inclination=0.3, edges=(1.5, 10.0))
    with pytest.raises(ValueError, match="ascend"):
        rt.screen(inclination=0.3, edges=(10.0, 3.0))
    with pytest.raises(ValueError, match="count of images"):
        rt.screen(inclination=0.3, edges=(3.0, 10.0), orders=0)
    with pytest.raises(ValueError, match="relative error"):
        rt.screen(inclination=0.3, edges=(3.0, 10.0), tolerance=0.0)
    with pytest.raises(ValueError, match="outside 0 to π"):
        rt.screen(inclination=4.0, edges=(3.0, 10.0))
    with pytest.raises(ValueError, match="inside the horizon"):
        rt.isoradial(1.0, order=0, angle=0.0, inclination=0.3)
    with pytest.raises(ValueError, match="whole number"):
        rt.isoradial(6.0, order=-1, angle=0.0, inclination=0.3)
