"""`rw.compare` from files and from objects: units come off, and what cannot be used is refused with a
sentence.

Invented observations; common practice, no source.
"""

import json
import math

import pytest
from synthetic_scans import family_table, parameter, table_of

import ringwright as rw
from ringwright.errors import InputError
from ringwright.observation import load_observation
from ringwright.scenes import new_file

TEXT = """
name = "made-up"
[diameter]
value = "0.0421 mas"
error = { plus = "2.5 uas", minus = "3.1 uas" }
resolution = RESOLUTION
estimator = "peak-ring"
[distance]
value = "16800 kpc"
error = "0.8 Mpc"
"""


@pytest.fixture
def observation(tmp_path):
    def write(extra="", resolution='"20 uas"'):
        path = tmp_path / "observation.toml"
        path.write_text(TEXT.replace("RESOLUTION", resolution) + extra, encoding="utf-8")
        return path

    return write


def test_units_come_off_once(observation):
    seen = rw.compare(observation(), family_table()).observation
    assert seen.diameter.mode == pytest.approx(42.1)
    assert (seen.diameter.plus, seen.diameter.minus) == pytest.approx((2.5, 3.1))
    assert seen.distance.mode == pytest.approx(16.8)
    assert seen.resolution == pytest.approx((20.0,))


@pytest.mark.parametrize(
    ("resolution", "expected"),
    [('"none"', ()), ('"20 uas"', (20.0,)), ('["15 uas", "25 uas"]', (15.0, 25.0))],
)
def test_every_kind_of_resolution_is_understood(observation, resolution, expected):
    assert rw.compare(observation(resolution=resolution), family_table()).observation.resolution == expected


def test_units_of_value_and_error_that_differ_tenfold_are_warned_of(observation):
    said = [
        item for item in rw.compare(observation(), family_table()).warnings if item.code == "unlike-units"
    ]
    assert [item.text.split(":")[0] for item in said] == ["Diameter", "Distance"]
    assert "16800 kpc with an error of 0.8 Mpc" in said[1].text
    path = observation()
    text = path.read_text(encoding="utf-8").replace("0.0421 mas", "42.1 µas").replace("16800 k", "16.8 M")
    path.write_text(text, encoding="utf-8")
    assert load_observation(path).unlike_units == ()


def test_numbers_of_the_commented_example_are_named(tmp_path):
    path = new_file("observation", tmp_path / "mine.toml")
    first = rw.compare(path, family_table()).warnings[0]
    assert first.code == "example-numbers"
    assert "diameter and the distance" in first.text
    path.write_text(path.read_text(encoding="utf-8").replace("44.7 uas", "31.5 uas"), encoding="utf-8")
    assert "The distance of this observation" in rw.compare(path, family_table()).warnings[0].text
    path.write_text(path.read_text(encoding="utf-8").replace("19.3 Mpc", "13.4 Mpc"), encoding="utf-8")
    assert "example-numbers" not in [item.code for item in rw.compare(path, family_table()).warnings]


def test_path_object_and_product_give_the_same(observation, tmp_path):
    path = observation()
    base = {"hole": {"spacetime": "schwarzschild"}}
    table = family_table(base=base, provenance={"resolved": json.dumps(base)})
    product = table.save(tmp_path / "scan.h5")
    first = rw.compare(path, table).to_json()
    assert rw.compare(load_observation(path), product).to_json() == first
    assert rw.compare(str(path), str(product)).to_json() == first


def test_estimates_are_astropy_quantities(observation):
    answer = rw.compare(observation(), family_table())
    assert answer.ring_only.theta_g.value.unit == "uas"
    assert answer.ring_only.mass.value.unit == "solMass"
    assert answer.conversion_factor.value.unit.is_equivalent("")


def test_json_can_be_written(observation):
    prior = '[prior]\nmass = { value = "6e9 solMass", error = "1e9 solMass" }\n'
    answer = rw.compare(observation(prior), family_table(), family_table(family="other"))
    assert json.loads(json.dumps(answer.to_json(), allow_nan=False))["combined"]["mass"]["unit"] == "solMass"


def test_a_prior_on_the_inclination_is_an_angle(observation):
    angle = [math.radians(5 * i) for i in range(1, 17)]
    varied = parameter("view.inclination", angle, (0.0, math.pi / 2), "cosine_range", "rad")
    table = table_of([11.0] * 16, parameters=[varied])
    prior = '[prior.scene]\n"view.inclination" = { value = "17 deg", error = "5 deg" }\n'
    used = rw.compare(observation(prior), table).families[0].replaced[0]
    assert used.new == "17° ± 5°"
    bare = '[prior.scene]\n"view.inclination" = { value = 17.0, error = 5.0 }\n'
    with pytest.raises(InputError, match="an angle, such as"):
        rw.compare(observation(bare), table)


def test_a_scan_given_twice_is_refused(observation, tmp_path):
    table = family_table(provenance={"resolved": "{}", "source_text": "name = 1"})
    copies = [table.save(tmp_path / f"{name}.h5") for name in ("one", "two")]
    with pytest.raises(InputError, match=r"two\.h5 is given twice"):
        rw.compare(observation(), *copies)
    with pytest.raises(InputError, match="given twice"):
        rw.compare(observation(), table, table)


def test_families_that_share_a_name_are_told_apart(observation):
    answer = rw.compare(observation(), family_table(name="near"), family_table(name="far", seed=4))
    assert [item.family for item in answer.families] == ["made up (near)", "made up (far)"]


def test_a_comparison_needs_a_scan(observation):
    with pytest.raises(InputError, match="at least one scan"):
        rw.compare(observation())


def test_a_file_that_is_no_scan_is_refused(observation, tmp_path):
    foreign = tmp_path / "foreign.h5"
    foreign.write_bytes(b"not a product")
    with pytest.raises(InputError, match=r"foreign\.h5"):
        rw.compare(observation(), foreign)


def test_the_summary_is_what_printing_shows(observation):
    answer = rw.compare(observation(), family_table())
    assert "A ring diameter is not a shadow diameter" in str(answer)
    assert "A prior is not a measurement" in str(answer)
    assert "no spin in this scan" in " ".join(str(answer).split())
