"""FITS images: what we write is standard and comes back; what others write is read or refused."""

from __future__ import annotations

import shutil
import subprocess

import numpy as np
import pytest
from astropy.io import fits
from astropy.wcs import WCS

from ringwright.errors import InputError
from ringwright.fits import UAS_PER_DEGREE, read_fits, write_fits

PIXEL = 0.8
PLACE = (187.7, 12.4)
BEAM = 10.0 / UAS_PER_DEGREE
STEP = PIXEL / UAS_PER_DEGREE
# FITS cards hold about 14 digits (STANDARDS.md, tried): positions agree to that.
CARD = 1e-12


@pytest.fixture
def image():
    data = np.zeros((40, 50))
    data[31, 7] = 0.6  # north and east of the middle
    data[3, 44] = 0.1
    return data


@pytest.fixture
def written(tmp_path, image):
    return write_fits(tmp_path / "one.fits", image, PIXEL, 230e9, *PLACE, "invented", history=["a test"])


def altered(written, tmp_path, data=None, **cards):
    """The written file with other header cards (None removes one) or data."""
    with fits.open(written) as hdus:
        header, plane = hdus[0].header.copy(), hdus[0].data.copy()
    for key, value in cards.items():
        if value is None:
            del header[key]
        else:
            header[key] = value
    path = tmp_path / "altered.fits"
    fits.PrimaryHDU(plane if data is None else data, header).writeto(path)
    return path


def test_an_image_comes_back_as_it_was_written(written, image):
    sky = read_fits(written)
    assert np.array_equal(sky.data, image)
    assert sky.pixel.to_value("uas") == pytest.approx(PIXEL, rel=CARD)
    assert (sky.name, sky.unit, sky.beam, sky.averaged, sky.notes) == ("invented", "Jy/pixel", None, True, ())


def test_an_off_centre_source_lies_at_its_right_ascension_and_declination(written):
    """Through astropy.wcs: offsets north and east of the middle, east being larger RA."""
    with fits.open(written) as hdus:
        wcs = WCS(hdus[0].header).celestial
    ra, dec = wcs.pixel_to_world_values(7, 31)
    north, east = (31 - 19.5) * PIXEL, (24.5 - 7) * PIXEL
    assert (dec - PLACE[1]) * UAS_PER_DEGREE == pytest.approx(north, abs=1e-4)
    assert (ra - PLACE[0]) * np.cos(np.radians(PLACE[1])) * UAS_PER_DEGREE == pytest.approx(east, abs=1e-4)


def test_the_header_is_what_the_standard_asks_for(written):
    """Greisen & Calabretta 2002; Calabretta & Greisen 2002 (STANDARDS.md)."""
    with fits.open(written, checksum=True) as hdus:
        header = hdus[0].header
    assert [header[f"CTYPE{k}"] for k in (1, 2, 3, 4)] == ["RA---SIN", "DEC--SIN", "FREQ", "STOKES"]
    assert header["CDELT1"] < 0.0 < header["CDELT2"]
    assert (header["CRPIX1"], header["CRPIX2"], header["CRVAL3"], header["CRVAL4"]) == (
        25.5,
        20.5,
        230e9,
        1.0,
    )
    assert (header["RADESYS"], header["BUNIT"], "DATE" in header) == ("ICRS", "Jy/pixel", False)
    assert "CHECKSUM" in header
    assert "DATASUM" in header


def test_the_same_image_gives_the_same_bytes(written, tmp_path, image):
    again = write_fits(tmp_path / "two.fits", image, PIXEL, 230e9, *PLACE, "invented", history=["a test"])
    assert again.read_bytes() == written.read_bytes()


def test_fitsverify_finds_nothing(written):
    program = shutil.which("fitsverify")
    if program is None:
        pytest.skip("fitsverify is not installed on this system (Debian package fitsverify)")
    done = subprocess.run([program, str(written)], capture_output=True, text=True, check=False)
    assert "0 warning(s) and 0 error(s)" in done.stdout, done.stdout


def test_a_file_that_exists_is_kept_unless_its_replacement_is_asked_for(written, image):
    with pytest.raises(InputError, match="this file exists"):
        write_fits(written, image, PIXEL, 230e9, *PLACE, "invented")
    write_fits(written, 2.0 * image, PIXEL, 230e9, *PLACE, "invented", overwrite=True)
    assert read_fits(written).data.max() == 1.2


