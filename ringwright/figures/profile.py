"""Pictures of a profile: cuts through every order, envelopes of their visibilities, rings against position angle.

Each order keeps one colour and one line style throughout. Cuts are in M from the critical curve, so that every ring can be
shown at its own scale; baselines in Gλ on both axes logarithmic.
"""

from __future__ import annotations

import math
from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np
from matplotlib import colormaps
from matplotlib.axes import Axes
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.figure import Figure

from raytrace.contract import Array
from ringwright.figures.sky import COLOUR_MAP, DPI
from ringwright.products import written_whole
from ringwright.profiling.sight import EARTH_DIAMETER, SPEED_OF_LIGHT

if TYPE_CHECKING:
    from ringwright.profiling.profile import Profile

PICTURES = ("cuts", "baselines", "rings")
STYLES = ("-", "-", "-", "--", "--", ":", ":", "-.")
# Cuts of the thin orders reach this share of their width beyond their light.
MARGIN = 0.15
# Amplitudes below this share of the flux are not drawn.
FLOOR = 1e-6


def targets(stem: Path) -> tuple[Path, ...]:
    """Where the pictures go."""
    return tuple(stem.with_name(f"{stem.name}-{name}.png") for name in PICTURES)


def draw_profile(profile: Profile, stem: Path) -> list[Path]:
    """Draw what there is; pictures of baselines only where θ_g is known. Returns the paths."""
    drawn = []
    for name, path, draw in zip(PICTURES, targets(stem), (_cuts, _baselines, _rings), strict=True):
        if name == "baselines" and profile.fringes is None:
            continue
        figure = draw(profile)
        FigureCanvasAgg(figure)
        with written_whole(path) as temporary:
            figure.savefig(
                temporary, format="png", dpi=DPI, metadata={"Software": "ringwright", "Title": profile.name}
            )
        drawn.append(path)
    return drawn


def _colour(order: int, orders: int) -> tuple[float, ...]:
    """From dark to light along the map of the sky pictures, short of its palest end."""
    return tuple(colormaps[COLOUR_MAP](0.88 * order / max(orders - 1, 1)))


def _cuts(profile: Profile) -> Figure:
    """All orders along the first direction, and each thin one at its own scale."""
    orders = profile.rings.flux.size
    thin = [order for order in range(1, orders) if profile.rings.flux[order] > 0.0]
    figure = Figure(
        figsize=(9.6, 3.4 + 2.5 * math.ceil(len(thin) / 4)), layout="constrained", facecolor="white"
    )
    upper, *lower = figure.subfigures(
        2 if thin else 1, 1, height_ratios=[3.2, 2.6][: 2 if thin else 1], squeeze=False
    )[:, 0]
    _whole_cut(upper.subplots(), profile)
    for axes, order in zip(np.ravel(lower[0].subplots(1, len(thin))) if thin else [], thin, strict=True):
        _thin_cut(axes, profile, order)
    figure.suptitle(f"{profile.name}: brightness along two opposite directions", fontsize=11)
    return figure


def _whole_cut(axes: Axes, profile: Profile) -> None:
    half = profile.cut_angle.size // 2
    ahead, back = profile.cuts[0], profile.cuts[half]
    orders = ahead.intensity.shape[0]
    top = max(float(ahead.total.max()), float(back.total.max()))
    for cut, sign in ((ahead, 1.0), (back, -1.0)):
        label = "all orders" if sign > 0.0 else None
        axes.plot(sign * cut.distance, cut.total / top, color="0.8", linewidth=3.5, label=label)
    for order in range(orders):
        for cut, sign in ((ahead, 1.0), (back, -1.0)):
            axes.plot(
                sign * cut.distance,
                np.where(cut.intensity[order] > 0.0, cut.intensity[order], np.nan) / top,
                color=_colour(order, orders),
                linestyle=STYLES[order],
                linewidth=1.3,
                label=f"n = {order}" if sign > 0.0 else None,
            )
    reach = 1.15 * max(float(np.nanmax(profile.rings.peak)), 6.0)
    axes.set_xlim(-reach, reach)
    axes.set_yscale("log")
    axes.set_ylim(1e-3, 3.0)
    axes.set_xlabel(_cut_label(profile, 0))
    axes.set_ylabel("brightness, relative to the maximum")
    axes.legend(frameon=False, ncols=orders + 1, fontsize=8, loc="upper center")


def _cut_label(profile: Profile, index: int) -> str:
    angle = math.degrees(profile.cut_angle[index]) % 360.0
    return f"distance from the hole toward position angle {angle:.0f}° [M]"


def _thin_cut(axes: Axes, profile: Profile, order: int) -> None:
    cut, orders = profile.cuts[0], profile.rings.flux.size
    light = cut.intensity[order]
    lit = np.flatnonzero(light > 0.0)
    critical = float(np.nanmedian(profile.rings.peak[order] - profile.rings.peak_offset[order]))
    if lit.size:
        low, high = cut.distance[lit[0]] - critical, cut.distance[lit[-1]] - critical
        power = math.floor(math.log10(max(abs(low), abs(high))))
        unit = 10.0**power
        axes.plot((cut.distance - critical) / unit, light / float(light.max()), color=_colour(order, orders))
        margin = MARGIN * (high - low)
        axes.set_xlim((low - margin) / unit, (high + margin) / unit)
        axes.axvline(0.0, color="0.6", linewidth=0.8, linestyle=":")
        axes.set_xlabel(
            f"from the critical curve [10$^{{{power}}}$ M]" if power else "from the critical curve [M]",
            fontsize=8,
        )
    axes.set_title(f"n = {order}", fontsize=9)
    axes.tick_params(labelsize=8)
    axes.set_ylim(0.0, 1.1)


