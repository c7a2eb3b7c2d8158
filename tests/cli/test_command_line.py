"""The command line as a person meets it: answers on standard output, one clear message and exit status 2 for bad input."""

from __future__ import annotations

import json
import re
import subprocess
import sys

import h5py
import numpy as np
import pytest

import ringwright as rw
from ringwright.cli import main


@pytest.fixture
def scene(write_scene, monkeypatch, tmp_path):
    monkeypatch.chdir(tmp_path)
    sky = 'mass = "9.2e9 solMass"\ndistance = "21 Mpc"'
    more = '[source]\ntotal_flux = "0.6 Jy"\nright_ascension = "10 deg"\ndeclination = "5 deg"'
    return str(write_scene(hole=sky, more=more, field="200 uas", name="seen"))


def refused(capsys, *arguments):
    """The message of a call that must end with exit status 2."""
    assert main([str(argument) for argument in arguments]) == 2
    captured = capsys.readouterr()
    assert "Traceback" not in captured.err
    assert captured.out == ""
    return captured.err


def test_render_writes_a_product_and_a_picture(scene, capsys, tmp_path):
    assert main(["render", scene]) == 0
    assert "order 0:" in capsys.readouterr().out
    assert rw.Image.open(tmp_path / "outputs" / "seen.h5").name == "seen"
    assert (tmp_path / "outputs" / "seen.png").read_bytes().startswith(b"\x89PNG")


def test_render_prints_one_json_object_and_writes_fits_and_maps(scene, capsys, tmp_path):
    assert main(["render", scene, "--json", "--fits", "--maps", "--out", "x.h5"]) == 0
    answer = json.loads(capsys.readouterr().out)
    assert answer["flux_per_order"]["unit"] == "Jy"
    assert sorted(answer["files"]) == ["x.fits", "x.h5", "x.png"]
    assert "delay" in rw.Image.open("x.h5").maps
    assert main(["render", scene, "--fits", "--out", "x.h5"]) == 0  # our own files are replaced


def test_a_replaced_image_of_another_file_is_told(scene, capsys, tmp_path):
    for edited, told in ((False, False), (False, False), (True, True)):
        path = tmp_path / "seen.toml"
        path.write_text(path.read_text().replace("30 deg", "31 deg" if edited else "30 deg"))
        assert main(["render", scene]) == 0
        assert (
            "replaced: an earlier outputs/seen.h5, which differed in its file" in capsys.readouterr().err
        ) == told


def test_foreign_files_are_kept(scene, capsys, tmp_path):
    for name in ("x.h5", "x.png", "x.fits"):
        for old in tmp_path.glob("x.*"):
            old.unlink()
        (tmp_path / name).write_text("precious")
        assert f"{name} exists" in refused(capsys, "render", scene, "--out", "x.h5", "--fits")
        assert (tmp_path / name).read_text() == "precious"
        assert [path.name for path in tmp_path.glob("x.*")] == [name]
    assert main(["render", scene, "--out", "x.h5", "--fits", "--replace"]) == 0


def test_a_wrong_scene_gives_file_line_and_key(scene, capsys, tmp_path):
    text = (tmp_path / "seen.toml").read_text().replace('"30 deg"', "30")
    (tmp_path / "wrong.toml").write_text(text)
    message = refused(capsys, "render", "wrong.toml")
    assert "wrong.toml:7: view.inclination: 30 has no unit" in message
    assert refused(capsys, "render", "absent.toml").count("\n") == 1
    assert not (tmp_path / "outputs").exists()


def test_measure_reads_products_and_fits_alike(scene, capsys, tmp_path):
    main(["render", scene, "--fits", "--out", "x.h5"])
    capsys.readouterr()
    assert (
        main(
            [
                "measure",
                "x.h5",
                "x.fits",
                "--resolution",
                "20 uas",
                "--json",
                "--out",
                "rings.ecsv",
                "--picture",
            ]
        )
        == 0
    )
    answer = json.loads(capsys.readouterr().out)
    first, second = (ring["diameter"]["value"] for ring in answer["rings"])
    assert first == pytest.approx(second, rel=1e-4)
    assert "diameter" in (tmp_path / "rings.ecsv").read_text()
    assert (tmp_path / "outputs" / "x-ring.png").is_file()
    assert "exists" in refused(capsys, "measure", "x.h5", "--resolution", "20 uas", "--out", "rings.ecsv")
    assert main(["measure", "x.h5", "--resolution", "20 uas"]) == 0
    said = capsys.readouterr().out
    assert "diameter" in said
    assert "not the edge of the shadow" in said


def test_no_ring_is_an_answer(scene, capsys, tmp_path):
    main(["render", scene, "--out", "x.h5"])
    capsys.readouterr()
    assert main(["measure", "x.h5", "--resolution", "90 uas", "--json"]) == 0
    (ring,) = json.loads(capsys.readouterr().out)["rings"]
    assert ring["diameter"]["value"] is None
    assert ring["reason"]


