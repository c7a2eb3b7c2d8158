"""Pictures of a comparison: posteriors with the prior, the conversion factor over scenes, predicted against
observed diameter.

Distributions are drawn relative to their peak, so that a narrow prior does not flatten a wide posterior;
shaded is the 68 % interval of the ring alone. Angles in µas, masses in powers of ten of the solar mass, the
conversion factor k = d/θ_g without a unit.
"""

from __future__ import annotations

import math
from pathlib import Path
from typing import Any

import numpy as np
from matplotlib.axes import Axes
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.figure import Figure
from numpy.typing import NDArray

from ringwright.comparing import formats
from ringwright.comparing.answering import SCHWARZSCHILD_CURVE
from ringwright.comparing.distributions import LogDensity
from ringwright.comparing.inputs import Observed
from ringwright.comparing.likelihood import closed_rings, read, unsmoothed
from ringwright.comparing.results import Comparison, Estimate, FamilyAnswer
from ringwright.comparing.wording import resolution
from ringwright.products import written_whole
from ringwright.scanning.table import ScanParameter, ScanTable

Array = NDArray[np.float64]

# Muted inks that differ in lightness as well as in hue, so that they part in grey print too.
INKS = ("#0b6e6e", "#c2571a", "#5b3f8c", "#8a9a1f", "#b03060", "#2f5fa7")
ALL = "#222222"
PRIOR = "#8c8c8c"
OBSERVED = "#d9a400"
DPI = 150
PLOTTED_TAIL = 1e-3  # probability left out at either end of an axis
COLUMNS = 3
CURVE_POINTS = 61
PREDICTION_NODES = 41
BINS = 24
JITTER = 0.28


def draw_comparison(comparison: Comparison, stem: str | Path) -> list[Path]:
    """Write the pictures of a comparison as PNGs whose names start with `stem`.

    Parameters
    ----------
    comparison : Comparison
    stem : path
        Folder and beginning of the name; "-posterior.png", "-factor.png" and "-diameter.png" are added.

    Returns
    -------
    list of Path
        What was written; nothing when no scene fits.
    """
    if comparison.curves.theta_g is None:
        return []
    pictures = {"posterior": posteriors, "factor": factors, "diameter": diameters}
    name = comparison.observation.name
    return [
        _write(draw(comparison), path, name)
        for draw, path in zip(pictures.values(), targets(stem), strict=True)
    ]


def targets(stem: str | Path) -> list[Path]:
    """The files that `draw_comparison` writes."""
    return [Path(f"{stem}-{name}.png") for name in ("posterior", "factor", "diameter")]


def _write(figure: Figure, path: Path, name: str) -> Path:
    FigureCanvasAgg(figure)
    with written_whole(path) as temporary:
        figure.savefig(temporary, format="png", dpi=DPI, metadata={"Software": "ringwright", "Title": name})
    return path


def _figure(width: float, height: float, title: str) -> Figure:
    figure = Figure(figsize=(width, height), facecolor="white", layout="constrained")
    figure.suptitle(title.replace("θ_g", "θ$_g$"), fontsize=10.5, x=0.012, ha="left")
    return figure


def _fitting(comparison: Comparison) -> list[tuple[FamilyAnswer, str]]:
    """Families that fit, with their inks."""
    coloured = [(family, INKS[i % len(INKS)]) for i, family in enumerate(comparison.families)]
    return [(family, ink) for family, ink in coloured if family.posterior is not None]


def posteriors(comparison: Comparison) -> Figure:
    """θ_g and, with a distance, the mass: ring only by family, combined, and the prior."""
    with_mass = comparison.curves.mass is not None
    observed = comparison.observation
    title = (
        f"{observed.name}: ring diameter {formats.published(observed.diameter, 'µas')}, "
        f"{resolution(observed)}\nprior of the ring alone: {comparison.prior['theta_g, ring only']}"
    )
    figure = _figure(9.6 if with_mass else 6.0, 4.8, title)
    axes = figure.subplots(1, 2 if with_mass else 1, squeeze=False)[0]
    _posterior(axes[0], comparison, "theta_g", 1.0)
    axes[0].set_xlabel("angular gravitational radius θ$_g$ [µas]")
    if with_mass:
        exponent = formats.power(comparison.ring_only.mass.number)
        _posterior(axes[1], comparison, "mass", 10.0**exponent)
        axes[1].set_xlabel(f"mass [{formats.ten_to(exponent)} M$_\\odot$]")
    axes[0].set_ylabel("probability density, relative to its peak\n(shaded: 68 % of the ring alone)")
    handles, labels = axes[-1].get_legend_handles_labels()
    figure.legend(handles, labels, loc="outside lower left", ncols=2, fontsize=8.5, frameon=False)
    return figure


