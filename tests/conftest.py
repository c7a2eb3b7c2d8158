"""What tests share: scenes written as a user writes them, in a folder of their own."""

from __future__ import annotations

import os
from pathlib import Path

import pytest
from hypothesis import settings

settings.register_profile("ci", deadline=None, derandomize=True)
settings.load_profile("ci")

DISK = """
[[emitter]]
kind = "thin-disk"
profile = { kind = "power-law", inner = "2.6 M", outer = "40 M", slope = 3.7 }
flow = { kind = "circular" }
"""

SCENE = """
name = "{name}"
[hole]
{hole}
[view]
inclination = "{inclination}"
position_angle = "{position_angle}"
frequency = "230 GHz"
field = "{field}"
pixels = {pixels}
orders = {orders}
{more}
{emitters}
"""

DEFAULTS = {
    "name": "test-nucleus",
    "hole": "",
    "inclination": "30 deg",
    "position_angle": "0 deg",
    "field": "90 M",
    "pixels": 64,
    "orders": 3,
    "more": "",
    "emitters": DISK,
}


@pytest.fixture
def write_scene(tmp_path: Path):
    """Write a scene file from the defaults and what a test changes; returns its path."""

    def write(**changes: object) -> Path:
        path = tmp_path / f"{changes.get('name', DEFAULTS['name'])}.toml"
        path.write_text(SCENE.format(**{**DEFAULTS, **changes}), encoding="utf-8")
        return path

    return write


@pytest.fixture(scope="session")
def project() -> Path:
    """The top folder of the project."""
    return Path(__file__).parent.parent


@pytest.fixture(scope="session")
def plain_environment() -> dict[str, str]:
    """Environment of a child process: ours, with one kernel thread."""
    return {**os.environ, "NUMBA_NUM_THREADS": "1"}
