"""Every way in which a scene file can be wrong: the file, the line, the key, what was given and what is accepted."""

from __future__ import annotations

import re

import pytest

import ringwright as rw

GOOD = """name = "nucleus"
[hole]
mass = "9.2e9 solMass"
distance = "21 Mpc"
[view]
inclination = "25 deg"
frequency = "230 GHz"
field = "200 uas"
pixels = 64
[source]
total_flux = "0.6 Jy"
[[emitter]]
kind = "thin-disk"
profile = { kind = "power-law", inner = "2.6 M", outer = "50 M", slope = 3.7 }
flow = { kind = "circular" }
"""
SECOND = """[[emitter]]
kind = "thin-disk"
profile = { kind = "gaussian-ring", radius = "5 M", width = "1 M" }
flow = { kind = "static" }
"""

# What to change, the line and key of the problem, and words of its sentence.
WRONG = [
    ('"25 deg"', "25", 6, "view.inclination", 'no unit; write it as text with one, like "30 deg"'),
    ('"25 deg"', '"25"', 6, "view.inclination", "has no unit"),
    ('"25 deg"', '"25 degs of arc"', 6, "view.inclination", "is not a unit"),
    ('"25 deg"', '"25 Mpc"', 6, "view.inclination", "is not an angle"),
    ('"25 deg"', '"-1 deg"', 6, "view.inclination", "at least 0 deg is accepted"),
    ('"25 deg"', '"181 deg"', 6, "view.inclination", "at most 180 deg is accepted"),
    ('"25 deg"', '"nan deg"', 6, "view.inclination", "is not finite"),
    ('"25 deg"', '"25,5 deg"', 6, "view.inclination", "is not a number and a unit"),
    ('"25 deg"', '"25 10 deg"', 6, "view.inclination", "is not a number and a unit"),
    ('"230 GHz"', '"230 GHZ"', 7, "view.frequency", "did you mean 'GHz'?"),
    ('"230 GHz"', '"1.3 mm"', 7, "view.frequency", 'a wavelength; write the frequency, "230.6 GHz"'),
    ('"21 Mpc"', '"21 mpc"', 4, "hole.distance", 'megaparsecs are written "21 Mpc"'),
    ('"21 Mpc"', '"1e-320 Mpc"', 3, "hole.mass", "check the units of both"),
    ('"200 uas"', '"1e306 arcsec"', 8, "view.field", "is not finite in uas"),
    ('"200 uas"', '"200 arcsec"', 8, "view.field", "0.01 M to 1e+06 M is accepted (check the units)"),
    ('"200 uas"', '"1e-3 M"', 8, "view.field", "0.01 M to 1e+06 M is accepted"),
    ('"50 M"', '"1e308 M"', 14, "emitter.0.profile.outer", "at most 1e+06 M is accepted"),
    ('field = "200 uas"\n', "", 5, "view.field", 'write it like field = "170 uas"'),
    ("pixels = 64", f"pixels = 0x{'f' * 4000}", 9, "view.pixels", "at most 16384 is"),
    ("pixels = 64", "pixels = 1979-05-27", 9, "view.pixels", "1979-05-27 is not a whole number"),
    ('name = "nucleus"', 'name = "nucleus"\ntotal_flux = "1 Jy"', 2, "total_flux", "it belongs to source"),
    ('distance = "21 Mpc"', 'distance = "21 Mpc"\nname = "x"', 5, "hole.name", "before the first [table]"),
    (
        'kind = "thin-disk"',
        'kind = "thin-disk"\ninner = "3 M"',
        14,
        "emitter.0.inner",
        "belongs to emitter.profile",
    ),
    (
        "slope = 3.7",
        'slope = 3.7, width = "1 M"',
        14,
        "emitter.0.profile.width",
        "this kind does not read this key",
    ),
    (
        'kind = "thin-disk"',
        'kind = "thin-disk"\nstrength = 1e-300',
        14,
        "emitter.0.strength",
        "1e-12 to 1e+12",
    ),
    ('"25 deg"', "true", 6, "view.inclination", "is not an angle"),
    (
        '"2.6 M"',
        '"2.6 rg"',
        14,
        "emitter.0.profile.inner",
        'gravitational radii are written M here, like "2.6 M"',
    ),
    ('"2.6 M"', '"1.9 M"', 14, "emitter.0.profile.inner", "at least 2 M is accepted"),
    ('"2.6 M"', '"2.6 uas"', 14, "emitter.0.profile.inner", "is not a length"),
    ('"2.6 M"', '"60 M"', 14, "emitter.0.profile", "60"),
    ("slope = 3.7", "slop = 3.7", 14, "emitter.0.profile.slop", "did you mean 'slope'"),
    (", slope = 3.7", "", 14, "emitter.0.profile.slope", "is missing"),
    ("slope = 3.7", 'slope = "3.7"', 14, "emitter.0.profile.slope", "is not a number"),
    ("slope = 3.7", "slope = inf", 14, "emitter.0.profile.slope", "is not a finite number"),
    ('"power-law"', '"power-lav"', 14, "emitter.0.profile.kind", "did you mean 'power-law'"),
    ('kind = "thin-disk"', 'kind = "thick-disk"', 13, "emitter.0.kind", "did you mean 'thin-disk'"),
    ('{ kind = "circular" }', "{ }", 15, "emitter.0.flow", "has no kind"),
    ('{ kind = "circular" }', '"circular"', 15, "emitter.0.flow", "table"),
    (
        '{ kind = "circular" }',
        '{ kind = "blend", orbit_fraction = 1.2, fall_fraction = 0.5 }',
        15,
        "emitter.0.flow.orbit_fraction",
        "at most 1 is",
    ),
    ("pixels = 64", "pixels = 4", 9, "view.pixels", "at least 8 is"),
    ("pixels = 64", "pixels = 64.5", 9, "view.pixels", "is not a whole number"),
    ("pixels = 64", "pixels = 64\norders = 7", 10, "view.orders", "at most 6 is"),
    ("pixels = 64", "pixels = 64\npixel = 3", 10, "view.pixel", "did you mean 'pixels'"),
    ('distance = "21 Mpc"', "", 3, "hole.mass", "needs a distance"),
    (
        'distance = "21 Mpc"',
        'distance = "21 Mpc"\ntheta_g = "4 uas"',
        3,
        "hole.mass",
        "theta_g stands here already",
    ),
    ('mass = "9.2e9 solMass"\ndistance = "21 Mpc"', "", 7, "view.field", "needs theta_g"),
    ('"0.6 Jy"', '"0.6 Jy"\nright_ascension = "10 deg"', 10, "source", "go together"),
    ('"0.6 Jy"', '"0 Jy"', 11, "source.total_flux", "more than 0 Jy"),
    ('name = "nucleus"', 'name = "a/b"', 1, "name", "cannot name files"),
    ('name = "nucleus"', "name = 3", 1, "name", "is not text"),
    ('kind = "thin-disk"', 'kind = "thin-disk"\nstrength = -1.0', 14, "emitter.0.strength", "at least 0 is"),
    ('kind = "thin-disk"', 'kind = "thin-disk"\nstrength = 0.0', 12, "emitter", "every strength is 0"),
    (
        'kind = "thin-disk"',
        'kind = "thin-disk"\nspectral_index = 99.0',
        14,
        "emitter.0.spectral_index",
        "at most 10 is",
    ),
    (
        'flow = { kind = "circular" }\n',
        'opaque = true\nflow = { kind = "circular" }\n' + SECOND,
        15,
        "emitter.0.opaque",
        "stand alone",
    ),
    (
        '{ kind = "power-law", inner = "2.6 M", outer = "50 M", slope = 3.7 }',
        '{ kind = "page-thorne", outer = "30 M" }',
        11,
        "source.total_flux",
        "bolometric image has no flux density",
    ),
    (
        '{ kind = "power-law", inner = "2.6 M", outer = "50 M", slope = 3.7 }',
        '{ kind = "table", file = "absent.csv" }',
        14,
        "emitter.0.profile",
        "absent.csv",
    ),
    ("[hole]", '[hole]\nspacetime = "schwartzschild"', 3, "hole.spacetime", "did you mean 'schwarzschild'"),
]


