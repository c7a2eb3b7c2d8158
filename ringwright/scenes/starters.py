"""Commented files to start from, and the JSON Schema that editors use to complete and check scene files."""

from __future__ import annotations

import tomllib
from pathlib import Path
from typing import Any, Literal

from ringwright.errors import InputError
from ringwright.products import written_whole
from ringwright.scenes.models import SceneFile

STARTERS = Path(__file__).parent / "starters"
Kind = Literal["scene", "scan", "observation"]


def new_file(kind: Kind, path: str | Path, *, replace: bool = False) -> Path:
    """Write a commented scene, scan or observation file.

    Raises
    ------
    InputError
        If the file exists and `replace` is not set, or its folder cannot be written.
    """
    target = Path(path)
    if target.exists() and not replace:
        raise InputError(f"{target} exists and is kept; name another file or say --replace")
    text = (STARTERS / f"{kind}.toml").read_text(encoding="utf-8")
    with written_whole(target) as temporary:
        temporary.write_text(text, encoding="utf-8")
    return target


def example(kind: Kind) -> dict[str, Any]:
    """What the commented file of a kind says, as data: its numbers are invented."""
    return tomllib.loads((STARTERS / f"{kind}.toml").read_text(encoding="utf-8"))


def scene_schema() -> dict[str, Any]:
    """JSON Schema of scene files."""
    return SceneFile.model_json_schema()
