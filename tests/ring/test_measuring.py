"""`rw.measure`: files and images in, physical units out; many files in one table; pictures."""

from __future__ import annotations

import json
import math
from types import SimpleNamespace

import numpy as np
import pytest
from astropy import units as u
from astropy.table import Table
from thin_ring import averaged_ring, exact_readings

import ringwright as rw
from ringwright.errors import InputError
from ringwright.figures.ring import picture
from ringwright.fits import write_fits
from ringwright.ring import measure_many
from ringwright.ring.measuring import ring_table
from ringwright.ring.wording import describe

PIXEL, DIAMETER, INNATE = 1.0, 44.0, 8.0
CENTRE = (3.0, -2.0)
RESOLUTION = math.sqrt(20.0**2 - INNATE**2)  # so that the ring is 20 µas thick in all


def ring_image(**options):
    image = averaged_ring(128, PIXEL, DIAMETER, INNATE, *CENTRE, parts=3, **options)
    return 0.6 * image / image.sum()


@pytest.fixture
def path(tmp_path):
    image = ring_image(asymmetry=0.2, orientation=math.radians(160.0))
    return write_fits(tmp_path / "ring.fits", image, PIXEL, 230e9, 10.0, 20.0, "invented")


def in_m(data):
    """An image in units of M as `rw.Image` offers it."""
    return SimpleNamespace(name="in M", total=data, pixel=u.Quantity(PIXEL), beam=None, notes=())


def test_a_fits_image_gives_the_exact_diameter_in_microarcseconds(tmp_path):
    path = write_fits(tmp_path / "x.fits", ring_image(), PIXEL, 230e9, 10.0, 20.0, "invented")
    ring = rw.measure(path, resolution=RESOLUTION * u.uas)
    exact = DIAMETER * exact_readings(20.0 / 44.0)[0]
    assert ring.diameter.to_value("uas") == pytest.approx(exact, rel=1e-3)
    assert ring.centre.to_value("uas") == pytest.approx(CENTRE, abs=0.01)
    assert ring.numerical_error < 0.001 * ring.diameter
    assert np.isnan(ring.orientation)  # an even ring points nowhere


def test_the_stated_numerical_error_covers_what_the_grid_does(tmp_path):
    """Honesty: over shifts of the ring within a pixel the diameter moves by a few stated errors at most."""
    rings = []
    for shift in (0.0, 0.21, 0.43, 0.67):
        image = averaged_ring(128, PIXEL, DIAMETER, INNATE, shift, 0.3 * shift, parts=3)
        rings.append(rw.measure(in_m(image), resolution="18 M"))
    exact = DIAMETER * exact_readings(math.hypot(18.0, INNATE) / 44.0)[0]
    worst = max(abs(float(ring.diameter) - exact) for ring in rings)
    assert worst < 5.0 * max(float(ring.numerical_error) for ring in rings)


def test_json_has_a_value_and_a_unit_for_every_quantity(path):
    shown = json.loads(json.dumps(rw.measure(path, resolution="20 uas").to_json(), allow_nan=False))
    assert shown["outcome"] == "RING"
    assert set(shown["diameter"]) == {"value", "unit", "scatter", "numerical_error"}
    assert shown["diameter"]["unit"] == "uas"
    assert shown["orientation"] == {"value": pytest.approx(160.0, abs=1.0), "unit": "deg"}
    for key in ("centre", "width", "asymmetry", "central_brightness", "resolution"):
        assert set(shown[key]) == {"value", "unit"}
    assert shown["estimator"] == "peak-ring"


def test_no_ring_is_an_answer_with_a_reason(path):
    shown = rw.measure(path, resolution="60 uas").to_json()
    assert shown["diameter"]["value"] is None
    assert shown["outcome"] == "NO_RING"
    assert "no ring at this resolution" in shown["reason"]
    assert rw.measure(path, resolution="2 uas").outcome is rw.RingOutcome.TOO_COARSE


def test_a_centre_that_is_given_is_kept(path):
    ring = rw.measure(path, resolution="20 uas", centre=("4 uas", "-2 uas"))
    assert ring.centre.to_value("uas") == pytest.approx((4.0, -2.0))
    assert ring.scatter > rw.measure(path, resolution="20 uas").scatter


