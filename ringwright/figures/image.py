"""A picture of a rendered image: north up, east left, a scale bar, and brightness temperature beside the light.

Light is shown linearly from zero. Brightness temperature is the Rayleigh–Jeans one, T_b = c² I / (2 k ν²);
an image without a flux density or a frequency shows brightness relative to its maximum instead. Offsets in
µas, or in M where θ_g is unknown.
"""

from __future__ import annotations

from pathlib import Path

import numpy as np
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.figure import Figure

from raytrace.contract import Array
from ringwright.figures.sky import COLOUR_MAP, DPI, mark_sky
from ringwright.image import Image
from ringwright.products import written_whole

# c² / (2 k) in SI (CODATA 2018 exact values), janskys and square µas: brings Jy/µas² at ν in Hz to kelvin.
SPEED_OF_LIGHT = 299_792_458.0
BOLTZMANN = 1.380649e-23
JANSKY = 1e-26
MICROARCSECOND = np.pi / 180.0 / 3600.0 * 1e-6


def brightness_temperature(jy_per_square_uas: Array | float, frequency_hz: float) -> Array | float:
    """Rayleigh–Jeans brightness temperature [K] of a brightness in Jy per square µas."""
    intensity = jy_per_square_uas * JANSKY / MICROARCSECOND**2
    return intensity * SPEED_OF_LIGHT**2 / (2.0 * BOLTZMANN * frequency_hz**2)


def draw_image(image: Image, path: str | Path) -> Path:
    """Draw all the light of an image and write a PNG."""
    figure = Figure(figsize=(6.6, 5.6), facecolor="white")
    FigureCanvasAgg(figure)
    axes = figure.add_axes((0.12, 0.115, 0.70, 0.825))
    shown, label = _shown(image)
    unit = "M" if image.theta_g_uas is None else "µas"
    reach = 0.5 * image.intensity.shape[2] * float(image.pixel.value)
    picture = axes.imshow(
        shown,
        origin="lower",
        extent=(reach, -reach, -reach, reach),
        cmap=COLOUR_MAP,
        vmin=0.0,
        vmax=float(shown.max()) or 1.0,
        interpolation="nearest",
    )
    axes.set_xlabel(f"offset to the east [{unit}]")
    axes.set_ylabel(f"offset to the north [{unit}]")
    axes.set_title(image.name + _band(image), fontsize=10, loc="left")
    mark_sky(axes, unit)
    colours = figure.colorbar(picture, cax=figure.add_axes((0.845, 0.115, 0.03, 0.825)))
    colours.set_label(label)
    with written_whole(path) as temporary:
        figure.savefig(
            temporary, format="png", dpi=DPI, metadata={"Software": "ringwright", "Title": image.name}
        )
    return Path(path)


def _shown(image: Image) -> tuple[Array, str]:
    total = image.total
    if image.in_jansky and image.frequency_hz and image.theta_g_uas:
        area = (image.pixel_m * image.theta_g_uas) ** 2
        kelvin = np.asarray(brightness_temperature(total / area, image.frequency_hz))
        return kelvin / 1e9, "brightness temperature [10⁹ K]"
    return total / (float(total.max()) or 1.0), "brightness, relative to the maximum"


def _band(image: Image) -> str:
    return "" if image.frequency_hz is None else f", {image.frequency_hz / 1e9:g} GHz"
