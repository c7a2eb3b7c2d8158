"""What each room may import: kernels stay apart from the functions around them, and nothing looks upward."""

from __future__ import annotations

import ast
from pathlib import Path

import pytest

ROOT = Path(__file__).parent.parent.parent
KERNELS = [path for folder in ("raytrace", "ringwright") for path in (ROOT / folder / "kernels").glob("*.py")]
# The decorator and the threads are no kernels: they manage what compiles and what runs them.
NO_KERNELS = {"compiling.py", "threads.py"}


def imported(path: Path) -> set[str]:
    """Every module that a file imports, anywhere in it."""
    found = set()
    for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
        if isinstance(node, ast.Import):
            found |= {name.name for name in node.names}
        elif isinstance(node, ast.ImportFrom):
            found.add(node.module or "")
    return found


@pytest.mark.parametrize("path", KERNELS, ids=lambda path: f"{path.parent.parent.name}/{path.name}")
def test_kernels_import_numbers_and_each_other_only(path):
    if path.name in NO_KERNELS:
        return
    allowed = {
        "math",
        "numpy",
        "numba",
        "__future__",
        "typing",
        "numpy.typing",
    }  # typing names, and does nothing
    for module in imported(path) - allowed:
        assert module.startswith(("raytrace.kernels", "ringwright.kernels")), (path, module)
        assert path.parent.parent.name == "ringwright" or not module.startswith("ringwright")


@pytest.mark.parametrize(
    ("room", "above"), [("raytrace", ("emission", "ringwright")), ("emission", ("ringwright",))]
)
def test_no_room_imports_the_one_above(room, above):
    for path in (ROOT / room).rglob("*.py"):
        for module in imported(path):
            assert module.split(".")[0] not in above, (path, module)


def test_a_control_that_must_fail(tmp_path):
    path = tmp_path / "bad.py"
    path.write_text("def f():\n    from ringwright import units\n", encoding="utf-8")
    assert any(module.startswith("ringwright") for module in imported(path))