def test_published_lengths_are_named_in_the_answer(path):
    ring = rw.measure(path, resolution="20 uas", lengths="published")
    assert ring.estimator == "peak-ring, published lengths"
    relative = rw.measure(path, resolution="20 uas")
    assert ring.diameter.value == pytest.approx(relative.diameter.value, rel=1e-4)


def test_an_image_in_m_is_measured_in_m():
    ring = rw.measure(in_m(ring_image()), resolution="20 M")
    assert ring.to_json()["diameter"]["unit"] == "M"


@pytest.mark.parametrize(
    ("options", "sentence"),
    [
        ({"resolution": "20"}, "does not fit this image; give an angle such as '20 uas'"),
        ({"resolution": "20 Jy"}, "does not fit this image"),
        ({"resolution": "5 M"}, "does not fit this image"),
        ({"resolution": "-5 uas"}, "must be a positive length"),
        ({"resolution": "20 uas", "lengths": "short"}, "accepted are 'relative' and 'published'"),
        ({"resolution": "20 uas", "dynamic_range": 0.5}, "dynamic range is larger than 1"),
    ],
)
def test_what_does_not_fit_is_refused_with_a_sentence(path, options, sentence):
    with pytest.raises(InputError, match=sentence):
        rw.measure(path, **options)


def test_an_image_in_m_takes_no_angles():
    with pytest.raises(InputError, match="give a length such as '5 M'"):
        rw.measure(in_m(ring_image()), resolution="20 uas")
    with pytest.raises(InputError, match="published lengths are angles"):
        rw.measure(in_m(ring_image()), resolution="20 M", lengths="published")


def test_many_images_make_one_table_with_mean_and_spread(tmp_path):
    paths = []
    for k, diameter in enumerate((40.0, 44.0)):
        image = averaged_ring(128, PIXEL, diameter, INNATE, parts=3)
        paths.append(write_fits(tmp_path / f"{k}.fits", image, PIXEL, 230e9, 0.0, 0.0, "invented"))
    table = measure_many(paths, resolution="15 uas")
    table.write(tmp_path / "rings.ecsv", format="ascii.ecsv")
    again = Table.read(tmp_path / "rings.ecsv", format="ascii.ecsv")
    exact = [d * exact_readings(17.0 / d)[0] for d in (40.0, 44.0)]
    assert again["diameter"].unit == u.uas
    assert again["diameter"].data == pytest.approx(exact, rel=1e-3)
    assert again.meta["mean"]["diameter"] == pytest.approx(np.mean(exact), rel=1e-3)
    assert again.meta["spread"]["diameter"] == pytest.approx(np.std(exact, ddof=1), rel=0.02)
    with pytest.raises(InputError, match="no image was given"):
        measure_many([], resolution="15 uas")


@pytest.mark.parametrize("resolution", ["20 uas", "26 uas", "60 uas"])
def test_a_picture_is_drawn_whatever_came_of_it(path, tmp_path, resolution):
    ring = rw.measure(path, resolution=resolution)
    drawn = picture(path, ring, tmp_path / "ring.png")
    assert drawn.read_bytes().startswith(b"\x89PNG")


def test_the_words_name_units_and_the_usual_caution(path):
    rings = [rw.measure(path, resolution="20 uas"), rw.measure(path, resolution="60 uas")]
    words = describe(rings, ring_table(["a", "b"], rings))
    assert f"diameter {rings[0].diameter.value:.3f} uas" in words
    assert "There is no ring at this resolution" in words
    assert "1 of 2 images have a diameter" in words
    assert "is not the edge of the shadow" in words


def test_our_own_product_is_measured_as_the_fits_image_of_it(tmp_path):
    data = ring_image(asymmetry=0.2, orientation=1.0)
    none = np.zeros(1)
    image = rw.Image(
        name="invented",
        intensity=data[None],
        pixel_m=0.25,
        theta_g_uas=4.0,
        frequency_hz=230e9,
        position_angle=0.0,
        in_jansky=True,
        flux=none,
        flux_in_field=none,
        band_width=none,
    )
    image.save(tmp_path / "one.h5")
    image.to_fits(tmp_path / "one.fits")
    of_product, of_fits = (
        rw.measure(tmp_path / name, resolution="20 uas") for name in ("one.h5", "one.fits")
    )
    assert of_product.name == "invented"
    assert of_product.diameter.value == pytest.approx(of_fits.diameter.value, rel=1e-6)
    assert of_product.orientation.value == pytest.approx(of_fits.orientation.value, rel=1e-4)