@pytest.fixture
def path(tmp_path):
    return tmp_path / "nucleus.toml"


def problems(path, text):
    path.write_text(text, encoding="utf-8")
    with pytest.raises(rw.SceneError) as caught:
        rw.load_scene(path)
    return caught.value.problems


@pytest.mark.parametrize(
    ("old", "new", "line", "key", "words"), WRONG, ids=[f"{w[3]}: {w[1][:24]}" for w in WRONG]
)
def test_each_problem_has_its_line_its_key_and_its_words(path, old, new, line, key, words):
    assert old in GOOD
    found = problems(path, GOOD.replace(old, new, 1))
    matching = [problem for problem in found if problem.key == key]
    assert matching, [str(problem) for problem in found]
    assert matching[0].line == line
    assert words in matching[0].text
    assert matching[0].file == str(path)


def test_the_good_file_is_good(path):
    path.write_text(GOOD, encoding="utf-8")
    assert rw.load_scene(path).name == "nucleus"


def test_all_problems_come_at_once_by_line(path):
    text = (
        GOOD.replace('"25 deg"', "25")
        .replace("slope", "slop")
        .replace("mass", "mas", 1)
        .replace("64", "2", 1)
    )
    found = problems(path, text)
    assert len(found) >= 5
    assert [problem.line for problem in found] == sorted(problem.line for problem in found)
    message = str(rw.SceneError(found))
    for problem in found:
        assert f"{path}:{problem.line}: {problem.key}" in message
    assert "    6 | inclination = 25" in message


