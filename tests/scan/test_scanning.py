"""Scans: the same data on one worker or many, failing scenes kept with their reason, started from anywhere."""

from __future__ import annotations

import dataclasses
import subprocess
import sys
from pathlib import Path

import h5py
import numpy as np
import pytest

import ringwright as rw
from ringwright.errors import InputError
from ringwright.scanfile import load_scan
from ringwright.scanning import running
from ringwright.scanning.drawing import draw
from ringwright.scanning.finished import made_of

BASE = """
name = "base"
[view]
inclination = "20 deg"
field = "40 M"
pixels = 64
orders = 2
[[emitter]]
kind = "thin-disk"
profile = { kind = "power-law", inner = "3 M", outer = "30 M", slope = 4.0 }
flow = { kind = "circular" }
"""

SCAN = """
name = "small"
family = "small family"
scene = "base.toml"
[sampling]
method = "sobol"
scenes = 8
seed = 5
[image]
field = "44 M"
pixels = 96
[[vary]]
key = "emitter.profile.inner"
range = ["2 M", "4 M"]
[[vary]]
key = "emitter.flow"
list = [{ kind = "circular" }, { kind = "radial-fall" }]
"""


@pytest.fixture(scope="module")
def plan(tmp_path_factory) -> Path:
    folder = tmp_path_factory.mktemp("scan")
    (folder / "base.toml").write_text(BASE, encoding="utf-8")
    (folder / "small.toml").write_text(SCAN, encoding="utf-8")
    return folder / "small.toml"


@pytest.fixture(scope="module")
def alone(plan) -> rw.ScanTable:
    """The scan on one worker, in this process."""
    return rw.scan(plan, out=plan.parent / "alone.h5", workers=1)


def test_two_workers_give_the_bytes_of_one(plan, alone):
    rw.scan(plan, out=plan.parent / "two.h5", workers=2)
    assert (plan.parent / "two.h5").read_bytes() == (plan.parent / "alone.h5").read_bytes()


def test_a_product_reads_back_as_it_was_made(plan, alone):
    back = rw.ScanTable.open(plan.parent / "alone.h5")
    assert back.family == "small family"
    assert [parameter.key for parameter in back.parameters] == ["emitter.profile.inner", "emitter.flow"]
    assert back.parameters[1].labels == ("circular", "radial-fall")
    np.testing.assert_array_equal(back.diameter, alone.diameter)
    np.testing.assert_array_equal(back.outcome, alone.outcome)
    assert back.base["emitter"][0]["profile"]["slope"] == 4.0


def test_weights_sum_to_one_and_every_scene_is_read(alone):
    assert alone.weight.sum() == pytest.approx(1.0)
    assert (alone.status == 0).all()
    assert (alone.node_count >= 2).all()
    assert np.isfinite(alone.diameter[:, 0]).all()


def test_a_reading_of_a_scan_is_what_measure_reads_on_the_rendered_scene(plan, alone):
    """Another resolution than any node, another field and pixel: the table says what the image would."""
    loaded = load_scan(plan)
    values = draw(loaded)[3]
    scene = loaded.base
    for vary, value in zip(loaded.vary, values, strict=True):
        scene = scene.replace(vary.key, value)
    scene = scene.replace("view.pixels", 160).replace("view.field", "50 M")
    for x in (2.2, 3.9):
        ring = rw.measure(rw.render(scene), resolution=f"{x} M")
        count = alone.node_count[3]
        table = np.interp(x, alone.node[3, :count], alone.diameter[3, :count])
        assert table == pytest.approx(float(ring.diameter.value), rel=0.003)


def test_the_sobol_points_cover_the_prior_evenly(plan):
    loaded = load_scan(plan)
    inner = loaded.vary[0].numbers([row[0] for row in draw(loaded)])
    assert sorted(np.floor((inner - 2.0) / 0.25).astype(int)) == list(range(8))


def test_a_grid_takes_every_combination(plan, tmp_path):
    (tmp_path / "base.toml").write_text(BASE, encoding="utf-8")
    text = SCAN.replace('method = "sobol"\nscenes = 8\n', 'method = "grid"\n')
    text = text.replace('range = ["2 M", "4 M"]', 'range = ["2 M", "4 M"]\npoints = 4')
    (tmp_path / "grid.toml").write_text(text, encoding="utf-8")
    drawn = draw(load_scan(tmp_path / "grid.toml"))
    assert len(drawn) == 8
    assert [row[0] for row in drawn[::2]] == ["2.25 M", "2.75 M", "3.25 M", "3.75 M"]


def test_a_failing_scene_is_recorded_and_stops_nothing(plan, monkeypatch):
    true_render = running.render

    def fragile(scene, **options):
        if scene.emitters[0][1].edges[0] > 3.5:
            raise FloatingPointError("made to fail")
        return true_render(scene, **options)

    monkeypatch.setattr(running, "render", fragile)
    table = rw.scan(plan, out=plan.parent / "failing.h5", workers=1)
    failed = table.status == 1
    assert 0 < failed.sum() < 8
    assert {table.reason[i] for i in np.flatnonzero(failed)} == {"FloatingPointError: made to fail"}
    assert np.isnan(table.diameter[failed]).all()
    assert table.weight.sum() == pytest.approx(1.0)


def test_the_target_is_checked_before_the_work_starts(plan, tmp_path, monkeypatch):
    monkeypatch.setattr(running, "render", None)
    other = tmp_path / "notes.txt"
    other.write_text("precious")
    with pytest.raises(InputError, match="not a product of ringwright"):
        rw.scan(plan, out=other)
    with pytest.raises(InputError, match="at least one worker"):
        rw.scan(plan, out=tmp_path / "a.h5", workers=0)
    assert other.read_text() == "precious"


