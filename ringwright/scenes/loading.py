"""`load_scene`: a scene file, read and validated.

See docs/scene-files.md for every key.
"""

from __future__ import annotations

from pathlib import Path

from ringwright.scenes.scene import Scene, scene_from
from ringwright.scenes.validation import read_document


def load_scene(path: str | Path) -> Scene:
    """Read a scene file.

    Raises
    ------
    SceneError
        With every problem of the file: its line, its key, what was given and what is accepted.
    """
    return scene_from(read_document(path, "scene"))
