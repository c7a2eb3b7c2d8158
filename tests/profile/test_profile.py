"""The front door of a profile: what it answers, what it writes, and what it says where there is nothing to answer."""

from __future__ import annotations

import json
import math
import subprocess
import sys
from pathlib import Path

import h5py
import numpy as np
import pytest

import ringwright as rw
from ringwright.errors import InputError

DISK = """
[[emitter]]
kind = "thin-disk"
{more}
profile = {{ kind = "power-law", inner = "2.6 M", outer = "20 M", slope = 3.0, edge_width = "{edge} M" }}
flow = {{ kind = "circular" }}
"""
SKY = 'theta_g = "3.8 uas"'
FLUX = '[source]\ntotal_flux = "0.7 Jy"'
QUICK = {"orders": 3, "angles": 12, "longest": "60 Glambda", "accuracy": 1e-5}


@pytest.fixture
def scene_of(write_scene):
    """A scene with a sky and a flux density."""

    def made(edge=1.0, more="", hole=SKY, **changes):
        given = {"hole": hole, "more": FLUX, "emitters": DISK.format(edge=edge, more=more), **changes}
        return write_scene(**given)

    return made


def test_a_profile_says_who_carries_the_visibility(scene_of):
    found = rw.profile(scene_of(), **QUICK)
    assert found.rings.flux.sum() == pytest.approx(0.7)
    assert found.unit == "Jy"
    assert found.fringes.total[:, 0].real == pytest.approx(0.7, rel=1e-6)
    one = found.carriers[1]
    assert np.all(one.baseline < 30e9)
    assert np.all(one.flux > 1e-3)
    assert "order 1 is first seen at" in found.first_sight.sentence
    assert found.trusted == 60e9
    assert found.notes == ()


def test_sharp_edges_keep_a_high_order_from_carrying_and_the_answer_says_so(scene_of):
    found = rw.profile(scene_of(edge=0.0), orders=4, angles=4, longest="150 Glambda", accuracy=1e-5)
    answer = found.carriers[3]
    assert np.isnan(answer.baseline).all()
    assert "never below 150 Gλ, because the emission has sharp edges" in answer.reason


def test_the_image_agrees_with_the_profile_on_short_baselines(scene_of):
    # Pixels of 0.2 M hold the visibility of the shorter baselines to the square of their phase.
    path = scene_of(pixels=450, field="90 M", inclination="50 deg", position_angle="25 deg")
    found = rw.profile(path, position_angles=["25 deg", "70 deg"], **QUICK)
    image = rw.render(path)
    at = found.fringes.baseline < 6e9
    from ringwright.units import GLAMBDA

    for row, angle in enumerate(("25 deg", "70 deg")):
        pixels = rw.visibility(
            image, baseline=found.fringes.baseline[at] / 1e9 * GLAMBDA, position_angle=angle
        )
        assert found.fringes.total[row, at] == pytest.approx(pixels.value, abs=2e-3 * 0.7)


def test_the_product_opens_as_labelled_data(scene_of, tmp_path):
    found = rw.profile(scene_of(), **QUICK)
    path = found.save(tmp_path / "rings.h5")
    with h5py.File(path) as file:
        assert file.attrs["product"] == "profile"
        assert file["width"].dims[1].label == "position_angle"
        assert file["amplitude"].shape == (3, 2, found.fringes.baseline.size)
        assert file["flux"][:] == pytest.approx(found.rings.flux)
        assert file["cut_0"]["intensity"].shape[0] == 3
        assert file["interpolation_error"][:] == pytest.approx(found.reached)
        for name in ("peak", "amplitude", "delay", "rotation_least", "fringe_diameter_1", "baseline"):
            assert file[name].attrs["long_name"]
            assert "units" in file[name].attrs
    xarray = pytest.importorskip("xarray")
    with xarray.open_dataset(path, engine="h5netcdf", phony_dims="sort") as data:
        assert data["width"].sel(order=1).shape == (12,)


def test_the_same_scene_gives_the_same_bytes(scene_of, tmp_path):
    path = scene_of()
    first = rw.profile(path, **QUICK).save(tmp_path / "a.h5").read_bytes()
    assert rw.profile(path, **QUICK).save(tmp_path / "b.h5").read_bytes() == first


def test_the_summary_is_one_json_object(scene_of):
    found = rw.profile(scene_of(), emitting_radius="6 M", **QUICK)
    summary = json.loads(json.dumps(found.summary(), allow_nan=False))
    assert [each["order"] for each in summary["orders"]] == [0, 1, 2]
    assert summary["orders"][0]["band_width"]["value"] is None
    assert summary["orders"][1]["rotation"] == {
        "value": pytest.approx(180.0),
        "least": pytest.approx(180.0),
        "greatest": pytest.approx(180.0),
        "unit": "deg",
    }
    assert summary["limits"]["delay"]["value"] == pytest.approx(16.32419, abs=1e-5)
    assert summary["emitting_radius"] == {"value": 6.0, "unit": "M"}
    assert summary["directions"][0]["nulls"]
    assert any("a ring's diameter is not the shadow's" in note for note in summary["notes"])


