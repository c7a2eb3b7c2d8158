"""Files as a whole: shipped ones and starters load, nothing but a clear error comes of rubbish, scenes can be changed and kept."""

from __future__ import annotations

import contextlib
import json
import math
import pickle
import re
import subprocess
import sys
import tomllib

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

import ringwright as rw
from ringwright.observation import ObservationFile, load_observation
from ringwright.scanfile import ScanFile, load_scan
from ringwright.scenes import new_file, scene_schema
from ringwright.scenes.lines import key_lines
from ringwright.scenes.models import SceneFile
from ringwright.scenes.validation import _models_in
from ringwright.units import mass_from, theta_g

LOADERS = {"scan": load_scan, "observation": load_observation}


def loader(name):
    return next((load for word, load in LOADERS.items() if word in name), rw.load_scene)


def test_every_shipped_file_loads_and_scenes_say_what_one_should_see(project):
    shipped = sorted((project / "scenes").glob("*.toml"))
    scenes = [path for path in shipped if loader(path.stem) is rw.load_scene]
    assert len(scenes) >= 6
    for path in shipped:
        assert loader(path.stem)(path).name == path.stem
        assert path.read_text(encoding="utf-8").startswith("#")
    for path in scenes:
        assert path.read_text(encoding="utf-8").startswith("# What you should see")


def test_starters_load_and_are_never_written_over_something(tmp_path):
    for kind in ("scene", "scan", "observation"):
        path = new_file(kind, tmp_path / f"{kind}.toml")
        loader(kind)(path)
        path.write_text("precious", encoding="utf-8")
        with pytest.raises(rw.SceneError.__mro__[1], match="exists and is kept"):
            new_file(kind, path)
        assert path.read_text(encoding="utf-8") == "precious"
        new_file(kind, path, replace=True)
        loader(kind)(path)


@given(st.binary(max_size=300))
def test_any_bytes_give_a_scene_error(tmp_path_factory, data):
    path = tmp_path_factory.mktemp("bytes") / "scene.toml"
    path.write_bytes(data)
    for load in (rw.load_scene, load_scan, load_observation):
        with pytest.raises(rw.SceneError):
            load(path)


@given(st.data())
def test_a_mutated_scene_gives_a_scene_or_a_scene_error(project, tmp_path_factory, data):
    text = (project / "scenes" / "first-light.toml").read_text(encoding="utf-8")
    place = data.draw(st.integers(0, len(text) - 1))
    length = data.draw(st.integers(0, 12))
    inserted = data.draw(st.text(max_size=6))
    path = tmp_path_factory.mktemp("mutated") / "scene.toml"
    path.write_text(text[:place] + inserted + text[place + length :], encoding="utf-8", errors="replace")
    with contextlib.suppress(rw.SceneError):
        assert isinstance(rw.load_scene(path), rw.Scene)


KEYS = st.one_of(
    st.text("abcdefghij_-0123456789", min_size=1, max_size=4),
    st.text("ab. #=[]'ü", min_size=1, max_size=4).map(lambda text: json.dumps(text, ensure_ascii=False)),
)
SCALARS = st.sampled_from(
    [
        "1",
        "true",
        "1.5e3",
        '"a # [b] = \\" c"',
        "'x=]'",
        '"""two\nlines"""',
        "'''q\n\n'''",
        "1979-05-27T07:32:00Z",
    ]
)
VALUES = st.recursive(
    SCALARS,
    lambda inner: st.one_of(
        st.lists(inner, max_size=3).map(lambda items: "[\n" + ", # no\n".join(items) + "\n]"),
        st.dictionaries(KEYS, SCALARS.filter(lambda text: "\n" not in text), max_size=3).map(
            lambda table: "{ " + ", ".join(f"{key} = {value}" for key, value in table.items()) + " }"
        ),
    ),
    max_leaves=6,
)


@given(st.lists(st.tuples(st.sampled_from(["", "[a]", "[[b]]", "[c.d]"]), KEYS, VALUES), max_size=8))
def test_lines_are_those_of_the_keys(entries):
    """Documents of known layout: the line of every key is the line that it was written on, and every key has one."""
    lines, expected = [], {}
    prefix, count, seen = (), 0, set()
    for header, key, value in entries:
        if header and (header == "[[b]]" or header not in seen):
            seen.add(header)
            lines += ["# a comment = [x]", "", header]
            name = header.strip("[]")
            prefix = ("b", count) if name == "b" else tuple(name.split("."))
            count += name == "b"
        plain = next(iter(tomllib.loads(f"{key} = 0")))
        if (*prefix, plain) in expected:
            continue
        expected[(*prefix, plain)] = len(lines) + 1
        lines += f"{key} = {value} # why".split("\n")
    text = "\n".join(lines) + "\n"
    try:
        document = tomllib.loads(text)
    except tomllib.TOMLDecodeError:
        return  # a key that a table of the same name forbids
    found = key_lines(text)
    for path, line in expected.items():
        assert found[path] == line
    for path in _paths(document):
        assert path in found