def test_images_that_cannot_be_measured_are_refused(scene, capsys, tmp_path):
    main(["render", scene, "--fits", "--out", "x.h5"])
    capsys.readouterr()
    (tmp_path / "cut.fits").write_bytes((tmp_path / "x.fits").read_bytes()[:4000])
    (tmp_path / "cut.h5").write_bytes((tmp_path / "x.h5").read_bytes()[:4000])
    for name in ("cut.fits", "cut.h5", "seen.toml", "absent.fits"):
        assert name in refused(capsys, "measure", name, "--resolution", "20 uas")
    assert "does not fit" in refused(capsys, "measure", "x.h5", "--resolution", "20 Jy")
    from astropy.io import fits

    with fits.open("x.fits") as file:
        file[0].header.update({"BMAJ": 5e-9, "BMIN": 3e-9, "BPA": 10.0, "BUNIT": "Jy/beam"})
        file.writeto("beam.fits")
    assert "ellip" in refused(capsys, "measure", "beam.fits", "--resolution", "20 uas")


SCAN = """name = "few"
scene = "SCENE"
[sampling]
scenes = 4
[image]
field = "44 M"
pixels = 96
[[vary]]
key = "emitter.profile.inner"
range = ["2 M", "4 M"]
"""


def test_from_starter_files_to_a_mass(capsys, monkeypatch, tmp_path):
    """The README's path, with fewer and smaller scenes."""
    monkeypatch.chdir(tmp_path)
    for kind in ("observation", "scene", "scan"):
        assert main(["new", kind, f"{kind}.toml"]) == 0
    assert "exists and is kept" in refused(capsys, "new", "scan", "scan.toml")
    text = (tmp_path / "scan.toml").read_text().replace("scenes = 256", "scenes = 8").replace("192", "96")
    (tmp_path / "scan.toml").write_text(text)
    assert main(["scan", "scan.toml", "--workers", "1"]) == 0
    assert main(["compare", "observation.toml", "outputs/my-scan.h5"]) == 0
    said = capsys.readouterr().out
    for words in (
        "θ_g =",
        " measurement, ± ",
        "not a shadow diameter",
        "prior is not a measurement",
    ):
        assert words in said
    report = (tmp_path / "outputs" / "my-observation.txt").read_text(encoding="utf-8")
    assert said.split("failed\n", 1)[1] in report
    assert "my-observation compared with outputs/my-scan.h5" in report
    assert main(["compare", "observation.toml", "outputs/my-scan.h5", "--json"]) == 0
    captured = capsys.readouterr()
    assert "replaced" not in captured.err
    answer = json.loads(captured.out)
    assert "outputs/my-observation.txt" in answer["files"]
    assert answer["ring_only"]["mass"]["unit"] == "solMass"
    assert {"low68", "high68", "low95", "high95", "value", "unit"} <= answer["ring_only"]["theta_g"].keys()
    assert len(list((tmp_path / "outputs").glob("my-observation-*.png"))) == 3
    text = (tmp_path / "observation.toml").read_text(encoding="utf-8")
    (tmp_path / "observation.toml").write_text(text.replace("44.7 uas", "31.5 uas"), encoding="utf-8")
    assert main(["compare", "observation.toml", "outputs/my-scan.h5"]) == 0
    assert re.search("replaced: an earlier answer, .* ring diameter 44.7 ± 2.9 µas", capsys.readouterr().err)
    (tmp_path / "observation.toml").write_text(text.replace('"20 uas"', '"2000 uas"'), encoding="utf-8")
    assert (
        main(["compare", "observation.toml", "outputs/my-scan.h5"]) == 0
    )  # nothing fits, so nothing is drawn
    assert capsys.readouterr().err.count("was not drawn again and shows an earlier answer") == 3
    (tmp_path / "outputs" / "my-observation.txt").write_text("precious")
    assert "txt exists" in refused(capsys, "compare", "observation.toml", "outputs/my-scan.h5")


def test_a_finished_scan_is_kept_and_said_to_be_there(scene, capsys, tmp_path):
    (tmp_path / "scan.toml").write_text(SCAN.replace("SCENE", "seen.toml"))
    assert main(["scan", "scan.toml", "--workers", "1"]) == 0
    before = (tmp_path / "outputs" / "few.h5").read_bytes()
    capsys.readouterr()
    assert main(["scan", "scan.toml"]) == 0
    captured = capsys.readouterr()
    assert "few.h5 is this scan already" in captured.err
    assert "few: 4 scenes" in captured.out
    (tmp_path / "scan.toml").write_text(
        SCAN.replace("SCENE", "seen.toml").replace("scenes = 4", "scenes = 2")
    )
    said = refused(capsys, "scan", "scan.toml")
    assert "few.h5 holds a finished scan of the same name, 'few', that differs in its file" in said
    assert "--replace" in said
    assert (tmp_path / "outputs" / "few.h5").read_bytes() == before
    assert main(["scan", "scan.toml", "--workers", "1", "--replace"]) == 0


