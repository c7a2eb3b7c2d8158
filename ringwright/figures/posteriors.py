"""The posteriors of θ_g and the mass: distributions above, each with its median and intervals in a row of its own below.

Distributions are drawn relative to their highest step, so that a narrow prior does not flatten a wide posterior. Angles in µas,
masses in powers of ten of the solar mass.
"""

from __future__ import annotations

import textwrap
from dataclasses import dataclass

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.ticker import NullLocator

from ringwright.comparing import formats
from ringwright.comparing.cautions import END_SHARE, cut_share
from ringwright.comparing.distributions import LogDensity
from ringwright.comparing.results import Comparison, Estimate
from ringwright.comparing.wording import resolution
from ringwright.figures.families import (
    ALL,
    BINS,
    PRIOR,
    SMALL,
    bar,
    caption,
    fitting,
    framed,
    plain,
    span,
    steps,
)

NAME_WIDTH = 30  # characters of a line of a row's name


@dataclass(frozen=True)
class Row:
    """One distribution: what it is called and how it is drawn."""

    name: str
    density: LogDensity
    estimate: Estimate
    ink: str
    line: str = "-"
    drawn: bool = True  # as steps above its row


def posteriors(comparison: Comparison) -> Figure:
    """θ_g and, with a distance, the mass: ring only by family, combined, and the prior."""
    observed = comparison.observation
    quantities = ["theta_g"] if comparison.curves.mass is None else ["theta_g", "mass"]
    columns = [rows_of(comparison, name) for name in quantities]
    title = (
        f"{observed.name}: ring diameter {formats.published(observed.diameter, 'µas')}, "
        f"{resolution(observed)}\nprior of the ring alone: {comparison.prior['theta_g, ring only']}"
    )
    below = 0.25 + 0.36 * len(columns[0])
    figure = framed(2.6 + 3.6 * len(columns), 3.5 + below, title)
    panels = figure.subplots(
        2, len(columns), squeeze=False, sharex="col", sharey="row", height_ratios=[3.4, below]
    )
    for column, (name, rows) in enumerate(zip(quantities, columns, strict=True)):
        _column(panels[:, column], comparison, name, rows)
    panels[0, 0].set_ylabel("probability density,\nhighest step = 1")
    caption(figure, _caption(comparison))
    return figure


def rows_of(comparison: Comparison, name: str) -> list[Row]:
    """Every distribution of a quantity ("theta_g" or "mass"), in the order of the rows.

    Where several families stand together, steps for everything would hide each other: then they show the ring alone and the prior.
    """
    families = fitting(comparison)
    rows = []
    for family, ink in families:
        alone, both = getattr(family.curves, name), getattr(family.curves, f"{name}_combined")
        rows.append(Row(family.family, alone, getattr(family.ring_only, name), ink))
        if both is not None and family.combined is not None:
            label = f"{family.family}, with the prior"
            combined = getattr(family.combined, name)
            rows.append(Row(label, both, combined, ink, "--", drawn=len(families) == 1))
    if len(families) > 1:
        pooled = getattr(comparison.curves, name)
        rows.append(Row("families pooled", pooled, getattr(comparison.ring_only, name), ALL, drawn=False))
    prior = getattr(comparison.curves, f"{name}_prior")
    if prior is not None:
        rows.append(Row("prior on the scale", prior, Estimate.of(prior, rows[0].estimate.unit), PRIOR, ":"))
    return rows


def _column(panels: np.ndarray, comparison: Comparison, name: str, rows: list[Row]) -> None:
    upper, lower = panels
    low, high = span([row.density for row in rows])
    exponent = 0 if name == "theta_g" else formats.power(comparison.ring_only.mass.number)
    scale = 10.0**exponent
    for row in rows:
        if row.drawn:
            style = {"color": row.ink, "linestyle": row.line, "linewidth": 1.6}
            steps(upper, row.density, np.linspace(low, high, BINS + 1), scale, **style)
    upper.set_xlim(low / scale, high / scale)
    upper.set_ylim(0.0, 1.06)
    upper.set_title("Angular gravitational radius" if name == "theta_g" else "Mass", fontsize=10, loc="left")
    unit = "θ$_g$ [µas]" if name == "theta_g" else f"M [{formats.ten_to(exponent)} M$_\\odot$]"
    _intervals(lower, rows, scale, unit)
    plain(upper)


def _intervals(axes: Axes, rows: list[Row], scale: float, unit: str) -> None:
    """A row for each distribution, named in its ink."""
    for place, row in enumerate(rows):
        bar(axes, row.estimate, place, row.ink, scale=scale)
        axes.axhline(place, color=row.ink, linewidth=0.4, linestyle=":", zorder=0)
    names = [textwrap.fill(row.name, NAME_WIDTH) for row in rows]
    axes.set_yticks(range(len(rows)), names, fontsize=SMALL)
    for label, row in zip(axes.get_yticklabels(), rows, strict=False):  # only the first column has names
        label.set_color(row.ink)
    axes.yaxis.set_minor_locator(NullLocator())
    axes.set_ylim(len(rows) - 0.4, -0.6)
    axes.set_xlabel(unit)
    plain(axes)
    axes.tick_params(axis="y", length=0, labelsize=SMALL)


def _caption(comparison: Comparison) -> str:
    """How to read it, and which families are cut where their ring is lost."""
    several = len(fitting(comparison)) > 1
    prior = "" if comparison.curves.theta_g_prior is None else " and of the prior"
    shown = f", of the ring alone{prior}" if several else ""
    lines = [
        f"Steps: {BINS} over the axis{shown}. Bars: median, 68 % (thick) and 95 % (thin), ring alone unless said."
    ]
    for family, _ in fitting(comparison):
        assert family.posterior is not None
        share = cut_share(comparison.observation, family.table, family.posterior)
        if share > END_SHARE:
            lines.append(
                f"{family.family}: {100 * share:.0f} % of the posterior weight is cut on the side of small θ_g, "
                "where the readings end."
            )
    return "\n".join(lines)
