"""How fast rays are traced, beside the same closed form in NumPy and `scipy.special` (`reference_trace.py`), in one run.

Square screens of rays, orders 0 to 2, kernels on two cores at most, the reference as NumPy runs it (on one); the best of several
runs that take turns, after a warm-up. Run `python benchmarks/trace_speed.py`; `--small` checks on a tiny screen that both agree.
"""

from __future__ import annotations

import sys
import time
from collections.abc import Callable

import numba
import numpy as np
from numpy.typing import NDArray
from reference_trace import crossing_radius

import raytrace as rt

Array = NDArray[np.float64]
SIDE, SMALL_SIDE = 1024, 48
# Sides of the screens [M]: the first is filled by the shadow and holds captured rays for the most part, the second few.
FIELDS = (12.0, 30.0)
INCLINATION, ORDERS, CORES = 0.6, 3, 2
REPEATS = 5
REQUIRED_RATIO, REQUIRED_NANOSECONDS = 10.0, 1000.0
# Of 1/r [1/M]; what the reference is good for on a screen of this coarseness.
AGREEMENT = 1e-9
ALONE = {"azimuth": False, "delay": False, "momentum": False}
ASKED = {
    "radius": ALONE,
    "radius, azimuth": {**ALONE, "azimuth": True},
    "radius, momentum": {**ALONE, "momentum": True},
    "radius, delay": {**ALONE, "delay": True},
    "everything": {},
}


def screen(field: float, side: int) -> tuple[Array, Array]:
    """Centres of the pixels of a square screen."""
    axis = ((np.arange(side) + 0.5) / side - 0.5) * field
    alpha, beta = np.meshgrid(axis, axis)
    return alpha.ravel(), beta.ravel()


def traced(alpha: Array, beta: Array, asked: dict[str, bool]) -> rt.Hit:
    """What is timed of ours."""
    return rt.trace(alpha, beta, inclination=INCLINATION, orders=ORDERS, **asked)


def disagreement(alpha: Array, beta: Array) -> float:
    """Largest difference of 1/r between ours and the reference; infinite where one has a crossing and the other has none."""
    expected = crossing_radius(alpha, beta, INCLINATION, ORDERS)
    worst = 0.0
    for asked in ASKED.values():
        radius = traced(alpha, beta, asked).radius
        if not np.array_equal(np.isnan(radius), np.isnan(expected)):
            return float("inf")
        worst = max(worst, float(np.nanmax(np.abs(1.0 / radius - 1.0 / expected))))
    return worst


def nanoseconds(rays: int, runs: dict[str, Callable[[], object]]) -> dict[str, float]:
    """Time per ray of each run, the best of several rounds in which all take their turn."""
    best = dict.fromkeys(runs, float("inf"))
    for run in runs.values():
        run()
    for _ in range(REPEATS):
        for name, run in runs.items():
            start = time.perf_counter()
            run()
            best[name] = min(best[name], (time.perf_counter() - start) / rays * 1e9)
    return best


def measure(field: float) -> tuple[float, float]:
    """Print the times on one screen; returns ours for radii alone [ns per ray] and the reference's over it."""
    alpha, beta = screen(field, SIDE)
    runs: dict[str, Callable[[], object]] = {
        name: (lambda asked=asked: traced(alpha, beta, asked)) for name, asked in ASKED.items()
    }
    runs["reference, radius"] = lambda: crossing_radius(alpha, beta, INCLINATION, ORDERS)
    times = nanoseconds(alpha.size, runs)
    print(f"screen of {field:g} M, {SIDE}² rays, {numba.config.NUMBA_NUM_THREADS} cores")
    for name, value in times.items():
        print(f"  {name:20} {value:8.1f} ns per ray")
    return times["radius"], times["reference, radius"] / times["radius"]


def main() -> int:
    """Check agreement; then, unless on a tiny screen, time."""
    worst = max(disagreement(*screen(field, SMALL_SIDE)) for field in FIELDS)
    if not worst < AGREEMENT:
        print(f"ours and the reference disagree by {worst:g} in 1/r", file=sys.stderr)
        return 1
    if "--small" in sys.argv:
        print(f"both agree to {worst:.1e} in 1/r")
        return 0
    numba.config.NUMBA_NUM_THREADS = min(CORES, numba.config.NUMBA_NUM_THREADS)
    times, ratios = zip(*(measure(field) for field in FIELDS), strict=True)
    slowest, least = max(times), min(ratios)
    print("figure | required | reached | met")
    print(
        f"{SIDE}² rays, orders 0 to 2, radius alone, against NumPy | >= {REQUIRED_RATIO:g} times | {least:.1f} times | "
        f"{'yes' if least >= REQUIRED_RATIO else 'no'}"
    )
    print(
        f"{SIDE}² rays, orders 0 to 2, radius alone | <= {REQUIRED_NANOSECONDS:g} ns per ray | {slowest:.0f} ns per ray | "
        f"{'yes' if slowest <= REQUIRED_NANOSECONDS else 'no'}"
    )
    return 0


if __name__ == "__main__":
    sys.exit(main())