def _posterior(axes: Axes, comparison: Comparison, name: str, scale: float) -> None:
    families = _fitting(comparison)
    shown: list[LogDensity] = []
    for family, ink in families:
        alone, both = getattr(family.curves, name), getattr(family.curves, f"{name}_combined")
        estimate = getattr(family.ring_only, name)
        _curve(axes, alone, scale, color=ink, linewidth=1.8, label=f"ring only: {family.family}")
        _shade(axes, alone, estimate, scale, ink)
        if both is not None:
            label = f"with the prior on the scale: {family.family}"
            _curve(axes, both, scale, color=ink, linewidth=1.4, linestyle=(0, (5, 2)), label=label)
        shown += [item for item in (alone, both) if item is not None]
    if len(families) > 1:
        label = "ring only: families pooled at equal prior weight"
        _curve(
            axes,
            getattr(comparison.curves, name),
            scale,
            color=ALL,
            linewidth=1.0,
            linestyle="-.",
            label=label,
        )
    prior = getattr(comparison.curves, f"{name}_prior")
    if prior is not None:
        _curve(
            axes, prior, scale, color=PRIOR, linewidth=1.6, linestyle=":", label=("prior on the scale alone")
        )
        shown.append(prior)
    low = min(item.quantile(PLOTTED_TAIL) for item in shown)
    high = max(item.quantile(1.0 - PLOTTED_TAIL) for item in shown)
    axes.set_xlim(low / scale, high / scale)
    axes.set_ylim(0.0, 1.08)
    _plain(axes)


def _curve(axes: Axes, density: LogDensity, scale: float, **style: Any) -> None:
    x, y = density.curve()
    axes.plot(x / scale, y / y.max(), **style)


def _shade(axes: Axes, density: LogDensity, estimate: Estimate, scale: float, ink: str) -> None:
    x, y = density.curve()
    inside = (x > estimate.number - estimate.minus) & (x < estimate.number + estimate.plus)
    axes.fill_between(x[inside] / scale, y[inside] / y.max(), color=ink, alpha=0.16, linewidth=0)


def _plain(axes: Axes) -> None:
    axes.spines[["top", "right"]].set_visible(False)
    axes.tick_params(labelsize=9)


def factors(comparison: Comparison) -> Figure:
    """The conversion factor of every scene against each parameter, and its posterior."""
    keys = list(
        dict.fromkeys(item.key for family, _ in _fitting(comparison) for item in family.table.parameters)
    )
    rows = math.ceil((len(keys) + 1) / COLUMNS)
    title = "Conversion factor k = d/θ$_g$ of each scene; dots fade with the scene's posterior weight"
    figure = _figure(3.5 * COLUMNS, 3.1 * rows + 0.9, title)
    panels = figure.subplots(rows, COLUMNS, squeeze=False, sharey=True).ravel()
    for key, axes in zip(keys, panels, strict=False):
        _against(axes, comparison, key)
    _factor_posterior(panels[len(keys)], comparison)
    for axes in panels[len(keys) + 1 :]:
        axes.set_visible(False)
    for axes in panels[::COLUMNS]:
        axes.set_ylabel("k = d/θ$_g$")
    handles, labels = panels[len(keys)].get_legend_handles_labels()
    figure.legend(handles, labels, loc="outside lower left", ncols=2, fontsize=8.5, frameon=False)
    return figure


def _against(axes: Axes, comparison: Comparison, key: str) -> None:
    for family, ink in _fitting(comparison):
        for parameter in family.table.parameters:
            if parameter.key == key:
                _dots(axes, family, parameter, ink)
    axes.axhline(SCHWARZSCHILD_CURVE, color=PRIOR, linewidth=1.0, linestyle="--")
    _plain(axes)


def _dots(axes: Axes, family: FamilyAnswer, parameter: ScanParameter, ink: str) -> None:
    assert family.posterior is not None
    x, unit = _shown(parameter)
    share = family.posterior.shares()
    alpha = np.clip(share / share.max(), 0.04, 1.0) * 0.7
    axes.scatter(x, np.exp(family.posterior.factor), s=9, color=ink, alpha=alpha, linewidths=0)
    if parameter.kind == "list":
        values = np.unique(parameter.values)
        axes.set_xticks(values, parameter.labels or [f"{value:g}" for value in values], fontsize=8)
    axes.set_xlabel(f"{parameter.key} [{unit}]" if unit else parameter.key, fontsize=9)


def _shown(parameter: ScanParameter) -> tuple[Array, str]:
    """Values as they are drawn: angles in degrees, choices side by side and spread a little."""
    if parameter.unit == "rad":
        return np.degrees(parameter.values), "deg"
    if parameter.kind == "list":
        spread = np.random.default_rng(0).uniform(-JITTER, JITTER, parameter.values.size)
        step = float(np.min(np.diff(np.unique(parameter.values)), initial=1.0))
        return parameter.values + spread * step, parameter.unit
    return parameter.values, parameter.unit


