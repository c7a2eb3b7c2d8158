"""Scan and observation files: each mistake at its line, and the choices that have no default."""

from __future__ import annotations

import pytest

import ringwright as rw
from ringwright.observation import load_observation
from ringwright.scanfile import load_scan

BASE = """name = "base"
[view]
inclination = "25 deg"
field = "40 M"
pixels = 64
[[emitter]]
kind = "thin-disk"
profile = { kind = "power-law", inner = "2.6 M", outer = "50 M", slope = 3.7 }
flow = { kind = "circular" }
"""
SCAN = """name = "scan"
scene = "base.toml"
[sampling]
method = "sobol"
scenes = 16
[[vary]]
key = "emitter.profile.inner"
range = ["2 M", "4 M"]
[[vary]]
key = "view.inclination"
cosine_range = ["0 deg", "60 deg"]
"""
SCAN_WRONG = [
    (
        'range = ["2 M", "4 M"]',
        "",
        6,
        "vary.0",
        "exactly one of range, log_range, cosine_range, list; none stands here",
    ),
    ('"4 M"]\n', '"4 M"]\nlist = ["2 M"]\n', 6, "vary.0", "range and list stand here"),
    ('["2 M", "4 M"]', '["4 M", "2 M"]', 8, "vary.0.range", "wrong way round"),
    ('["2 M", "4 M"]', '["2 M", "4 deg"]', 8, "vary.0.range", "different units"),
    ('["2 M", "4 M"]', '["2 M", 4.0]', 8, "vary.0.range", "different units"),
    ('["2 M", "4 M"]', '["1 M", "4 M"]', 8, "vary.0.range", "at least 2 M is accepted"),
    ('range = ["2 M", "4 M"]', "log_range = [0.0, 4.0]", 8, "vary.0.log_range", "starts above 0"),
    ('range = ["2 M", "4 M"]', 'cosine_range = ["2 M", "4 M"]', 8, "vary.0.cosine_range", "one of angles"),
    ('["2 M", "4 M"]', '["2 M", "3 M", "4 M"]', 8, "vary.0.range", "2"),
    ('"emitter.profile.inner"', '"emitter.profile.innr"', 7, "vary.0.key", "did you mean 'inner'"),
    (
        '"emitter.profile.inner"',
        '"emitter.3.profile.inner"',
        7,
        "vary.0.key",
        "is no key of the base scene; emitters count from emitter.0",
    ),
    ('"view.inclination"', '"emitter.profile.inner"', 10, "vary.1.key", "varies twice"),
    ('method = "sobol"', 'method = "grid"', 8, "vary.0.range", "needs points"),
    ("scenes = 16\n", "", 3, "sampling", "needs scenes"),
    ("scenes = 16", "scenes = 0", 5, "sampling.scenes", "at least 1 is"),
    ("scenes = 16", "scene = 16", 5, "sampling.scene", "did you mean 'scenes'"),
    ('"base.toml"', '"absent.toml"', 2, "scene", "cannot be read: No such file"),
    ('"emitter.profile.inner"', '"emitter.²"', 7, "vary.0.key", "is no key of the base scene"),
    ('"emitter.profile.inner"', '"hole.mass"', 7, "vary.0.key", "changes nothing in a scan"),
    ('"emitter.profile.inner"', '"view.field"', 7, "vary.0.key", "changes nothing in a scan"),
    ('"base.toml"', f'"{"a" * 5000}"', 2, "scene", "name too long"),
    ('"4 M"]\n', '"4 M"]\nlabels = ["a", "b"]\n', 9, "vary.0.labels", "nothing reads labels of a range"),
    ('"4 M"]\n', '"4 M"]\npoints = 4\n', 9, "vary.0.points", "nothing reads points here"),
    ('["2 M", "4 M"]', '["2 M", nan]', 8, "vary.0.range", "nan is not finite"),
    ('["2 M", "4 M"]', f"[0x{'f' * 400}, 3.0]", 8, "vary.0.range", "too large for a number"),
    ('["2 M", "4 M"]', '["2 M", true]', 8, "vary.0.range", "true is not a number"),
    ('["2 M", "4 M"]', '["2 M"]', 8, "vary.0.range", "1 entries; 2 are due"),
    ('["2 M", "4 M"]', '["2 M", "60 M"]', 8, "vary.0.range", "emitter.profile.inner = '60 M'"),
    ('["0 deg", "60 deg"]', '["0 deg", "200 deg"]', 11, "vary.1.cosine_range", "angles from 0 to 180 deg"),
    ('["0 deg", "60 deg"]', '["-20 deg", "20 deg"]', 11, "vary.1.cosine_range", "angles from 0 to 180 deg"),
    ("scenes = 16", 'scenes = 16\n[image]\nfield = "1e9 M"', 7, "image.field", "at most 1e+06 M"),
]
OBSERVATION = """name = "ring"
[diameter]
value = "42 uas"
error = "3 uas"
resolution = "20 uas"
estimator = "peak-ring"
[distance]
value = "16.8 Mpc"
error = { plus = "0.8 Mpc", minus = "0.7 Mpc" }
"""
MASS = '[prior]\nmass = { value = "6e9 solMass", error = "1e9 solMass" }\n'
OBSERVATION_WRONG = [
    ('resolution = "20 uas"\n', "", 2, "diameter.resolution", "the choice moves the mass by 10 to 20 %"),
    ('"20 uas"', '["25 uas", "15 uas"]', 5, "diameter.resolution", "wrong way round"),
    ('"20 uas"', "20", 5, "diameter.resolution", "has no unit"),
    ('"20 uas"', '"-20 uas"', 5, "diameter.resolution", "is not positive"),
    ('"20 uas"', '["1 uas", "2 uas", "3 uas"]', 5, "diameter.resolution", "one FWHM, an interval of two"),
    ('"3 uas"', '"-3 uas"', 4, "diameter.error", "is not positive"),
    ('"3 uas"', '"3 Mpc"', 4, "diameter.error", "is not a sky angle"),
    ('minus = "0.7 Mpc"', 'minus = "-0.7 Mpc"', 9, "distance.error.minus", "is not positive"),
    (', minus = "0.7 Mpc"', "", 9, "distance.error", "write one error, or"),
    ('"peak-ring"', '"my-ring"', 6, "diameter.estimator", "accepted: peak-ring"),
    ('estimator = "peak-ring"\n', "", 2, "diameter.estimator", 'write it like estimator = "peak-ring"'),
    ('"20 uas"', "[]", 5, "diameter.resolution", "one FWHM, an interval of two"),
    ('"3 uas"', "inf", 4, "diameter.error", "has no unit"),
    ('"16.8 Mpc"', '"16.8 mpc"', 8, "distance.value", 'megaparsecs are written "16.8 Mpc"'),
    ('"42 uas"', '"-42 uas"', 3, "diameter.value", "is not positive"),
    ("[distance]", "[distanc]", 7, "distanc", "did you mean 'distance'"),
]


