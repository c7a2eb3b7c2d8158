"""Whole processes: rendering a scene warm, `--help`, compiling once after installing, and peak memory of a large render.

Every figure is that of a child process from its start to its end; medians of several runs after a warm-up.
"""

from __future__ import annotations

import os
import resource
import statistics
import subprocess
import sys
import tempfile
import time
from pathlib import Path

ROOT = Path(__file__).parent.parent
SCENE = ROOT / "scenes" / "first-light.toml"
RUNS = 5


def seconds(*arguments: str, environment: dict[str, str] | None = None) -> float:
    """Wall-clock time of one run of the command line."""
    start = time.perf_counter()
    subprocess.run(
        [sys.executable, "-m", "ringwright", *arguments],
        check=True,
        capture_output=True,
        env={**os.environ, **(environment or {})},
        cwd=tempfile.gettempdir(),
    )
    return time.perf_counter() - start


def median(*arguments: str) -> float:
    """Median of several runs after one warm-up."""
    seconds(*arguments)
    return statistics.median(seconds(*arguments) for _ in range(RUNS))


def row(figure: str, required: str, reached: str, met: bool) -> None:
    """One line of the table."""
    print(f"{figure} | {required} | {reached} | {'yes' if met else 'no'}", flush=True)


def sized_scene(folder: Path, pixels: int) -> Path:
    """The first scene at another number of pixels."""
    text = SCENE.read_text(encoding="utf-8")
    lines = [f"pixels = {pixels}" if line.startswith("pixels") else line for line in text.splitlines()]
    path = folder / f"scene-{pixels}.toml"
    path.write_text("\n".join(lines) + "\n", encoding="utf-8")
    return path


def main() -> None:
    """Print the four figures."""
    small = "--small" in sys.argv
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        scene = sized_scene(folder, 32 if small else 256)
        out = str(folder / "image.h5")
        cold = seconds(
            "render", str(scene), "--out", out, environment={"RINGWRIGHT_KERNELS": str(folder / "kernels")}
        )
        warm = median("render", str(scene), "--out", out)
        row(
            "render 256² cold minus warm: compiling, once",
            "< 15 s",
            f"{cold - warm:.1f} s",
            cold - warm < 15.0,
        )
        row("render 256², warm, whole process", "< 1.5 s", f"{warm:.2f} s", warm < 1.5)
        shown = median("--help")
        row("--help, whole process", "< 0.5 s", f"{shown:.2f} s", shown < 0.5)
        seconds("render", str(sized_scene(folder, 64 if small else 2048)), "--out", str(folder / "large.h5"))
        peak = resource.getrusage(resource.RUSAGE_CHILDREN).ru_maxrss / 2**20
        row("render 2048², peak memory", "< 1.5 GiB", f"{peak:.2f} GiB", peak < 1.5)


if __name__ == "__main__":
    main()
