"""Error of visibilities against traced rays: the screen that follows the light beside uniform pixels, in one run.

A face-on disk in a field of 64 M at θ_g = 3.8 µas, orders 0 to 2, at 40, 200 and 400 Gλ; errors are relative to the local
envelope and taken against 2π ∫ I(b) J₀(2πub) b db between the exact images of the disk's edges. Every ray counts, those
that find the images of edges too. Writes a table and a plot; `--small` checks on a few pixels that it runs.
"""

from __future__ import annotations

import itertools
import math
import sys
import time
from pathlib import Path
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray
from scipy.special import j0

import emission as em
import raytrace as rt
from raytrace.panels import band, panel_radii
from raytrace.series import BandSeries
from ringwright.lightwaves import visibility
from ringwright.sampling import SampledLight

Array = NDArray[np.float64]
FIELD, ORDERS = 64.0, 3
DISK = em.ThinDisk(profile=em.PowerLaw(inner=2.6, outer=30.0, slope=3.0), flow=em.Circular())
THETA_G = 3.8e-6 / 206264.80624709636
FRINGE = 1.0 / (2.0 * math.sqrt(27.0) * THETA_G)
BASELINES = np.array([40e9, 200e9, 400e9])
# Nodes a panel, angles around: from coarse to fine.
LAYOUTS = ((3, 8), (4, 8), (6, 8), (8, 8), (10, 8), (12, 16), (16, 16))
SIDES, SMALL_SIDES = (256, 512, 1024, 2048, 4096), (64, 128)
REQUIRED_ERROR, REQUIRED_RAYS, UNIFORM_RAYS = 1e-3, 16_000, 16_000_000
TILE_ROWS = 64
PLOT = Path("outputs") / "rays-and-errors.png"


class Counted(rt.Schwarzschild):
    """A Schwarzschild hole that counts the rays traced through it."""

    rays = 0

    def trace_rays(self, alpha: Array, *rest: object) -> rt.Hit:
        """As the metric does."""
        type(self).rays += alpha.size
        return super().trace_rays(alpha, *rest)


class Point(NamedTuple):
    """Rays traced and the error at each baseline."""

    rays: int
    error: Array


def wavenumber(baseline: Array) -> Array:
    """Radians of phase per M."""
    return math.tau * THETA_G * np.asarray(baseline)


def shaded(alpha: Array, beta: Array, order: int) -> Array:
    """Brightness of one order at screen positions."""
    hit = rt.trace(
        alpha, beta, inclination=0.0, orders=order + 1, spacetime=Counted(), azimuth=False, delay=False
    )
    return em.shade(DISK, hit.only(order))[0, 0]


def exact(baseline: Array) -> Array:
    """By Gauss–Legendre rules of 64 points on pieces so short that more change nothing, between exact edges."""
    points, weights = np.polynomial.legendre.leggauss(64)
    k, total = wavenumber(baseline), np.zeros(len(baseline))
    corners = sorted({*DISK.edges, 3.0, 4.0, 5.0, 5.8, 5.97, 5.997, 8.0, 14.0, 20.0})
    for order in range(ORDERS):
        ends = [float(rt.isoradial(r, order=order, angle=0.1, inclination=0.0)) for r in corners]
        for low, high in itertools.pairwise(ends):
            pieces = max(2, math.ceil((high - low) * float(k.max()) / 30.0))
            cuts = np.linspace(low, high, pieces + 1)
            half = 0.5 * np.diff(cuts)[:, None]
            b = (0.5 * (cuts[1:] + cuts[:-1])[:, None] + half * points).ravel()
            light = shaded(b, np.zeros_like(b), order) * b * (half * weights).ravel()
            total += j0(np.outer(k, b)) @ light
    return math.tau * total


def local_envelope(baseline: Array) -> Array:
    """Largest exact amplitude within one fringe to either side."""
    around = baseline[:, None] + np.linspace(-FRINGE, FRINGE, 65)
    return np.max(np.abs(exact(around.ravel())).reshape(around.shape), axis=1)


def by_screen(nodes: int, angles: int) -> tuple[int, Array]:
    """Rays traced and visibilities from panels of one layout."""
    Counted.rays = 0
    k = wavenumber(BASELINES)
    total = np.zeros(k.size)
    radii = panel_radii(DISK.edges, Counted())
    for order in range(ORDERS):
        sampled = band(radii, order=order, inclination=0.0, angles=angles, nodes=nodes, spacetime=Counted())
        light = shaded(sampled.alpha.ravel(), sampled.beta.ravel(), order).reshape(sampled.shape)
        part = SampledLight(order, BandSeries.of(sampled, light), (), 0.0)
        total += visibility(part, wavenumber=k, turn=np.zeros_like(k)).real
    return Counted.rays, total