@pytest.fixture
def folder(tmp_path):
    (tmp_path / "base.toml").write_text(BASE, encoding="utf-8")
    return tmp_path


def problems(load, path, text):
    path.write_text(text, encoding="utf-8")
    with pytest.raises(rw.SceneError) as caught:
        load(path)
    return caught.value.problems


@pytest.mark.parametrize(
    ("old", "new", "line", "key", "words"), SCAN_WRONG, ids=[w[4][:30] for w in SCAN_WRONG]
)
def test_each_problem_of_a_scan_has_its_place(folder, old, new, line, key, words):
    assert old in SCAN
    found = problems(load_scan, folder / "scan.toml", SCAN.replace(old, new, 1))
    matching = [problem for problem in found if problem.key == key]
    assert matching, [str(problem) for problem in found]
    assert matching[0].line == line
    assert words in matching[0].text


def test_problems_of_the_scan_and_of_its_base_come_together_and_nothing_hides_another(folder):
    (folder / "base.toml").write_text(BASE.replace('"25 deg"', "25"), encoding="utf-8")
    text = (
        SCAN.replace("scenes = 16\n", "")
        .replace('["2 M", "4 M"]', '["4 M", "2 M"]')
        .replace("name", "nam", 1)
    )
    found = problems(load_scan, folder / "scan.toml", text)
    assert {(problem.file.split("/")[-1], problem.key) for problem in found} == {
        ("base.toml", "view.inclination"),
        ("scan.toml", "nam"),
        ("scan.toml", "name"),
        ("scan.toml", "sampling"),
        ("scan.toml", "vary.0.range"),
    }