def test_values_that_do_not_go_together_are_found_beside_values_that_are_wrong(path):
    text = GOOD.replace('"25 deg"', "25").replace('"2.6 M"', '"60 M"').replace('distance = "21 Mpc"\n', "")
    assert [problem.key for problem in problems(path, text)] == [
        "hole.mass",
        "view.inclination",
        "emitter.0.profile",
    ]


def test_the_source_line_is_the_line_whatever_stands_before_it(path):
    (problem,) = problems(
        path, "# a line\u2028separator, which ends no line of TOML\n" + GOOD.replace('"25 deg"', "25")
    )
    assert (problem.line, problem.source) == (7, "inclination = 25")


@pytest.mark.parametrize("text", ["x = " + "9" * 5000, "x = " + "[" * 3000, "x = " + "{a = " * 3000])
def test_monstrous_documents_are_refused_in_words(path, text):
    (problem,) = problems(path, text)
    assert "more digits than can be read" in problem.text or "nested too deeply" in problem.text


def test_a_byte_order_mark_is_no_problem(path):
    path.write_bytes(b"\xef\xbb\xbf" + GOOD.encode())
    assert rw.load_scene(path).name == "nucleus"


@pytest.mark.parametrize(
    ("old", "new"),
    [
        ('"25 deg"', '"25deg"'),
        ('"25 deg"', '"25°"'),
        ('"25 deg"', '"25 degrees"'),
        ('"9.2e9 solMass"', '"9.2e9 Msun"'),
        ('"9.2e9 solMass"', '"9.2e9 M☉"'),
        ('"21 Mpc"', '"21000 kpc"'),
        ('"200 uas"', '"200 µas"'),
        ('"200 uas"', '"0.2mas"'),
        ('"2.6 M"', '"2.6M"'),
        ('"0.6 Jy"', '"600 mJy"'),
    ],
)
def test_quantities_are_read_as_people_write_them(path, old, new):
    path.write_text(GOOD, encoding="utf-8")
    plain = rw.load_scene(path)
    path.write_text(GOOD.replace(old, new, 1), encoding="utf-8")
    other = rw.load_scene(path)
    for name in ("inclination", "field_m"):
        assert getattr(other, name) == pytest.approx(getattr(plain, name), rel=1e-14)
    for name in ("theta_g", "total_flux"):
        assert getattr(other, name).value == pytest.approx(getattr(plain, name).value, rel=1e-14)
    assert other.emitters == plain.emitters


def test_a_missing_table_is_named(path):
    found = problems(path, 'name = "x"\n')
    assert {problem.key for problem in found} == {"view", "emitter"}


def test_what_is_not_toml_or_not_text_is_said_with_its_line(path):
    (problem,) = problems(path, GOOD.replace('"25 deg"', '"25 deg'))
    assert problem.line == 6
    assert "is not TOML" in problem.text
    assert problem.source == GOOD.split("\n")[5].replace('"25 deg"', '"25 deg')
    (problem,) = problems(path, GOOD.replace('"25 deg"', '"25 \x1b[2J deg"'))
    assert problem.source.isprintable(), "a terminal would obey the control characters of a broken file"
    path.write_bytes(b"\xff\xfe\x00")
    with pytest.raises(rw.SceneError, match="is not text in UTF-8"):
        rw.load_scene(path)


def test_absent_files_and_folders_are_refused(tmp_path):
    with pytest.raises(rw.SceneError, match=r"absent\.toml: cannot be read: No such file"):
        rw.load_scene(tmp_path / "absent.toml")
    with pytest.raises(rw.SceneError, match="Is a directory"):
        rw.load_scene(tmp_path)


def test_a_table_file_is_found_beside_the_scene(path, tmp_path):
    (tmp_path / "disk.csv").write_text("radius,brightness\n3,1\n6,2\n12,0.5\n", encoding="utf-8")
    profile = '{ kind = "table", file = "disk.csv" }'
    path.write_text(re.sub(r"\{ kind = .power-law.*\}", profile, GOOD), encoding="utf-8")
    assert rw.load_scene(path).emitters[0][1].edges[0] == 3.0
    (tmp_path / "disk.csv").write_text("radius,brightness\n6,1\n3,2\n", encoding="utf-8")
    with pytest.raises(rw.SceneError, match=r"emitter\.0\.profile"):
        rw.load_scene(path)