def _factor_posterior(axes: Axes, comparison: Comparison) -> None:
    for family, ink in _fitting(comparison):
        density = family.curves.factor
        assert density is not None
        edges = np.linspace(density.quantile(PLOTTED_TAIL), density.quantile(1.0 - PLOTTED_TAIL), BINS + 1)
        below = np.array([density.probability_below(edge) for edge in edges])
        height = np.diff(below) / np.diff(below).max() if edges[-1] > edges[0] else np.ones(BINS)
        axes.stairs(height, edges, orientation="horizontal", fill=True, color=ink, alpha=0.25)
        axes.stairs(height, edges, orientation="horizontal", color=ink, linewidth=1.4, label=family.family)
    label = f"critical curve without spin, 2√27 = {SCHWARZSCHILD_CURVE:.2f}"
    axes.axhline(SCHWARZSCHILD_CURVE, color=PRIOR, linewidth=1.0, linestyle="--", label=label)
    axes.set_xlabel("posterior of k, relative to its peak", fontsize=9)
    axes.set_xlim(0.0, 1.08)
    _plain(axes)


def diameters(comparison: Comparison) -> Figure:
    """Diameters that scenes read against θ_g, or that the prior predicts, beside the observed one."""
    with_prior = comparison.curves.theta_g_prior is not None
    observed = comparison.observation
    title = f"{observed.name}: predicted and observed ring diameter"
    figure = _figure(9.6 if with_prior else 6.4, 4.8, title)
    ratios = [1.9, 1.0] if with_prior else [1.0]
    panels = figure.subplots(1, len(ratios), squeeze=False, sharey=True, width_ratios=ratios)[0]
    _readings(panels[0], comparison)
    if with_prior:
        _predictions(panels[1], comparison)
    handles, labels = panels[0].get_legend_handles_labels()
    figure.legend(handles, labels, loc="outside lower left", ncols=1, fontsize=8.5, frameon=False)
    return figure


def _readings(axes: Axes, comparison: Comparison) -> None:
    observed, families = comparison.observation, _fitting(comparison)
    curves = [family.curves.theta_g for family, _ in families]
    low = 0.9 * min(curve.quantile(PLOTTED_TAIL) for curve in curves if curve is not None)
    high = 1.1 * max(curve.quantile(1.0 - PLOTTED_TAIL) for curve in curves if curve is not None)
    theta = np.linspace(low, high, CURVE_POINTS)
    _observed_band(axes, observed, "observed diameter, 68 %")
    for family, ink in families:
        _map(axes, observed, family, ink, theta)
    axes.set_xlim(low, high)
    centre, reach = observed.diameter.mode, max(observed.diameter.plus, observed.diameter.minus)
    axes.set_ylim(max(0.0, centre - 6.0 * reach), centre + 6.0 * reach)
    axes.set_xlabel("angular gravitational radius θ$_g$ [µas]")
    axes.set_ylabel("ring diameter as measured [µas]")
    _plain(axes)


def _map(axes: Axes, observed: Observed, family: FamilyAnswer, ink: str, theta: Array) -> None:
    """What the scenes of a family read against θ_g, and the θ_g that the ring alone gives."""
    assert family.posterior is not None
    lower, middle, upper = _quantiles(predicted(observed, family.table, theta), family.posterior.weight)
    label = f"{family.family}: median and 68 % of its scenes; dot: θ$_g$ of the ring alone, 68 %"
    axes.fill_between(theta, lower, upper, color=ink, alpha=0.22, linewidth=0)
    axes.plot(theta, middle, color=ink, linewidth=1.8, label=label)
    estimate = family.ring_only.theta_g
    at, reach = (estimate.number, observed.diameter.mode), [[estimate.minus], [estimate.plus]]
    axes.errorbar(*at, xerr=reach, fmt="o", color=ink, markeredgecolor="white", markersize=7.0, capsize=4.0)


def _predictions(axes: Axes, comparison: Comparison) -> None:
    """Histogram of the diameters that the prior on the scale predicts, before the ring was looked at."""
    observed, prior = comparison.observation, comparison.curves.theta_g_prior
    assert prior is not None
    theta, _ = prior.nodes(PREDICTION_NODES)
    _observed_band(axes, observed, "observed")
    low, high = axes.get_ylim()
    for family, ink in _fitting(comparison):
        assert family.posterior is not None
        values = predicted(observed, family.table, theta)
        weight = np.broadcast_to(family.posterior.weight[:, None], values.shape)
        found = np.isfinite(values)
        height, edges = np.histogram(values[found], BINS, (low, high), weights=weight[found])
        if height.max() > 0.0:
            axes.stairs(height / height.max(), edges, orientation="horizontal", color=ink, linewidth=1.5)
    axes.set_xlim(0.0, 1.08)
    axes.set_xlabel(
        "predicted from the prior on the scale\nbefore the ring, relative to its peak", fontsize=9
    )
    _plain(axes)


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


def _quantiles(values: Array, weight: Array) -> Array:
    """Weighted 16, 50 and 84 % over scenes at each θ_g (3, θ_g); NaN where no scene shows a ring."""
    result = np.full((3, values.shape[1]), np.nan)
    for column, each in enumerate(values.T):
        found = np.isfinite(each) & (weight > 0.0)
        if found.any():
            order = np.argsort(each[found])
            running = np.cumsum(weight[found][order])
            result[:, column] = np.interp(
                np.array([0.16, 0.5, 0.84]) * running[-1], running, each[found][order]
            )
    return result
