"""Image products: what is written can be read by anyone, is whole, and never takes the place of something else."""

from __future__ import annotations

import json
from hashlib import sha256

import h5py
import numpy as np
import pytest
import xarray

import ringwright as rw
from ringwright.errors import InputError

SKY = 'mass = "9.2e9 solMass"\ndistance = "21 Mpc"'
FLUX = '[source]\ntotal_flux = "0.6 Jy"\n'


@pytest.fixture
def image(write_scene) -> rw.Image:
    return rw.render(write_scene(hole=SKY, more=FLUX, field="300 uas"), maps=True)


def test_a_product_reads_back_as_it_was_written(image, tmp_path):
    back = rw.Image.open(image.save(tmp_path / "a.h5"))
    assert back.intensity == pytest.approx(image.intensity, rel=1e-6)
    assert back.flux == pytest.approx(image.flux, rel=1e-15)
    assert back.pixel == image.pixel
    assert (back.theta_g_uas, back.frequency_hz, back.in_jansky) == (image.theta_g_uas, 2.3e11, True)
    assert set(back.maps) == {"crossing_radius", "redshift_factor", "delay"}
    assert back.notes == image.notes


def test_the_total_flux_of_the_scene_is_in_the_image(image):
    assert image.flux.sum() == pytest.approx(0.6, rel=1e-12)
    assert image.total.sum() == pytest.approx(image.flux_in_field.sum(), rel=1e-12)


def test_theta_g_takes_m_to_the_sky(image):
    # GM☉ nominal (IAU 2015): 9.2e9 solar masses at 21 Mpc are 4.324 µas.
    assert image.theta_g_uas == pytest.approx(4.3242, abs=2e-4)
    assert float(image.pixel.to_value("uas")) == pytest.approx(300.0 / 64, rel=1e-12)


def test_the_product_opens_as_a_labelled_data_set(image, tmp_path):
    with xarray.open_dataset(
        image.save(tmp_path / "a.h5"), engine="h5netcdf" if _has_h5netcdf() else None
    ) as data:
        assert data["intensity"].dims == ("order", "y", "x")
        assert data["total"].dims == ("y", "x")
        assert data["x"].values[0] > data["x"].values[-1]  # column 0 is the easternmost
        assert data["y"].values[0] < data["y"].values[-1]  # row 0 is the southernmost
        assert data["intensity"].attrs["units"] == "Jy/pixel"


def _has_h5netcdf() -> bool:
    try:
        import h5netcdf  # noqa: F401
    except ImportError:
        pytest.skip("xarray needs h5netcdf to open HDF5, and it is not installed")
    return True


def test_a_product_carries_what_made_it(image, tmp_path, write_scene):
    with h5py.File(image.save(tmp_path / "a.h5")) as file:
        text = file.attrs["source_text"]
        assert sha256(text.encode()).hexdigest() == file.attrs["source_sha256"]
        assert json.loads(file.attrs["resolved"])["view"]["pixels"] == 64
        assert "numpy" in json.loads(file.attrs["versions"])


def test_the_same_scene_gives_the_same_bytes(image, tmp_path):
    first = image.save(tmp_path / "a.h5").read_bytes()
    assert image.save(tmp_path / "b.h5").read_bytes() == first


def test_our_product_of_the_same_scene_is_replaced_and_nothing_else_is(image, tmp_path):
    target = image.save(tmp_path / "a.h5")
    image.save(target)
    other = tmp_path / "notes.txt"
    other.write_text("precious")
    with pytest.raises(InputError, match="is not a product of ringwright, so it is kept"):
        image.save(other)
    assert other.read_text() == "precious"
    with h5py.File(tmp_path / "b.h5", "w") as file:
        file.attrs["product"], file.attrs["name"] = "image", "another"
    with pytest.raises(InputError, match="image product of 'another'"):
        image.save(tmp_path / "b.h5")
    image.save(tmp_path / "b.h5", replace=True)


def test_a_failure_while_writing_leaves_the_old_file_and_no_other(image, tmp_path, monkeypatch):
    target = image.save(tmp_path / "a.h5")
    before = target.read_bytes()

    def fail(self, file):
        file["half"] = np.arange(3)
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(rw.Image, "_fill", fail)
    with pytest.raises(OSError, match="No space left"):
        image.save(target)
    assert target.read_bytes() == before
    assert [path.name for path in tmp_path.glob("*h5*")] == ["a.h5"]


def test_a_file_that_is_no_image_is_refused_in_one_sentence(image, tmp_path):
    text = tmp_path / "text.h5"
    text.write_text("not HDF5")
    cut = tmp_path / "cut.h5"
    cut.write_bytes(image.save(tmp_path / "a.h5").read_bytes()[:5000])
    with h5py.File(tmp_path / "foreign.h5", "w") as file:
        file["x"] = 1
    with h5py.File(tmp_path / "later.h5", "w") as file:
        file.attrs.update({"product": "image", "name": "x", "format_version": 99})
    for name, words in {
        "text.h5": "not a readable HDF5",
        "cut.h5": "not a readable HDF5|damaged",
        "foreign.h5": "not a product of ringwright",
        "later.h5": "format version 99",
        "absent.h5": "there is no file",
    }.items():
        with pytest.raises(InputError, match=words):
            rw.Image.open(tmp_path / name)


def test_a_flipped_bit_is_an_error_not_a_number(image, tmp_path):
    target = image.save(tmp_path / "a.h5")
    with h5py.File(target) as file:
        place = file["total"].id.get_chunk_info(0).byte_offset + 40
    data = bytearray(target.read_bytes())
    data[place] ^= 1
    target.write_bytes(bytes(data))
    with pytest.raises(OSError), h5py.File(target) as file:  # noqa: PT011 (HDF5 words its own checksum error)
        file["total"][...]


def test_a_normalised_image_refuses_to_become_flux_density(write_scene, tmp_path):
    with pytest.raises(InputError, match="normalised"):
        rw.render(write_scene()).to_fits(tmp_path / "a.fits")


def test_fits_keeps_the_flux_and_the_orientation(image, tmp_path):
    from ringwright.fits import read_fits

    back = read_fits(image.to_fits(tmp_path / "a.fits"))
    assert float(back.data.sum()) == pytest.approx(float(image.total.sum()), rel=1e-5)
    place = np.unravel_index(np.argmax(image.total), image.total.shape)
    assert np.unravel_index(np.argmax(back.data), back.data.shape) == place
