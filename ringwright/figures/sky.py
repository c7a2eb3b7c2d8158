"""What every picture of the sky shares: the colour map, a scale bar, the beam, and the directions of north and east.

The map is perceptually uniform and readable without colour vision; marks are white with a dark outline.
"""

from __future__ import annotations

import math

from matplotlib.axes import Axes
from matplotlib.patches import Circle
from matplotlib.patheffects import withStroke

COLOUR_MAP = "cividis"
MARK = "#ffffff"
OUTLINE = [withStroke(linewidth=3.0, foreground="#00000066")]  # keeps white lines legible on bright light
DPI = 150


def mark_sky(axes: Axes, unit: str) -> None:
    """Scale bar at the lower right, north and east marks at the lower left."""
    left, right = axes.get_xlim()
    bottom, top = axes.get_ylim()
    side = top - bottom
    bar = _round_length(0.25 * side)
    end = right + 0.06 * side
    axes.plot(
        [end + bar, end],
        [bottom + 0.06 * side] * 2,
        color=MARK,
        linewidth=2.5,
        solid_capstyle="butt",
        path_effects=OUTLINE,
    )
    axes.text(
        end + 0.5 * bar,
        bottom + 0.075 * side,
        f"{bar:g} {unit}",
        color=MARK,
        ha="center",
        va="bottom",
        path_effects=OUTLINE,
    )
    corner = left - 0.18 * side, bottom + 0.06 * side
    style = {
        "arrowstyle": "-|>",
        "color": MARK,
        "linewidth": 1.4,
        "shrinkA": 0.0,
        "shrinkB": 0.0,
        "path_effects": OUTLINE,
    }
    for tip, name, along in (((0.0, 0.11), "N", (0.0, 0.14)), ((0.11, 0.0), "E", (0.135, 0.0))):
        axes.annotate(
            "",
            (corner[0] + tip[0] * side, corner[1] + tip[1] * side),
            corner,
            arrowprops=style,
            annotation_clip=False,
        )
        place = corner[0] + along[0] * side, corner[1] + along[1] * side
        axes.text(*place, name, color=MARK, ha="center", va="center", fontsize=10, path_effects=OUTLINE)


def mark_beam(axes: Axes, fwhm: float, unit: str) -> None:
    """A disk as wide as the resolution (FWHM) at the upper left, with its width beside it."""
    left, _ = axes.get_xlim()
    bottom, top = axes.get_ylim()
    side = top - bottom
    centre = left - 0.05 * side - 0.5 * fwhm, top - 0.05 * side - 0.5 * fwhm
    axes.add_patch(Circle(centre, 0.5 * fwhm, facecolor=MARK, alpha=0.35, edgecolor="none"))
    axes.add_patch(
        Circle(centre, 0.5 * fwhm, fill=False, edgecolor=MARK, linewidth=1.2, path_effects=OUTLINE)
    )
    axes.text(
        centre[0] - 0.5 * fwhm - 0.02 * side,
        centre[1],
        f"resolution\n{fwhm:.4g} {unit} (FWHM)",
        color=MARK,
        ha="left",
        va="center",
        fontsize=9,
        path_effects=OUTLINE,
    )


def _round_length(length: float) -> float:
    """The largest 1, 2 or 5 times a power of ten that is not longer."""
    power = 10.0 ** math.floor(math.log10(length))
    return max(step * power for step in (1.0, 2.0, 5.0) if step * power <= length)
