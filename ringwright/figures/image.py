"""A picture of a rendered image: north up, east left, a scale bar, and brightness temperature beside the light.

Where most of the light fills a small part of the field, that part is drawn again, larger. Colours follow the square root of the
brightness, because a thin ring outshines its disk several times; the bar beside them tells the brightness. Brightness temperature
is the Rayleigh–Jeans one, T_b = c² I / (2 k ν²); an image without a flux density or a frequency shows brightness relative to its
maximum instead. Offsets in µas, or in M where θ_g is unknown.
"""

from __future__ import annotations

from pathlib import Path

import numpy as np
from matplotlib.axes import Axes
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.colors import PowerNorm
from matplotlib.figure import Figure
from matplotlib.patches import Rectangle

from raytrace.contract import Array
from ringwright.figures.sky import COLOUR_MAP, DPI, MARK, mark_sky
from ringwright.image import Image
from ringwright.products import written_whole

# c² / (2 k) in SI (CODATA 2018 exact values), janskys and square µas: brings Jy/µas² at ν in Hz to kelvin.
SPEED_OF_LIGHT = 299_792_458.0
BOLTZMANN = 1.380649e-23
JANSKY = 1e-26
# The inner panel shows the square that holds this share of the light, and this much more around it; it is worth
# drawing while it is below this share of the field.
MOST, SPACE, WORTH_A_PANEL = 0.7, 1.15, 0.7
PANEL, MARGINS = 4.6, (0.85, 0.6, 0.7, 1.15, 0.35)  # inches: left, bottom, between, right, top
BAR = 0.18  # inches, width of the colour bar and its distance
MICROARCSECOND = np.pi / 180.0 / 3600.0 * 1e-6


def brightness_temperature(jy_per_square_uas: Array | float, frequency_hz: float) -> Array | float:
    """Rayleigh–Jeans brightness temperature [K] of a brightness in Jy per square µas."""
    intensity = jy_per_square_uas * JANSKY / MICROARCSECOND**2
    return intensity * SPEED_OF_LIGHT**2 / (2.0 * BOLTZMANN * frequency_hz**2)


def draw_image(image: Image, path: str | Path) -> Path:
    """Draw all the light of an image and write a PNG."""
    shown, label = _shown(image)
    unit = "M" if image.theta_g_uas is None else "µas"
    reach = 0.5 * image.intensity.shape[2] * float(image.pixel.value)
    inner = reach * _share_of_field(image.total)
    halves = [reach] if inner > WORTH_A_PANEL * reach else [reach, inner]
    figure, panels, beside = _panels(len(halves))
    colours = PowerNorm(0.5, vmin=0.0, vmax=float(shown.max()) or 1.0)
    for axes, half in zip(panels, halves, strict=True):
        picture = axes.imshow(
            shown,
            origin="lower",
            extent=(reach, -reach, -reach, reach),
            cmap=COLOUR_MAP,
            norm=colours,
            interpolation="nearest",
        )
        axes.set_xlim(half, -half)
        axes.set_ylim(-half, half)
        axes.set_xlabel(f"offset to the east [{unit}]")
        mark_sky(axes, unit)
    panels[0].set_ylabel(f"offset to the north [{unit}]")
    panels[0].set_title(image.name + _band(image), fontsize=10, loc="left")
    if len(halves) > 1:
        panels[1].set_title(f"its inner {2.0 * inner:.3g} {unit}", fontsize=10, loc="left")
        frame = Rectangle(
            (-inner, -inner), 2.0 * inner, 2.0 * inner, fill=False, edgecolor=MARK, linewidth=0.8
        )
        panels[0].add_patch(frame)
    bar = figure.colorbar(picture, cax=beside)
    bar.set_label(f"{label}, square-root scale")
    with written_whole(path) as temporary:
        figure.savefig(
            temporary, format="png", dpi=DPI, metadata={"Software": "ringwright", "Title": image.name}
        )
    return Path(path)


def _panels(count: int) -> tuple[Figure, list[Axes], Axes]:
    """A figure with square panels side by side, and the axes of a colour bar at their right."""
    left, bottom, gap, right, top = MARGINS
    width = left + count * PANEL + (count - 1) * gap + right
    height = bottom + PANEL + top
    figure = Figure(figsize=(width, height), facecolor="white")
    FigureCanvasAgg(figure)

    def placed(x: float, wide: float) -> Axes:
        return figure.add_axes((x / width, bottom / height, wide / width, PANEL / height))

    panels = [placed(left + index * (PANEL + gap), PANEL) for index in range(count)]
    return figure, panels, placed(width - right + BAR, BAR)


def _share_of_field(total: Array) -> float:
    """Half side of the central square that holds most of the light, with some space around it, over that of the field."""
    side = total.shape[0]
    offset = np.abs(np.arange(side) - 0.5 * (side - 1)) + 0.5
    distance = np.maximum(offset[:, None], offset[None, :]).ravel()
    order = np.argsort(distance)
    running = np.cumsum(total.ravel()[order])
    if not running[-1] > 0.0:
        return 1.0
    return min(
        1.0, SPACE * float(distance[order][np.searchsorted(running, MOST * running[-1])]) / (0.5 * side)
    )


def _shown(image: Image) -> tuple[Array, str]:
    total = image.total
    if image.in_jansky and image.frequency_hz and image.theta_g_uas:
        area = (image.pixel_m * image.theta_g_uas) ** 2
        kelvin = np.asarray(brightness_temperature(total / area, image.frequency_hz))
        return kelvin / 1e9, "brightness temperature [10⁹ K]"
    return total / (float(total.max()) or 1.0), "brightness, relative to the maximum"


def _band(image: Image) -> str:
    return "" if image.frequency_hz is None else f", {image.frequency_hz / 1e9:g} GHz"