def test_problems_of_an_observation_come_together(tmp_path):
    text = (
        OBSERVATION.replace('resolution = "20 uas"\n', "").replace('"16.8 Mpc"', "16.8")
        + "[prior]\nmas = 1\n"
    )
    found = problems(load_observation, tmp_path / "ring.toml", text)
    assert [problem.key for problem in found] == ["diameter.resolution", "distance.value", "prior.mas"]


@pytest.mark.parametrize(
    ("value", "error", "words"),
    [
        ("inf", "1.0", "inf is not finite"),
        ("1.0", "nan", "nan is not finite"),
        (f"0x{'f' * 400}", "1.0", "too large"),
    ],
)
def test_a_prior_on_a_scene_parameter_is_finite(tmp_path, value, error, words):
    text = f'{OBSERVATION}[prior.scene]\n"emitter.profile.slope" = {{ value = {value}, error = {error} }}\n'
    (problem,) = problems(load_observation, tmp_path / "ring.toml", text)
    assert problem.line == 11
    assert words in problem.text


def test_a_wrong_base_scene_is_reported_with_its_own_file(folder):
    (folder / "base.toml").write_text(BASE.replace('"25 deg"', "25"), encoding="utf-8")
    (problem,) = problems(load_scan, folder / "scan.toml", SCAN)
    assert problem.file.endswith("base.toml")
    assert problem.line == 3


def test_a_count_that_is_no_power_of_two_gets_a_notice(folder):
    (folder / "scan.toml").write_text(SCAN.replace("16", "20"), encoding="utf-8")
    assert load_scan(folder / "scan.toml").notices == (
        "20 Sobol scenes are less even than a power of two such as 16 or 32",
    )


@pytest.mark.parametrize(
    ("old", "new", "line", "key", "words"), OBSERVATION_WRONG, ids=[w[4][:30] for w in OBSERVATION_WRONG]
)
def test_each_problem_of_an_observation_has_its_place(tmp_path, old, new, line, key, words):
    assert old in OBSERVATION
    found = problems(load_observation, tmp_path / "ring.toml", OBSERVATION.replace(old, new, 1))
    matching = [problem for problem in found if problem.key == key]
    assert matching, [str(problem) for problem in found]
    assert matching[0].line == line
    assert words in matching[0].text


def test_a_prior_on_the_mass_needs_a_distance(tmp_path):
    text = OBSERVATION[: OBSERVATION.index("[distance]")] + MASS
    (problem,) = problems(load_observation, tmp_path / "ring.toml", text)
    assert problem.key == "prior.mass"
    assert "needs a distance" in problem.text


def test_priors_on_mass_distance_and_theta_g_are_refused_together(tmp_path):
    text = OBSERVATION + MASS + 'theta_g = { value = "3.8 uas", error = "0.4 uas" }\n'
    (problem,) = problems(load_observation, tmp_path / "ring.toml", text)
    assert problem.key == "prior.theta_g"
    assert "three statements about two numbers" in problem.text


def test_the_good_files_are_good(folder):
    (folder / "scan.toml").write_text(SCAN, encoding="utf-8")
    plan = load_scan(folder / "scan.toml")
    assert [(one.key, one.unit) for one in plan.vary] == [
        ("emitter.profile.inner", "M"),
        ("view.inclination", "rad"),
    ]
    (folder / "ring.toml").write_text(OBSERVATION + MASS, encoding="utf-8")
    observation = load_observation(folder / "ring.toml")
    assert observation.distance.plus.to_value("Mpc") == pytest.approx(0.8)
    assert observation.mass.value.to_value("solMass") == pytest.approx(6e9)
    for text, count in (('"none"', 0), ('["15 uas", "25 uas"]', 2)):
        (folder / "ring.toml").write_text(OBSERVATION.replace('"20 uas"', text), encoding="utf-8")
        assert len(load_observation(folder / "ring.toml").resolution) == count