def test_the_same_scan_is_read_and_not_computed_again(plan, alone, monkeypatch):
    monkeypatch.setattr(running, "render", None)
    again = rw.scan(plan, out=plan.parent / "alone.h5", workers=1)
    np.testing.assert_array_equal(again.diameter, alone.diameter)


@pytest.mark.parametrize(
    ("file", "old", "new", "said"),
    [
        ("small.toml", "scenes = 8", "scenes = 4", "differs in its file;"),
        ("base.toml", 'outer = "30 M"', 'outer = "31 M"', "differs in the scene that it starts from;"),
    ],
)
def test_a_scan_of_the_same_name_and_other_content_is_kept(
    plan, alone, tmp_path, monkeypatch, file, old, new, said
):
    monkeypatch.setattr(running, "render", None)
    for name, text in (("base.toml", BASE), ("small.toml", SCAN)):
        (tmp_path / name).write_text(text.replace(old, new) if name == file else text, encoding="utf-8")
    product = plan.parent / "alone.h5"
    before = product.read_bytes()
    with pytest.raises(InputError, match=said):
        rw.scan(tmp_path / "small.toml", out=product, workers=1)
    with pytest.raises(InputError, match="differs in its file"):
        dataclasses.replace(alone, provenance={**alone.provenance, "source_text": "other"}).save(product)
    assert product.read_bytes() == before


def test_a_scan_of_an_edited_table_of_brightness_is_another_scan(tmp_path):
    base = BASE.replace(
        'kind = "power-law", inner = "3 M", outer = "30 M", slope = 4.0', 'kind = "table", file = "light.csv"'
    )
    scan = SCAN.replace("emitter.profile.inner", "view.inclination").replace(
        '["2 M", "4 M"]', '["10 deg", "20 deg"]'
    )
    (tmp_path / "base.toml").write_text(base, encoding="utf-8")
    (tmp_path / "small.toml").write_text(scan, encoding="utf-8")
    made = []
    for outermost in (20.0, 21.0):
        (tmp_path / "light.csv").write_text(f"3.0, 1.0\n6.0, 0.5\n{outermost}, 0.0\n", encoding="utf-8")
        made.append(made_of(load_scan(tmp_path / "small.toml")))
    assert [key for key in made[0] if made[0][key] != made[1][key]] == ["tables"]


INTERRUPTED = """
import os, signal
from ringwright.scanning.pool import process_pool, results
try:
    with process_pool(2, int, ()) as pool:
        for done in results(pool, abs, [-1] * 1000):
            os.killpg(0, signal.SIGINT)
except KeyboardInterrupt:
    print("interrupted", flush=True)
"""


def test_an_interruption_ends_the_workers_without_a_word(plain_environment):
    run = subprocess.run(
        [sys.executable, "-c", INTERRUPTED],
        capture_output=True,
        text=True,
        env=plain_environment,
        start_new_session=True,
        timeout=60,
        check=False,
    )
    assert (run.stdout, run.stderr, run.returncode) == ("interrupted\n", "", 0)


def test_a_truncated_product_is_refused_in_one_sentence(plan, alone, tmp_path):
    cut = tmp_path / "cut.h5"
    cut.write_bytes((plan.parent / "alone.h5").read_bytes()[:9000])
    with pytest.raises(InputError, match=r"readable HDF5|damaged"):
        rw.ScanTable.open(cut)
    with h5py.File(tmp_path / "image.h5", "w") as file:
        file.attrs["product"] = "image"
    with pytest.raises(InputError, match="a scan product is needed"):
        rw.ScanTable.open(tmp_path / "image.h5")


SCRIPT = """
import ringwright as rw
table = rw.scan({plan!r}, out={out!r}, workers=2)
print(len(table.status), int((table.status == 0).sum()))
"""


def test_an_unguarded_script_may_start_a_scan(plan, tmp_path, plain_environment):
    script = tmp_path / "script.py"
    script.write_text(SCRIPT.format(plan=str(plan), out=str(tmp_path / "script.h5")), encoding="utf-8")
    run = subprocess.run(
        [sys.executable, script],
        capture_output=True,
        text=True,
        env=plain_environment,
        timeout=120,
        check=False,
    )
    assert run.stdout.split() == ["8", "8"], run.stderr


def test_standard_input_may_start_a_scan(plan, tmp_path, plain_environment):
    text = SCRIPT.format(plan=str(plan), out=str(tmp_path / "stdin.h5"))
    run = subprocess.run(
        [sys.executable, "-"],
        input=text,
        capture_output=True,
        text=True,
        env=plain_environment,
        timeout=120,
        check=False,
    )
    assert run.stdout.split() == ["8", "8"], run.stderr


def test_a_notebook_may_start_a_scan(plan, tmp_path, plain_environment):
    """A notebook's __main__ has no file and holds functions that a worker could not import: the same as this one."""
    text = "import sys\nsys.modules['__main__'].__dict__.pop('__file__', None)\nclass Cell: pass\ncell = Cell()\n"
    text += SCRIPT.format(plan=str(plan), out=str(tmp_path / "notebook.h5"))
    run = subprocess.run(
        [sys.executable, "-c", text],
        capture_output=True,
        text=True,
        env=plain_environment,
        timeout=120,
        check=False,
    )
    assert run.stdout.split() == ["8", "8"], run.stderr
