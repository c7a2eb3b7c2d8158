"""The conversion factor k = d/θ_g of every scene against each parameter, and its posterior.

One panel for each parameter that some scan varies; the last shows how the posterior weight is spread over k. k has no unit.
"""

from __future__ import annotations

import math

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.lines import Line2D

from ringwright.comparing import formats
from ringwright.comparing.answering import SCHWARZSCHILD_CURVE
from ringwright.comparing.results import Comparison, FamilyAnswer
from ringwright.comparing.wording import resolution
from ringwright.comparing.words import plain as in_words
from ringwright.figures.families import (
    PRIOR,
    QUIET,
    SMALL,
    Array,
    bar,
    fitting,
    framed,
    plain,
    span,
    steps,
)
from ringwright.scanning.table import ScanParameter

COLUMNS = 3
JITTER = 0.28
FACTOR_BINS = 14  # each scene is nearly one value of k, so a step must gather tens of scenes
FAINTEST, STRONGEST = 0.18, 0.75  # opacity of a dot from no posterior weight to the most
BAR_PLACE, BAR_STEP = 1.08, 0.07  # where intervals stand beside the steps, whose highest is 1


def factors(comparison: Comparison) -> Figure:
    """The conversion factor of every scene against each parameter, and its posterior."""
    observed = comparison.observation
    keys = list(
        dict.fromkeys(item.key for family, _ in fitting(comparison) for item in family.table.parameters)
    )
    rows = math.ceil((len(keys) + 1) / COLUMNS)
    title = (
        f"{observed.name}: conversion factor k = d/θ_g of each scene,\n"
        f"for a ring diameter {formats.published(observed.diameter, 'µas')}, {resolution(observed)}"
    )
    figure = framed(3.5 * COLUMNS, 3.1 * rows + 0.9, title)
    panels = figure.subplots(rows, COLUMNS, squeeze=False, sharey=True).ravel()
    for key, axes in zip(keys, panels, strict=False):
        _against(axes, comparison, key)
    _posterior(panels[len(keys)], comparison)
    for axes in panels[len(keys) + 1 :]:
        axes.set_axis_off()
    for axes in panels[::COLUMNS]:
        axes.set_ylabel("k = d/θ$_g$")
    _legend(figure, comparison, list(panels[len(keys) + 1 :]))
    return figure


def _legend(figure: Figure, comparison: Comparison, free: list[Axes]) -> None:
    """In an empty panel where there is one, otherwise below."""
    handles: list[Line2D] = [
        Line2D([], [], color=ink, marker="o", linestyle="none", markersize=5, label=family.family)
        for family, ink in fitting(comparison)
    ]
    label = f"critical curve without spin, 2√27 = {SCHWARZSCHILD_CURVE:.2f}"
    handles.append(Line2D([], [], color=PRIOR, linewidth=1.0, linestyle="--", label=label))
    note = "Dots fade with the scene's posterior weight.\nBars: median, 68 % (thick) and 95 % (thin) of k."
    if free:
        free[0].legend(handles=handles, loc="upper left", fontsize=SMALL, frameon=False)
        free[0].text(0.03, 0.08, note, transform=free[0].transAxes, fontsize=SMALL, color=QUIET)
        return
    below = figure.legend(
        handles=handles,
        loc="outside lower left",
        ncols=2,
        fontsize=SMALL,
        frameon=False,
        title=note.replace("\n", " "),
        title_fontsize=SMALL,
        alignment="left",
    )
    below.get_title().set_color(QUIET)


def _against(axes: Axes, comparison: Comparison, key: str) -> None:
    for family, ink in fitting(comparison):
        for parameter in family.table.parameters:
            if parameter.key == key:
                _dots(axes, family, parameter, ink)
    axes.axhline(SCHWARZSCHILD_CURVE, color=PRIOR, linewidth=1.0, linestyle="--")
    plain(axes)


def _dots(axes: Axes, family: FamilyAnswer, parameter: ScanParameter, ink: str) -> None:
    assert family.posterior is not None
    x, unit = _shown(parameter)
    share = family.posterior.shares()
    alpha = FAINTEST + (STRONGEST - FAINTEST) * share / share.max()
    axes.scatter(x, np.exp(family.posterior.factor), s=9, color=ink, alpha=alpha, linewidths=0)
    if parameter.kind == "list":
        values = np.unique(parameter.values)
        axes.set_xticks(values, parameter.labels or [f"{value:g}" for value in values], fontsize=8)
    words = in_words(parameter.key)
    axes.set_xlabel(f"{words} [{unit}]" if unit else words, fontsize=9)


def _shown(parameter: ScanParameter) -> tuple[Array, str]:
    """Values as they are drawn: angles in degrees, choices side by side and spread a little."""
    if parameter.unit == "rad":
        return np.degrees(parameter.values), "deg"
    if parameter.kind == "list":
        spread = np.random.default_rng(0).uniform(-JITTER, JITTER, parameter.values.size)
        step = float(np.min(np.diff(np.unique(parameter.values)), initial=1.0))
        return parameter.values + spread * step, parameter.unit
    return parameter.values, parameter.unit


def _posterior(axes: Axes, comparison: Comparison) -> None:
    families = fitting(comparison)
    for place, (family, ink) in enumerate(families):
        assert family.curves.factor is not None
        edges = np.linspace(*span([family.curves.factor]), FACTOR_BINS + 1)
        steps(axes, family.curves.factor, edges, orientation="horizontal", color=ink, linewidth=1.4)
        bar(axes, family.conversion_factor, BAR_PLACE + BAR_STEP * place, ink, upright=True)
    axes.axhline(SCHWARZSCHILD_CURVE, color=PRIOR, linewidth=1.0, linestyle="--")
    axes.set_xlabel("posterior of k, highest step = 1", fontsize=9)
    axes.set_xlim(0.0, BAR_PLACE + BAR_STEP * (len(families) - 1) + 0.05)
    axes.set_xticks([0.0, 0.5, 1.0])
    plain(axes)
