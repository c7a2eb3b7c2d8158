"""What the pictures of a comparison share: an ink for each family of scenes, frames, distributions as steps, intervals as bars.

A posterior over a few hundred scenes is a sum of as many bumps; drawn as steps it shows what is known and no teeth that only say
where the scenes happen to lie. Bars are medians with equal-tailed 68 % (thick) and 95 % (thin) intervals. Units are the caller's.
"""

from __future__ import annotations

import textwrap
from typing import Any

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from numpy.typing import NDArray

from ringwright.comparing.distributions import LogDensity
from ringwright.comparing.results import Comparison, Estimate, FamilyAnswer

Array = NDArray[np.float64]

# Muted inks that differ in lightness as well as in hue, so that they part in grey print too.
INKS = ("#0b6e6e", "#c2571a", "#5b3f8c", "#8a9a1f", "#b03060", "#2f5fa7")
ALL = "#222222"
PRIOR = "#8c8c8c"
OBSERVED = "#d9a400"
QUIET = "#555555"
PLOTTED_TAIL = 1e-3  # probability left out at either end of an axis
MARGIN = 0.05  # of an axis beyond that, so that a distribution is seen to end
BINS = 40
SMALL = 8.5
TITLE_CHARACTERS, CAPTION_CHARACTERS = 12.0, 15.6  # in an inch of a line, at their sizes


def fitting(comparison: Comparison) -> list[tuple[FamilyAnswer, str]]:
    """Families that fit, with their inks."""
    coloured = [(family, INKS[i % len(INKS)]) for i, family in enumerate(comparison.families)]
    return [(family, ink) for family, ink in coloured if family.posterior is not None]


def framed(width: float, height: float, title: str) -> Figure:
    """An empty figure [inches] with its title at the upper left."""
    figure = Figure(figsize=(width, height), facecolor="white", layout="constrained")
    lines = wrapped(title, width, TITLE_CHARACTERS)
    figure.suptitle(lines.replace("θ_g", "θ$_g$"), fontsize=10.5, x=0.012, ha="left")
    return figure


def caption(figure: Figure, text: str) -> None:
    """Small print below everything."""
    lines = wrapped(text, figure.get_figwidth(), CAPTION_CHARACTERS)
    figure.supxlabel(lines.replace("θ_g", "θ$_g$"), x=0.012, ha="left", fontsize=SMALL, color=QUIET)


def wrapped(text: str, width: float, per_inch: float) -> str:
    """Lines broken to a width [inches]."""
    return "\n".join(textwrap.fill(line, int(per_inch * width)) for line in text.splitlines())


def plain(axes: Axes) -> None:
    """Two spines and small numbers."""
    axes.spines[["top", "right"]].set_visible(False)
    axes.tick_params(labelsize=9)


def span(densities: list[LogDensity]) -> tuple[float, float]:
    """The stretch of an axis that holds these distributions, with a margin."""
    low = min(item.quantile(PLOTTED_TAIL) for item in densities)
    high = max(item.quantile(1.0 - PLOTTED_TAIL) for item in densities)
    margin = MARGIN * (high - low) or MARGIN * high
    return max(low - margin, 0.5 * low), high + margin


def steps(axes: Axes, density: LogDensity, edges: Array, scale: float = 1.0, **style: Any) -> None:
    """A distribution as steps relative to its highest one; nothing is drawn where it holds nothing."""
    below = np.array([density.probability_below(edge) for edge in edges])
    height = np.diff(below) / np.diff(edges)
    held = np.flatnonzero(height > 0.0)
    if held.size == 0:
        return
    first, last = held[0], held[-1] + 1
    axes.stairs(height[first:last] / height.max(), edges[first : last + 1] / scale, **style)


def bar(
    axes: Axes,
    estimate: Estimate,
    place: float,
    ink: str,
    *,
    scale: float = 1.0,
    upright: bool = False,
    wide: bool = True,
) -> None:
    """Median and intervals at a place across the axis: along x, or along y where `upright`; `wide` with the 95 %."""
    if estimate.value is None:
        return
    middle = estimate.number / scale
    outer = [((estimate.low95, estimate.high95), 1.0)] if wide else []
    for ends, width in (*outer, ((estimate.low68, estimate.high68), 3.4 if wide else 2.0)):
        along = [float(end.value) / scale for end in ends if end is not None]
        across = [place, place]
        points = (across, along) if upright else (along, across)
        axes.plot(*points, color=ink, linewidth=width, solid_capstyle="butt")
    where = (place, middle) if upright else (middle, place)
    axes.plot(
        *where, marker="o", markersize=6.0 if wide else 4.5, markeredgecolor=ink, markerfacecolor="white"
    )