def test_without_theta_g_there_are_rings_and_a_sentence_instead_of_baselines(scene_of, tmp_path):
    found = rw.profile(scene_of(hole=""), **QUICK)
    assert found.fringes is None
    assert any("no baselines: they need theta_g" in note for note in found.notes)
    assert found.summary()["directions"] == []
    assert found.save(tmp_path / "m.h5").is_file()


def test_without_a_flux_density_shares_of_the_light_are_told(write_scene):
    found = rw.profile(write_scene(hole=SKY, emitters=DISK.format(edge=1.0, more="")), **QUICK)
    assert found.unit == ""
    assert found.rings.flux.sum() == pytest.approx(1.0)
    assert "of the light of it is left" in found.first_sight.sentence


def test_an_opaque_disk_has_orders_without_light(scene_of):
    found = rw.profile(scene_of(edge=0.0, more="opaque = true", inclination="0 deg"), **QUICK)
    assert found.rings.flux[1:] == pytest.approx([0.0, 0.0], abs=1e-12)
    assert "order 1 carries no light: an opaque disk in front hides it" in found.notes
    assert found.carriers[1].reason == "never: order 1 carries no light"
    assert "no baseline below 60 Gλ" in found.first_sight.sentence
    assert found.spacings == ()


@pytest.mark.parametrize("inclination", ["90 deg", "89.9 deg", "180 deg", "0 deg"])
def test_every_view_gives_finite_answers(scene_of, inclination):
    found = rw.profile(scene_of(inclination=inclination), **{**QUICK, "accuracy": 1e-3})
    assert np.isfinite(found.fringes.visibility).all()
    assert np.isfinite(found.rings.flux).all()
    assert np.all(found.rings.flux > 0.0)
    assert np.isfinite(found.rings.width).all()


def test_a_coarse_accuracy_tells_how_far_it_can_be_trusted(scene_of):
    found = rw.profile(scene_of(edge=4.0), orders=1, angles=4, longest="900 Glambda", accuracy=0.05)
    assert found.trusted < 900e9
    assert any("the numerical error exceeds 1% of the envelope" in note for note in found.notes)


@pytest.mark.parametrize(
    ("changes", "sentence"),
    [
        ({"orders": 0}, "orders = 0 is not a whole number from 1 to 8"),
        ({"angles": 1.5}, "angles = 1.5 is not a whole number"),
        ({"accuracy": 0.0}, "accuracy of 0 is not a relative error"),
        ({"longest": "1000"}, "the longest baseline: "),
        ({"longest": "1 Glambda"}, "does not reach the first fringe"),
        ({"sensitivity": "1 uas"}, "the sensitivity: "),
        ({"sensitivity": "-1 mJy"}, "is negative"),
        ({"position_angles": ["north"]}, "a position angle: "),
        ({"emitting_radius": "6"}, "the emitting radius: "),
        ({"emitting_radius": "1 M"}, "not outside the horizon at 2 M"),
    ],
)
def test_what_makes_no_sense_is_refused(scene_of, changes, sentence):
    with pytest.raises(InputError, match=sentence):
        rw.profile(scene_of(), **{**QUICK, **changes})


def test_a_backdrop_has_no_profile(write_scene):
    path = write_scene(emitters='[[emitter]]\nkind = "backdrop"\n')
    with pytest.raises(InputError, match="an emitter without edges"):
        rw.profile(path, **QUICK)


def run(*arguments: str, cwd: Path) -> subprocess.CompletedProcess[str]:
    return subprocess.run(
        [sys.executable, "-m", "ringwright", "profile", *arguments],
        capture_output=True,
        text=True,
        cwd=cwd,
        check=False,
    )


def test_the_verb_prints_a_table_and_writes_product_and_pictures(scene_of, tmp_path):
    quick = ["--orders", "3", "--angles", "8", "--longest", "60 Glambda", "--accuracy", "1e-4"]
    done = run(str(scene_of()), *quick, cwd=tmp_path)
    assert done.returncode == 0, done.stderr
    assert "limits for high orders" in done.stdout
    assert "order 1 has more than half of the envelope from" in done.stdout
    assert "a ring's diameter is not the shadow's" in done.stdout
    names = {path.name for path in (tmp_path / "outputs").iterdir()}
    stem = "test-nucleus-profile"
    assert names == {f"{stem}.h5", f"{stem}-cuts.png", f"{stem}-baselines.png", f"{stem}-rings.png"}
    again = run(str(scene_of()), *quick, "--json", cwd=tmp_path)
    assert again.returncode == 0, again.stderr
    assert math.isclose(json.loads(again.stdout)["total_flux"]["value"], 0.7)


def test_the_verb_refuses_with_one_sentence(scene_of, tmp_path):
    done = run(str(scene_of()), "--longest", "8", cwd=tmp_path)
    assert done.returncode == 2
    assert done.stderr.startswith("ringwright profile: the longest baseline: ")
    assert "Traceback" not in done.stderr
    assert not (tmp_path / "outputs").exists()