def test_an_image_without_a_frequency_is_not_written(tmp_path, image):
    with pytest.raises(InputError, match="has no frequency"):
        write_fits(tmp_path / "x.fits", image, PIXEL, None, *PLACE, "invented")


def test_grids_that_run_the_other_way_are_turned_round(written, tmp_path, image):
    path = altered(written, tmp_path, data=image[::-1, ::-1][None, None], CDELT1=STEP, CDELT2=-STEP)
    sky = read_fits(path)
    assert np.array_equal(sky.data, image)
    assert any("rows ran to the south" in note for note in sky.notes)
    assert any("columns ran to the east" in note for note in sky.notes)


def test_two_axes_of_any_number_type_are_read_in_native_byte_order(tmp_path, image):
    header = fits.Header(
        {"CTYPE1": "RA---TAN", "CTYPE2": "DEC--TAN", "CRVAL1": 10.0, "CRVAL2": -5.0, "BUNIT": "JY/PIXEL "}
    )
    header.update({"CDELT1": -STEP, "CDELT2": STEP, "CRPIX1": 26.0, "CRPIX2": 21.0})
    fits.PrimaryHDU(image.astype(">f4"), header).writeto(tmp_path / "two.fits")
    sky = read_fits(tmp_path / "two.fits")
    assert sky.data.dtype.isnative
    assert sky.data == pytest.approx(image, rel=1e-6)


def test_blank_and_negative_pixels_are_handled_and_said(written, tmp_path, image):
    data = image.copy()
    data[0, :3] = np.nan
    data[1, 1] = -0.02
    sky = read_fits(altered(written, tmp_path, data=data[None, None]))
    assert np.isfinite(sky.data).all()
    assert sky.notes[0].startswith("3 of 2000 pixels are blank")
    assert sky.notes[1].startswith("1 of 2000 pixels are negative")


def test_a_round_beam_is_read_and_its_pixels_are_samples(written, tmp_path):
    sky = read_fits(altered(written, tmp_path, BUNIT="jy/Beam", BMAJ=BEAM, BMIN=BEAM, BPA=0.0))
    assert sky.beam.to_value("uas") == pytest.approx(10.0)
    assert not sky.averaged


def test_the_total_intensity_is_taken_from_several_stokes_planes(written, tmp_path, image):
    planes = np.stack([0.1 * image, image])[:, None]
    sky = read_fits(altered(written, tmp_path, data=planes, CRVAL4=2.0, CDELT4=-1.0))
    assert np.array_equal(sky.data, image)


def test_several_frequencies_are_refused(written, tmp_path, image):
    with pytest.raises(InputError, match="has 2 planes; cut out one"):
        read_fits(altered(written, tmp_path, data=np.stack([image, image])[None]))


@pytest.mark.parametrize(
    ("cards", "sentence"),
    [
        ({"BUNIT": "Jy/beam"}, "no BMAJ and BMIN to say which beam"),
        ({"BUNIT": "m/s"}, "'m/s' is no surface brightness"),
        (
            {"BUNIT": "Jy/beam", "BMAJ": BEAM, "BMIN": 0.7 * BEAM, "BPA": 20.0},
            "the beam is elliptical, 10 by 7",
        ),
        ({"CROTA2": 30.0}, "the grid is rotated by"),
        ({"CDELT2": 1.5 * STEP}, "regrid the image to square pixels"),
        ({"CTYPE1": "LINEAR", "CTYPE2": "LINEAR"}, "no image in this FITS file has a celestial"),
    ],
)
def test_what_a_ring_cannot_be_measured_on_is_refused_with_a_sentence(written, tmp_path, cards, sentence):
    with pytest.raises(InputError, match=sentence):
        read_fits(altered(written, tmp_path, **cards))


def test_files_that_are_no_fits_image_are_refused_with_a_sentence(written, tmp_path):
    with pytest.raises(InputError, match="there is no such file"):
        read_fits(tmp_path / "absent.fits")
    for content in (b"", b"not a picture", written.read_bytes()[:9000], written.read_bytes()[:500]):
        (tmp_path / "bad.fits").write_bytes(content)
        with pytest.raises(InputError, match="not a readable FITS file, or it is cut short"):
            read_fits(tmp_path / "bad.fits")
    table = fits.BinTableHDU.from_columns([fits.Column("x", "D", array=np.arange(3.0))])
    table.writeto(tmp_path / "table.fits")
    with pytest.raises(InputError, match="no image in this FITS file"):
        read_fits(tmp_path / "table.fits")