def _baselines(profile: Profile) -> Figure:
    """Envelopes per order and the total along every direction."""
    found = profile.fringes
    assert found is not None
    count = found.position_angle.size
    figure = Figure(figsize=(9.6, 3.9 * count), layout="constrained", facecolor="white")
    axes = figure.subplots(count, 1, sharex=True, squeeze=False)[:, 0]
    for row in range(count):
        _envelopes(axes[row], profile, row)
    axes[-1].set_xlabel("length of the baseline [Gλ]")
    figure.suptitle(f"{profile.name}: visibility amplitude per order, and its envelopes", fontsize=11)
    handles, labels = axes[0].get_legend_handles_labels()
    figure.legend(handles, labels, loc="outside lower center", ncols=len(labels), frameon=False, fontsize=8)
    return figure


def _envelopes(axes: Axes, profile: Profile, row: int) -> None:
    found = profile.fringes
    assert found is not None
    unit = 1e3 if profile.unit == "Jy" else 1.0
    length = found.baseline[1:] / 1e9
    orders = found.envelope.shape[0]
    axes.plot(length, unit * np.abs(found.total[row, 1:]), color="0.8", linewidth=0.6, label="all the light")
    for order in range(orders):
        axes.plot(
            length,
            unit * found.envelope[order, row, 1:],
            color=_colour(order, orders),
            linestyle=STYLES[order],
            linewidth=1.6,
            label=f"n = {order}",
        )
        place = profile.carriers[order].baseline[row]
        if order and math.isfinite(place):
            axes.plot(
                place / 1e9,
                unit * profile.carriers[order].flux[row],
                "o",
                color=_colour(order, orders),
                markersize=6,
            )
    axes.set_xscale("log")
    axes.set_yscale("log")
    axes.set_xlim(1.0, length[-1])
    axes.set_ylim(unit * FLOOR * profile.total_flux, 1.5 * unit * profile.total_flux)
    if profile.frequency is not None:
        earth = EARTH_DIAMETER * profile.frequency / SPEED_OF_LIGHT / 1e9
        axes.axvline(earth, color="0.4", linewidth=0.9, linestyle="--")
        axes.annotate(
            "one Earth diameter",
            (earth, 0.03),
            xytext=(-3, 0),
            xycoords=("data", "axes fraction"),
            textcoords="offset points",
            rotation=90,
            fontsize=8,
            ha="right",
            va="bottom",
            color="0.3",
        )
    axes.set_ylabel(
        "visibility amplitude [mJy]" if profile.unit == "Jy" else "visibility amplitude over the flux"
    )
    angle = math.degrees(found.position_angle[row]) % 180.0
    axes.set_title(
        f"position angle {angle:.0f}°; dots: from here on an order has more than half of the envelope",
        fontsize=9,
        loc="left",
    )


def _rings(profile: Profile) -> Figure:
    """Where every ring lies and how wide it is against position angle, and the diameters that fringes tell."""
    rings = profile.rings
    orders = rings.flux.size
    panels = 3 if profile.spacings else 2
    figure = Figure(figsize=(9.6, 2.9 * panels), layout="constrained", facecolor="white")
    axes = figure.subplots(panels, 1, squeeze=False)[:, 0]
    angle = np.degrees(rings.position_angle)
    for order in range(orders):
        style = {"color": _colour(order, orders), "linestyle": STYLES[order], "label": f"n = {order}"}
        axes[0].plot(*_closed(angle, rings.mean[order], 360.0), **style)
        axes[1].plot(*_closed(angle, rings.width[order], 360.0), **style)
    critical = rings.peak - rings.peak_offset
    axes[0].plot(
        *_closed(angle, np.nanmedian(critical, axis=0), 360.0),
        color="0.6",
        linestyle=":",
        label="critical curve",
    )
    axes[0].set_ylabel("mean distance of the light [M]")
    axes[1].set_ylabel("width (second moment) [M]")
    axes[1].set_yscale("log")
    for panel in axes[:2]:
        panel.set_xlim(0.0, 360.0)
        panel.set_xticks(range(0, 361, 45))
        panel.set_xlabel("position angle, east of north [°]")
    if profile.spacings:
        _diameters(axes[2], profile)
    handles, labels = axes[0].get_legend_handles_labels()
    figure.legend(handles, labels, loc="outside lower center", ncols=len(labels), frameon=False, fontsize=8)
    figure.suptitle(f"{profile.name}: the rings against position angle", fontsize=11)
    return figure


def _diameters(axes: Axes, profile: Profile) -> None:
    orders = profile.rings.flux.size
    for spacing in profile.spacings:
        first = spacing.position_angle < math.pi
        axes.errorbar(
            np.degrees(spacing.position_angle[first]),
            spacing.diameter[first],
            yerr=spacing.error[first],
            fmt="o",
            markersize=3,
            linewidth=0.8,
            color=_colour(spacing.order, orders),
            label=f"n = {spacing.order}",
        )
    critical = profile.rings.peak - profile.rings.peak_offset
    axes.axhline(2.0 * float(np.nanmedian(critical)), color="0.6", linestyle=":", label="critical curve")
    axes.set_xlim(0.0, 180.0)
    axes.set_xticks(range(0, 181, 30))
    axes.set_xlabel("position angle of the baseline, east of north [°]")
    axes.set_ylabel("diameter by fringes [M]")


def _closed(angle: Array, values: Array, turn: float) -> tuple[Array, Array]:
    """The same curve with its first point again at the end."""
    return np.append(angle, turn), np.append(values, values[0])
