"""Emission stands alone: it knows light paths through their contract, and neither units nor the job above
it."""

from __future__ import annotations

import ast
import subprocess
import sys
from pathlib import Path

import pytest

import emission

ROOM = Path(emission.__file__).parent
# The hot paths are NumPy alone; light paths are known through their contract and their registry.
ALLOWED = {
    "__future__",
    "collections",
    "dataclasses",
    "emission",
    "importlib",
    "math",
    "numpy",
    "pathlib",
    "re",
    "typing",
}
ALLOWED_OF_RAYTRACE = {"raytrace.contract", "raytrace.registry"}


def imported(source: str) -> set[str]:
    names: set[str] = set()
    for node in ast.walk(ast.parse(source)):
        if isinstance(node, ast.Import):
            names.update(alias.name for alias in node.names)
        elif isinstance(node, ast.ImportFrom):
            names.add(node.module or "")
    return names


def trespasses(source: str) -> set[str]:
    return {
        name
        for name in imported(source)
        if name.split(".")[0] not in ALLOWED and name not in ALLOWED_OF_RAYTRACE
    }


@pytest.mark.parametrize("path", sorted(ROOM.glob("*.py")), ids=lambda path: path.name)
def test_emission_imports_only_what_its_layer_may(path):
    assert trespasses(path.read_text(encoding="utf-8")) == set()


@pytest.mark.parametrize(
    "line",
    [
        "import ringwright",
        "from ringwright.units import parse",
        "import astropy.units",
        "from raytrace.kernels import x",
    ],
)
def test_the_rule_sees_a_trespass(line):
    assert trespasses(line)


def test_importing_the_package_costs_nothing():
    code = "import sys, emission; sys.exit('numpy' in sys.modules or 'raytrace' in sys.modules)"
    assert subprocess.run([sys.executable, "-c", code], check=False).returncode == 0


def test_every_front_door_opens():
    for name in emission.__all__:
        assert getattr(emission, name) is not None
    with pytest.raises(AttributeError, match="has no attribute 'halo'"):
        emission.halo  # noqa: B018
