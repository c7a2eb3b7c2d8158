"""Figures of the ring estimator: accuracy on the exact blurred thin ring, time per reading and per scene.

The ring is I ∝ exp(−(r² + R²)/2σ²) I0(rR/σ²); times are the best of several on one core, warm. Run as
`python benchmarks/ring_reading.py`; lengths in units of the ring's true diameter unless told.
"""

from __future__ import annotations

import math
import time
from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import minimize_scalar
from scipy.special import ive

from ringwright.ring.estimator import read_blurred, read_ring
from ringwright.ring.readings import readings
from ringwright.ring.smoothing import FWHM_PER_SIGMA, prepare

REPEATS = 12
OFF_CENTRE = (0.13, -0.07)


def profile(r: NDArray[np.float64] | float, fwhm: float) -> NDArray[np.float64]:
    """Brightness of a blurred thin ring of diameter 1."""
    sigma = fwhm / FWHM_PER_SIGMA
    return np.asarray(np.exp(-((r - 0.5) ** 2) / (2.0 * sigma**2)) * ive(0, r * 0.5 / sigma**2))


def ring(n: int, pixel: float, fwhm: float, crescent: float = 0.0) -> NDArray[np.float64]:
    """An image of it, off-centre."""
    axis = (np.arange(n) - 0.5 * (n - 1)) * pixel
    east, north = -axis[None, :] - OFF_CENTRE[0], axis[:, None] - OFF_CENTRE[1]
    r = np.hypot(east, north)
    return profile(r, fwhm) * (1.0 + crescent * east / np.maximum(r, pixel))


def worst_diameter() -> float:
    """Largest error of the diameter [d] for resolutions of 0.1 to 0.6 at pixels of 1/4 and 1/20 of them."""
    worst = 0.0
    for fwhm in (0.1, 0.2, 0.3, 0.4, 0.5, 0.6):
        best = minimize_scalar(
            lambda r, w=fwhm: -profile(r, w), None, (0.05, 0.6), method="bounded", options={"xatol": 1e-12}
        )
        for pixel in (fwhm / 4.0, fwhm / 20.0):
            image = ring(math.ceil((2.4 + 3.0 * fwhm) / pixel), pixel, fwhm)
            found = read_ring(image, pixel, fwhm, beam=fwhm, averaged=False).diameter
            worst = max(worst, abs(found - 2.0 * best.x))
    return worst


def fastest(task: Callable[[], object]) -> float:
    """Best of several runs [ms]."""
    task()
    times = []
    for _ in range(REPEATS):
        start = time.perf_counter()
        task()
        times.append(time.perf_counter() - start)
    return 1e3 * min(times)


def rows() -> list[tuple[str, float, float, str]]:
    """(figure, required, reached, unit); smaller is better."""
    smooth = ring(256, 4.05 / 256, 20.0 / 42.0, crescent=0.2)
    whole = prepare(smooth, 4.05 / 256, widest=0.0, averaged=False)
    scene = ring(256, 5.4 / 256, 0.1, crescent=0.3)
    return [
        ("ring diameter, worst error", 0.1, 100.0 * worst_diameter(), "% of d"),
        (
            "reading a smoothed 256² image",
            3.0,
            fastest(lambda: read_ring(smooth, 4.05 / 256, 20.0 / 42.0, beam=20.0 / 42.0, averaged=False)),
            "ms",
        ),
        (
            "the same, transformed already",
            3.0,
            fastest(lambda: read_blurred(whole, 20.0 / 42.0, beam=20.0 / 42.0)),
            "ms",
        ),
        ("readings of one scene, 256²", 150.0, fastest(lambda: readings(scene, 56.0 / 256)), "ms"),
    ]


def main() -> None:
    """Print figure | required | reached | met."""
    for figure, required, reached, unit in rows():
        met = "yes" if reached <= required else "no"
        print(f"{figure} | {required:g} {unit} | {reached:.3g} {unit} | {met}")


if __name__ == "__main__":
    main()
