"""The diameters that scenes read against θ_g, or that a prior on the scale predicts, beside the observed one.

At each θ_g a band holds the middle 68 % of the prior weight of the scenes that show a ring there; where none does, it ends. Angles
in µas.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure

from ringwright.comparing import formats
from ringwright.comparing.inputs import Observed
from ringwright.comparing.likelihood import closed_rings, read, unsmoothed
from ringwright.comparing.results import Comparison
from ringwright.comparing.wording import resolution
from ringwright.figures.families import (
    BINS,
    OBSERVED,
    SMALL,
    Array,
    bar,
    caption,
    fitting,
    framed,
    plain,
    span,
)
from ringwright.scanning.table import ScanTable

CURVE_POINTS = 61
PREDICTION_NODES = 41
SPREAD = 0.75  # of the observed error, up and down, over which the bars of several families stand
SHOWN = 0.99  # share of what a prior predicts that the frame holds
FEW = 0.05  # of the prior weight: with less of it showing a ring, a median says nothing


def diameters(comparison: Comparison) -> Figure:
    """Diameters that scenes read against θ_g, or that the prior predicts, beside the observed one."""
    observed = comparison.observation
    with_prior = comparison.curves.theta_g_prior is not None
    title = (
        f"{observed.name}: ring diameters of the scenes, and the observed one, "
        f"{formats.published(observed.diameter, 'µas')}\n{resolution(observed)}"
    )
    figure = framed(9.6 if with_prior else 7.0, 5.4, title)
    ratios = [1.9, 1.0] if with_prior else [1.0]
    panels = figure.subplots(1, len(ratios), squeeze=False, sharey=True, width_ratios=ratios)[0]
    _readings(panels[0], comparison)
    if with_prior:
        _predictions(panels[1], comparison)
    panels[0].legend(loc="upper left", fontsize=SMALL, frameon=False)
    several = len(fitting(comparison)) > 1
    bars = "68 %; their heights part the families" if several else "68 % (thick) and 95 % (thin)"
    note = (
        "Line and band: median and 68 % of the scenes that show a ring; they end where nearly all lose it.\n"
        f"Dot and bar: median of θ_g of the ring alone, {bars}."
    )
    caption(figure, note)
    return figure


def _readings(axes: Axes, comparison: Comparison) -> None:
    observed, families = comparison.observation, fitting(comparison)
    curves = [family.curves.theta_g for family, _ in families if family.curves.theta_g is not None]
    low, high = span(curves)
    theta = np.linspace(low, high, CURVE_POINTS)
    _observed_band(axes, observed, "observed diameter, 68 %")
    places = np.linspace(-SPREAD, SPREAD, len(families)) if len(families) > 1 else [0.0]
    for (family, ink), place in zip(families, places, strict=True):
        assert family.posterior is not None
        weight = family.posterior.weight
        lower, middle, upper = quantiles(predicted(observed, family.table, theta), weight)
        axes.fill_between(theta, lower, upper, color=ink, alpha=0.18, linewidth=0)
        axes.plot(theta, middle, color=ink, linewidth=1.8, label=family.family)
        d = observed.diameter
        at = d.mode + place * (d.plus if place > 0.0 else d.minus)
        bar(axes, family.ring_only.theta_g, at, ink, wide=len(families) == 1)
    axes.set_xlim(low, high)
    axes.set_xlabel("angular gravitational radius θ$_g$ [µas]")
    axes.set_ylabel("ring diameter as measured [µas]")
    axes.margins(y=0.04)
    plain(axes)


def _predictions(axes: Axes, comparison: Comparison) -> None:
    """Diameters that the prior on the scale predicts, before the ring was looked at, as steps."""
    observed, prior = comparison.observation, comparison.curves.theta_g_prior
    assert prior is not None
    theta, _ = prior.nodes(PREDICTION_NODES)
    _observed_band(axes, observed, "observed")
    found = []
    for family, ink in fitting(comparison):
        assert family.posterior is not None
        values = predicted(observed, family.table, theta)
        weight = np.broadcast_to(family.posterior.weight[:, None], values.shape)
        seen = np.isfinite(values) & (weight > 0.0)
        if seen.any():
            found.append((values[seen], weight[seen], ink))
    if found:
        low, high = _frame(axes, [(values, weight) for values, weight, _ in found])
        edges = np.linspace(low, high, BINS + 1)
        for values, weight, ink in found:
            height = np.histogram(values, edges, weights=weight)[0]
            axes.stairs(
                height / height.max(),
                edges,
                orientation="horizontal",
                baseline=None,
                color=ink,
                linewidth=1.5,
            )
        axes.set_ylim(low, high)
    axes.set_xlim(0.0, 1.06)
    axes.set_xlabel("predicted from the prior on the\nscale alone, highest step = 1", fontsize=9)
    plain(axes)


def _frame(axes: Axes, found: list[tuple[Array, Array]]) -> tuple[float, float]:
    """The frame as it is, widened to hold what is predicted."""
    low, high = axes.get_ylim()
    tail = 0.5 * (1.0 - SHOWN)
    for values, weight in found:
        ends = _weighted(values, weight, [tail, 1.0 - tail])
        low, high = min(low, ends[0]), max(high, ends[1])
    return low, high


def _observed_band(axes: Axes, observed: Observed, label: str) -> None:
    d = observed.diameter
    axes.axhspan(d.mode - d.minus, d.mode + d.plus, color=OBSERVED, alpha=0.28, linewidth=0, label=label)
    axes.axhline(d.mode, color=OBSERVED, linewidth=1.2)


def predicted(observed: Observed, table: ScanTable, theta: Array) -> Array:
    """Diameter [µas] of every scene at each θ_g, at the middle resolution; NaN where there is no ring."""
    closed = closed_rings(table)
    if not observed.resolution:
        return unsmoothed(table, closed)[:, None] * theta
    x = float(np.mean(observed.resolution)) / theta
    rows = [
        read(table.node[i, :count], closed[i, :count], x) if count else np.full(x.size, np.nan)
        for i, count in enumerate(table.node_count)
    ]
    return np.array(rows) * theta


def quantiles(values: Array, weight: Array) -> Array:
    """Weighted 16, 50 and 84 % over scenes at each θ_g (3, θ_g); NaN where next to no scene shows a ring."""
    result = np.full((3, values.shape[1]), np.nan)
    for column, each in enumerate(values.T):
        found = np.isfinite(each) & (weight > 0.0)
        if weight[found].sum() > FEW * weight.sum():
            result[:, column] = _weighted(each[found], weight[found], [0.16, 0.5, 0.84])
    return result


def _weighted(values: Array, weight: Array, shares: Sequence[float]) -> Array:
    """Values below which these shares of the weight lie."""
    order = np.argsort(values)
    running = np.cumsum(weight[order])
    return np.interp(np.array(shares) * running[-1], running, values[order])