def test_a_scan_product_that_cannot_be_read_is_refused(scene, capsys, tmp_path):
    (tmp_path / "scan.toml").write_text(SCAN.replace("SCENE", "seen.toml"))
    assert main(["scan", "scan.toml", "--workers", "1", "--json"]) == 0
    assert json.loads(capsys.readouterr().out)["scenes"] == 4
    main(["new", "observation", "o.toml"])
    capsys.readouterr()
    whole = (tmp_path / "outputs" / "few.h5").read_bytes()
    (tmp_path / "cut.h5").write_bytes(whole[: len(whole) // 2])
    assert "cut.h5" in refused(capsys, "compare", "o.toml", "cut.h5")
    main(["render", scene])
    capsys.readouterr()
    assert "a scan product is needed" in refused(capsys, "compare", "o.toml", "outputs/seen.h5")
    assert "absent.h5" in refused(capsys, "compare", "o.toml", "absent.h5")
    assert not list((tmp_path / "outputs").glob("my-observation*"))


@pytest.mark.parametrize(
    ("arguments", "said"),
    [
        ("compare few.toml x.h5", "few.toml: this is a scan file: run `ringwright scan few.toml`"),
        ("compare x.h5 o.toml", "HDF5 file: images go to `ringwright measure`"),
        ("compare o.toml few.toml", "run `ringwright scan few.toml`.* a scan product is due"),
        ("compare o.toml absent.h5", "no file absent.h5; `ringwright scan SCAN_FILE` writes a scan product"),
        ("compare o.toml x.h5", "x.h5 is an image product; a scan product is needed"),
        ("scan seen.toml", "seen.toml: this is a scene file: .* a scan file is due"),
        ("scan o.toml", "o.toml: this is an observation file: .* a scan file is due"),
        ("render few.toml", "this is a scan file: .* a scene file is due"),
        ("measure seen.toml --resolution 20uas", "this is a scene file: .* an image is due"),
    ],
)
def test_a_file_of_another_kind_is_named_and_its_use_told(scene, capsys, tmp_path, arguments, said):
    (tmp_path / "few.toml").write_text(SCAN.replace("SCENE", "seen.toml"))
    main(["new", "observation", "o.toml"])
    with h5py.File("x.h5", "w") as file:
        file.attrs["product"] = "image"
    capsys.readouterr()
    message = refused(capsys, *arguments.split())
    assert re.search(said, message), message
    assert message.count("\n") == 1


def test_help_version_and_schema(capsys):
    for option in ("--help", "--version"):
        with pytest.raises(SystemExit) as stop:
            main([option])
        assert stop.value.code == 0
    assert "ring diameter is not a shadow diameter" in capsys.readouterr().out
    assert main(["schema"]) == 0
    assert json.loads(capsys.readouterr().out)["title"] == "SceneFile"
    with pytest.raises(SystemExit) as stop:
        main(["polish"])
    assert stop.value.code == 2


def test_a_misspelt_option_is_told_with_the_usage_of_its_verb(capsys):
    with pytest.raises(SystemExit) as stop:
        main(["compare", "--replce", "o.toml", "scan.h5"])
    assert stop.value.code == 2
    said = capsys.readouterr().err
    assert said.startswith("usage: ringwright compare")
    assert "not understood: --replce; did you mean --replace?" in said


def test_results_that_nobody_reads_end_quietly():
    code = "import sys; from ringwright.cli import main; sys.exit(main(['schema']))"
    shell = f'"{sys.executable}" -c "{code}"; echo $? >&2'
    run = subprocess.run(["sh", "-c", f"({shell}) | true"], capture_output=True, text=True, check=False)
    assert run.stderr.strip() in ("0", "141")


def test_render_imports_nothing_heavy_that_it_does_not_need(scene):
    code = "import sys; from ringwright.cli import main; main(sys.argv[1:]); print(sorted(sys.modules))"
    run = subprocess.run(
        [sys.executable, "-c", code, "render", scene], capture_output=True, text=True, check=True
    )
    for heavy in (
        "matplotlib.pyplot",
        "scipy.interpolate",
        "astropy.wcs",
        "astropy.io.fits",
        "pandas",
        "scipy.stats",
    ):
        assert f"'{heavy}'" not in run.stdout, heavy


def test_help_imports_no_numbers():
    code = "import sys\nfrom ringwright.cli import main\ntry:\n  main(['--help'])\nexcept SystemExit: pass\nprint(sorted(sys.modules))"
    run = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    for heavy in ("numpy", "astropy", "numba", "h5py", "pydantic"):
        assert f"'{heavy}'" not in run.stdout, heavy


def test_an_interruption_ends_with_130(scene, capsys, monkeypatch):
    import ringwright.verbs

    monkeypatch.setattr(ringwright.verbs, "render", lambda options: (_ for _ in ()).throw(KeyboardInterrupt))
    assert main(["render", scene]) == 130
    assert np.all([word in capsys.readouterr().err for word in ("interrupted",)])
