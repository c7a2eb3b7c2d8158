"""A picture of a ring measurement: the image as it was measured, with ring, centre and width drawn on it.

North is up and east is left; light is shown linearly from zero. Lengths are in the unit of the image, µas
or M.
"""

from __future__ import annotations

import math
import textwrap
from pathlib import Path
from typing import Any

import numpy as np
from matplotlib.axes import Axes
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.figure import Figure
from matplotlib.image import AxesImage
from matplotlib.patches import Annulus, Circle
from numpy.typing import NDArray

from ringwright.errors import InputError
from ringwright.figures.sky import COLOUR_MAP, DPI, MARK, OUTLINE, mark_beam, mark_sky
from ringwright.products import written_whole
from ringwright.ring.measuring import at_resolution

WINDOW = 1.6  # half the width of the picture in diameters


def draw_ring(image: NDArray[np.float64], pixel: float, unit: str, ring: Any, path: str | Path) -> Path:
    """Draw a measured ring on its image and write a PNG.

    Parameters
    ----------
    image : array (ny, nx)
        The image at the resolution of the measurement; row 0 south, column 0 east.
    pixel : float
        Side of a pixel in `unit`.
    unit : str
        "uas" or "M", the unit of the ring.
    ring : Ring
    path : path
        Where the PNG goes; it is written beside and renamed.
    """
    if image.ndim != 2:
        raise InputError(f"a picture shows an image with two axes; this array has {image.ndim}")
    figure = Figure(figsize=(6.6, 6.7), facecolor="white")
    FigureCanvasAgg(figure)
    axes = figure.add_axes((0.115, 0.25, 0.75, 0.74))
    shown = "M" if unit == "M" else "µas"
    light = _show_light(axes, image, pixel, shown)
    bar = figure.colorbar(light, cax=figure.add_axes((0.88, 0.25, 0.025, 0.74)))
    bar.set_label("brightness, relative to the maximum")
    found = ring.outcome.has_diameter
    if found:
        _mark_ring(axes, ring)
    _frame(axes, image, pixel, ring if found else None)
    mark_sky(axes, shown)
    mark_beam(axes, float(ring.resolution.value), shown)
    figure.text(0.03, 0.165, _caption(ring, shown), fontsize=9, va="top", linespacing=1.5, color="#202020")
    with written_whole(path) as temporary:
        figure.savefig(
            temporary, format="png", dpi=DPI, metadata={"Software": "ringwright", "Title": ring.name}
        )
    return Path(path)


def picture(image: Any, ring: Any, path: str | Path) -> Path:
    """Draw a measured ring on the image or file that it was measured on, brought to the ring's resolution."""
    data, pixel = at_resolution(image, ring.resolution)
    return draw_ring(data, pixel, "uas" if ring.resolution.unit.physical_type == "angle" else "M", ring, path)


def _show_light(axes: Axes, image: NDArray[np.float64], pixel: float, unit: str) -> AxesImage:
    ny, nx = image.shape
    edge_east, edge_north = 0.5 * nx * pixel, 0.5 * ny * pixel
    light = axes.imshow(
        image / (float(image.max()) or 1.0),
        origin="lower",
        extent=(edge_east, -edge_east, -edge_north, edge_north),
        cmap=COLOUR_MAP,
        vmin=0.0,
        vmax=1.0,
        interpolation="bicubic",
    )
    axes.set_xlabel(f"offset to the east [{unit}]")
    axes.set_ylabel(f"offset to the north [{unit}]")
    return light


def _mark_ring(axes: Axes, ring: Any) -> None:
    """Circle of the diameter, band of the width, cross at the centre, a tick toward the brighter side."""
    east, north = (float(value) for value in ring.centre.value)
    radius = 0.5 * float(ring.diameter.value)
    axes.add_patch(
        Circle((east, north), radius, fill=False, edgecolor=MARK, linewidth=1.6, path_effects=OUTLINE)
    )
    axes.plot(
        [east], [north], marker="+", color=MARK, markersize=9, markeredgewidth=1.3, path_effects=OUTLINE
    )
    width = float(ring.width.value)
    if math.isfinite(width):
        outer = radius + 0.5 * width
        axes.add_patch(
            Annulus(
                (east, north), outer, min(width, outer * 0.999), facecolor=MARK, alpha=0.13, edgecolor="none"
            )
        )
        for edge in (outer, radius - 0.5 * width):
            if edge > 0.0:
                circle = Circle(
                    (east, north), edge, fill=False, edgecolor=MARK, linewidth=0.8, linestyle=(0, (4, 4))
                )
                axes.add_patch(circle)
    angle = math.radians(float(ring.orientation.value))
    if math.isfinite(angle):
        reach = np.array([1.0, 1.0 + 0.25]) * radius
        axes.plot(
            east + reach * math.sin(angle),
            north + reach * math.cos(angle),
            color=MARK,
            linewidth=2.2,
            path_effects=OUTLINE,
        )


def _frame(axes: Axes, image: NDArray[np.float64], pixel: float, ring: Any) -> None:
    """The whole image, or a square about the ring where the image is much wider."""
    half = 0.5 * min(image.shape) * pixel
    east = north = 0.0
    if ring is not None and WINDOW * float(ring.diameter.value) < half:
        half = WINDOW * float(ring.diameter.value)
        limit = 0.5 * min(image.shape) * pixel - half
        east, north = (min(max(float(value), -limit), limit) for value in ring.centre.value)
    axes.set_xlim(east + half, east - half)
    axes.set_ylim(north - half, north + half)
    axes.set_aspect("equal")


def _caption(ring: Any, unit: str) -> str:
    at = f"at {float(ring.resolution.value):.4g} {unit} resolution"
    if not ring.outcome.has_diameter:
        return _wrapped(f"{ring.name}, {at}. {ring.outcome.sentence}")
    width = float(ring.width.value)
    limit = "> " if ring.unresolved > 0.0 and ring.outcome.name == "WIDTH_LIMIT" else ""
    shown = f"{limit}{width:.2f} {unit}" if math.isfinite(width) else "not resolved"
    angle = float(ring.orientation.value)
    bright = f", brighter toward {angle:.0f}° east of north" if math.isfinite(angle) else ""
    dark = f"centre {ring.central_brightness:.3f} as bright as the ring"
    spread = f"spread around the ring {float(ring.scatter.value):.2f} {unit}"
    last = "The bright ring is not the edge of the shadow."
    if ring.outcome.name != "RING":
        last += f" Outcome: {ring.outcome.name.lower().replace('_', ' ')}."
    return "\n".join(
        (
            f"{ring.name}, {at}",
            f"diameter {float(ring.diameter.value):.2f} {unit} ({spread}), width {shown}",
            f"asymmetry {ring.asymmetry:.3f}{bright}; {dark}",
            f"solid: diameter{', dashed: width' if math.isfinite(width) else ''}, cross: centre"
            f"{', tick: toward the brighter side' if bright else ''}",
            last,
        )
    )


def _wrapped(text: str, width: int = 84) -> str:
    return "\n".join(textwrap.wrap(text, width))
