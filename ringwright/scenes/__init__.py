"""Scene files: what is validated, where it stands in the file, and the `Scene` that comes of it."""

from ringwright.scenes.errors import Problem, SceneError
from ringwright.scenes.loading import load_scene
from ringwright.scenes.scene import Scene
from ringwright.scenes.starters import new_file, scene_schema

__all__ = ["Problem", "Scene", "SceneError", "load_scene", "new_file", "scene_schema"]