def _paths(data, path=()):
    items = data.items() if isinstance(data, dict) else enumerate(data) if isinstance(data, list) else ()
    for key, inner in items:
        yield (*path, key)
        yield from _paths(inner, (*path, key))


def test_replace_changes_one_value_and_validates(project):
    scene = rw.load_scene(project / "scenes" / "first-light.toml")
    assert scene.replace("view.inclination", "60 deg").inclination == pytest.approx(math.radians(60.0))
    assert scene.replace("emitter.profile.inner", "3 M").emitters[0][1].edges[0] == 3.0
    assert scene.replace("emitter.flow", {"kind": "static"}).emitters[0][1].flow != scene.emitters[0][1].flow
    assert scene.inclination == pytest.approx(math.radians(25.0))
    for key, value, words in (
        ("view.inclination", "200 deg", "at most 180 deg"),
        ("view.inclinaton", "20 deg", "did you mean 'inclination'"),
        ("emitter.2.profile.inner", "3 M", "is no key of this scene"),
        ("emitter.²", "3 M", "nothing reads this key"),
        ("emitter." + "9" * 5000, "3 M", "nothing reads this key"),
    ):
        with pytest.raises(rw.SceneError, match=words):
            scene.replace(key, value)


def test_a_scene_survives_pickling_and_resolves_to_plain_json(project):
    scene = rw.load_scene(project / "scenes" / "two-sources.toml")
    again = pickle.loads(pickle.dumps(scene))
    assert again.resolved() == scene.resolved()
    resolved = json.loads(json.dumps(scene.resolved()))
    assert resolved["view"]["orders"] == 3
    assert resolved["emitter"][1]["opaque"] is False


def test_theta_g_has_its_published_value():
    # 6.5e9 M☉ at 16.8 Mpc: 3.81899 µas (computed from the IAU 2015 nominal mass parameter); 4.297e6 M☉ at 8277 pc: 5.12433 µas.
    assert theta_g(6.5e9, 16.8) == pytest.approx(3.81899, abs=5e-6)
    assert theta_g(4.297e6, 8.277e-3) == pytest.approx(5.12433, abs=5e-6)
    assert mass_from(theta_g(6.5e9, 16.8), 16.8) == pytest.approx(6.5e9, rel=1e-14)


def test_ranges_draw_their_priors(project):
    plan = load_scan(project / "scenes" / "first-scan.toml")
    cosine, inner = plan.vary[0], plan.vary[1]
    u = np.array([0.0, 0.25, 0.5, 0.999])
    first, last = math.cos(math.radians(5.0)), math.cos(math.radians(45.0))
    np.testing.assert_allclose(np.cos(cosine.numbers(cosine.draw(u))), first + u * (last - first), rtol=1e-12)
    np.testing.assert_allclose(inner.numbers(inner.draw(u)), 2.0 + 2.0 * u, rtol=1e-12)
    flow = next(one for one in plan.vary if one.key == "emitter.flow")
    assert flow.numbers(flow.draw(np.array([0.1, 0.4, 0.9]))).tolist() == [0.0, 1.0, 2.0]
    assert flow.labels == ("circular", "blend", "radial fall")


def test_loading_is_light():
    code = "import sys, ringwright as rw; rw.load_scene(sys.argv[1]); print(sorted(sys.modules))"
    run = subprocess.run(
        [sys.executable, "-c", code, "scenes/first-light.toml"], capture_output=True, text=True, check=True
    )
    for heavy in ("matplotlib", "scipy", "astropy.wcs", "pandas", "numba"):
        assert f"'{heavy}'" not in run.stdout, heavy


def test_what_the_observation_starter_offers_in_comments_can_be_taken(tmp_path):
    text = new_file("observation", tmp_path / "ring.toml").read_text(encoding="utf-8")
    lines = [re.sub(r'^# (?=\[|\w+ = |")', "", line) for line in text.splitlines()]
    one_prior = [line for line in lines if not line.startswith("theta_g =")]
    (tmp_path / "ring.toml").write_text("\n".join(one_prior), encoding="utf-8")
    observation = load_observation(tmp_path / "ring.toml")
    assert observation.mass is not None
    assert list(observation.scene_priors) == ["view.inclination"]


def test_the_schema_names_every_key_of_a_scene():
    text = json.dumps(scene_schema())
    for name in _all_keys(SceneFile):
        assert f'"{name}"' in text


@pytest.mark.parametrize("model", [SceneFile, ScanFile, ObservationFile])
def test_the_page_about_files_names_every_key(project, model):
    page = (project / "docs" / "scene-files.md").read_text(encoding="utf-8")
    for name in _all_keys(model):
        assert f"{name}`" in page, name


def _all_keys(model):
    found = set()
    for name, info in model.model_fields.items():
        inside = _models_in(info.annotation)
        found |= set().union(*map(_all_keys, inside)) if inside else {info.alias or name}
    return found