def by_pixels(side: int) -> tuple[int, Array]:
    """Rays traced, one through the centre of every pixel, and visibilities of what they see."""
    Counted.rays = 0
    pixel = FIELD / side
    axis = (np.arange(side) - 0.5 * (side - 1)) * pixel
    columns = np.zeros(side)
    for start in range(0, side, TILE_ROWS):
        rows = axis[start : start + TILE_ROWS]
        alpha, beta = (each.ravel() for each in np.meshgrid(axis, rows))
        hit = rt.trace(
            alpha, beta, inclination=0.0, orders=ORDERS, spacetime=Counted(), azimuth=False, delay=False
        )
        columns += em.shade(DISK, hit)[0].sum(axis=0).reshape(rows.size, side).sum(axis=0)
    return Counted.rays, np.cos(np.outer(wavenumber(BASELINES), axis)) @ columns * pixel**2


def curve(found: list[tuple[int, Array]], reference: Array, local: Array) -> list[Point]:
    """Errors relative to the envelope."""
    return [Point(rays, np.abs(value - reference) / local) for rays, value in found]


def rays_needed(points: list[Point], column: int) -> tuple[float, float]:
    """Rays at which a power law through the points reaches the required error, and its order in rays."""
    rays = np.log([point.rays for point in points])
    error = np.log([max(float(point.error[column]), 1e-300) for point in points])
    slope, offset = np.polyfit(rays, error, 1)
    return math.exp((math.log(REQUIRED_ERROR) - offset) / slope), -slope


def table(name: str, points: list[Point]) -> None:
    """Rays and errors, one line a layout."""
    for point in points:
        print(f"{name:>8} {point.rays:>11,} rays: " + "  ".join(f"{error:.1e}" for error in point.error))


def plot(screen: list[Point], pixels: list[Point]) -> Path:
    """Both curves at every baseline."""
    from matplotlib.backends.backend_agg import FigureCanvasAgg
    from matplotlib.figure import Figure

    figure = Figure(figsize=(7.2, 4.6), layout="constrained")
    axes = figure.subplots()
    for column, (baseline, colour) in enumerate(zip(BASELINES, ("C0", "C1", "C2"), strict=True)):
        for points, style, name in ((screen, "o-", "screen"), (pixels, "s--", "uniform pixels")):
            axes.loglog(
                [point.rays for point in points],
                [point.error[column] for point in points],
                style,
                color=colour,
                markersize=4,
                label=f"{name}, {baseline / 1e9:.0f} Gλ",
            )
    axes.axhline(REQUIRED_ERROR, color="0.6", linewidth=0.8)
    axes.set_xlabel("traced rays, orders 0 to 2 (pixels: one ray carries all orders)")
    axes.set_ylabel("error of V over the local envelope")
    axes.legend(fontsize=8, frameon=False, ncols=2)
    PLOT.parent.mkdir(exist_ok=True)
    FigureCanvasAgg(figure).print_png(str(PLOT))
    return PLOT


def profile_seconds(small: bool) -> float:
    """Seconds of a whole profile of an inclined scene, orders 0 to 3, 64 position angles, after a warm-up."""
    import ringwright as rw

    scene = rw.load_scene(Path(__file__).parent.parent / "scenes" / "photon-rings.toml")
    longest = "50 Glambda" if small else "1000 Glambda"
    rw.profile(scene, orders=4, longest="20 Glambda", angles=8)
    start = time.perf_counter()
    rw.profile(scene, orders=4, longest=longest, angles=64)
    return time.perf_counter() - start


def main() -> None:
    """Print the table, draw the plot, and print the figures."""
    small = "--small" in sys.argv
    reference, local = exact(BASELINES), local_envelope(BASELINES)
    screen = curve([by_screen(*layout) for layout in LAYOUTS[: 3 if small else None]], reference, local)
    pixels = curve([by_pixels(side) for side in (SMALL_SIDES if small else SIDES)], reference, local)
    print("errors over the envelope at " + ", ".join(f"{each / 1e9:.0f}" for each in BASELINES) + " Gλ")
    table("screen", screen)
    table("pixels", pixels)
    if not small:
        print(f"plot: {plot(screen, pixels)}")
    enough = [point.rays for point in screen if point.error[0] <= REQUIRED_ERROR]
    fewest = min(enough) if enough else math.inf
    needed, order = rays_needed(pixels, 0)
    print(
        f"screen, rays for 1e-3 of the envelope at 40 Gλ | ≤ {REQUIRED_RAYS:,} | {fewest:,} | "
        f"{'yes' if fewest <= REQUIRED_RAYS else 'no'}"
    )
    print(
        f"uniform pixels, rays for the same (extrapolated, error ∝ rays^−{order:.2f}) | > {UNIFORM_RAYS:,} | "
        f"{needed:.2g} | {'yes' if needed > UNIFORM_RAYS else 'no'}"
    )
    took = profile_seconds(small)
    print(
        f"full profile, inclined, orders 0 to 3, 64 angles | < 10 s | {took:.1f} s | {'yes' if took < 10.0 else 'no'}"
    )


if __name__ == "__main__":
    main()
