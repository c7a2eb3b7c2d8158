"""How the demo's observed image was made: first-light's nucleus at another pixel size, smoothed to the beam that it is seen with.

Run it after a change of the light's physics: `python scenes/make_observation.py` rewrites first-observation.fits and prints the
diameter that belongs into first-observation.toml.
"""

from __future__ import annotations

from pathlib import Path

import ringwright as rw

HERE = Path(__file__).parent
FIELD, PIXELS = "210 uas", 120  # 1.75 µas a pixel, where the scene itself has 0.78


def main() -> None:
    """Render, write the FITS image, measure it."""
    scene = rw.load_scene(HERE / "first-light.toml")
    seen = scene.replace("view.field", FIELD).replace("view.pixels", PIXELS)
    path = rw.render(seen).to_fits(HERE / "first-observation.fits", replace=True)
    ring = rw.measure(path, resolution="20 uas")
    print(f"{path}: diameter {ring.diameter:.2f}, width {ring.width:.1f}, outcome {ring.outcome.name}")


if __name__ == "__main__":
    main()
