"""Priors of a comparison: on θ_g, on mass and distance together, and on the parameters of the scan's scenes.

With a prior on the mass, p(θ_g, D) ∝ L(θ_g) π_M(θ_g c²D/G) π_D(D) D: the factor D is the Jacobian from M to
θ_g (docs/comparing.md, step 6). Angles in µas, distances in Mpc, masses in solar masses;
densities are per unit ln θ_g.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from ringwright.comparing.distributions import LogDensity, TwoPiece, mixture
from ringwright.comparing.inputs import Observed
from ringwright.comparing.likelihood import Grid
from ringwright.errors import InputError
from ringwright.scanning.table import ScanParameter, ScanTable
from ringwright.units import THETA_G_OF_SUN

Array = NDArray[np.float64]


@dataclass(frozen=True)
class FlatPrior:
    """Flat in ln θ_g, or (`linear`) in θ_g itself, which favours scenes with a small conversion factor."""

    linear: bool = False

    def __call__(self, theta: Array) -> Array:
        return theta if self.linear else np.ones_like(theta)

    @property
    def text(self) -> str:
        """How the prior is named in print."""
        return "flat in θ_g (favours a small d/θ_g)" if self.linear else "flat in ln θ_g"


@dataclass(frozen=True)
class AnglePrior:
    """A prior on θ_g itself."""

    theta_g: TwoPiece

    def __call__(self, theta: Array) -> Array:
        return self.theta_g.density(theta) * theta

    @property
    def width(self) -> float:
        """Relative width that a grid has to resolve."""
        return self.theta_g.relative

    def span(self) -> tuple[float, float]:
        """θ_g [µas] that hold all of it."""
        return self.theta_g.span()

    def of_theta_g(self) -> LogDensity:
        """The prior as a distribution of θ_g."""
        return LogDensity.of(self.theta_g)


@dataclass(frozen=True)
class MassPrior:
    """Priors on mass and distance, which meet in θ_g = GM/(c²D)."""

    mass: TwoPiece
    distance: TwoPiece

    @property
    def width(self) -> float:
        """Relative width that a grid has to resolve: the wider of the two smooths the narrower."""
        return max(self.mass.relative, self.distance.relative)

    @property
    def over_mass(self) -> bool:
        """Whether mass, the narrower of the two, is the variable that is summed over."""
        return self.mass.relative < self.distance.relative

    def columns(self, theta: Array) -> tuple[Array, Array]:
        """Density at θ_g in parts (cell, node), one for each node of the variable summed over, and those
        nodes.
        """
        if self.over_mass:
            nodes, weight = self.mass.nodes()
            distance = THETA_G_OF_SUN * nodes / theta[:, None]
            return weight * self.distance.density(distance) * distance, nodes
        nodes, weight = self.distance.nodes()
        mass = theta[:, None] * nodes / THETA_G_OF_SUN
        return weight * self.mass.density(mass) * mass, nodes

    def __call__(self, theta: Array) -> Array:
        return self.columns(theta)[0].sum(axis=1)

    def span(self) -> tuple[float, float]:
        """θ_g [µas] that hold all of it."""
        (light, heavy), (near, far) = self.mass.span(), self.distance.span()
        if self.distance.exact:
            near = far = self.distance.mode
        return THETA_G_OF_SUN * light / far, THETA_G_OF_SUN * heavy / near

    def of_theta_g(self) -> LogDensity:
        """The prior as a distribution of θ_g, before any ring."""
        distances, weight = self.distance.nodes()
        return LogDensity.of(self.mass).times(THETA_G_OF_SUN / distances, weight)

    def mass_posterior(self, grid: Grid, cells: Array) -> LogDensity:
        """Posterior of the mass, from the posterior of θ_g on a grid: the joint one with the distance
        summed out.
        """
        columns, nodes = self.columns(np.exp(grid.centres))
        total = columns.sum(axis=1)
        joint = columns * (cells / np.where(total > 0.0, total, 1.0))[:, None]
        if self.over_mass:
            middle = 0.5 * (nodes[1:] + nodes[:-1])
            edges = np.concatenate(
                [[1.5 * nodes[0] - 0.5 * nodes[1]], middle, [1.5 * nodes[-1] - 0.5 * nodes[-2]]]
            )
            edges[0] = max(edges[0], 0.5 * nodes[0])
            return LogDensity.from_cells(np.log(edges), joint.sum(axis=0))
        weight = joint.sum(axis=0) / joint.sum()
        running = np.concatenate([np.zeros((1, nodes.size)), np.cumsum(joint, axis=0)])
        parts = [(w, running[:, j] / (running[-1, j] or 1.0)) for j, w in enumerate(weight)]
        return mixture(grid.edges, parts, np.log(nodes / THETA_G_OF_SUN))


ScalePrior = AnglePrior | MassPrior


def scale_prior(observed: Observed) -> ScalePrior | None:
    """The prior on θ_g or on the mass that an observation carries, if any."""
    if observed.theta_g is not None:
        return AnglePrior(observed.theta_g)
    if observed.mass is not None and observed.distance is not None:
        return MassPrior(observed.mass, observed.distance)
    return None


@dataclass(frozen=True)
class Replaced:
    """A prior of the observation that took the place of the scan's."""

    key: str
    old: str
    new: str
    covered: float  # probability of the new prior within the range of the scan


def scene_weights(observed: Observed, table: ScanTable) -> tuple[Array, tuple[Replaced, ...]]:
    """Prior weights of the scenes of a scan, new over old density for every parameter that has a prior of
    its own.
    """
    known = {parameter.key: parameter for parameter in table.parameters}
    weight = table.weight.copy()
    replaced = []
    for key, new in observed.scene_priors.items():
        if key not in known:
            varied = ", ".join(known) or "nothing"
            raise InputError(
                f"the prior on {key} has nothing to act on: the scan {table.name} varies {varied}"
            )
        parameter = known[key]
        _check_numeric(parameter, table.name)
        weight = weight * new.density(parameter.values) / density(parameter, parameter.values)
        replaced.append(
            Replaced(key, describe(parameter), describe_normal(new, parameter.unit), _covered(new, parameter))
        )
    total = float(weight.sum())
    if replaced and not (np.isfinite(total) and total > 1e-200):
        raise InputError(
            "the priors on " + ", ".join(item.key for item in replaced) + f" leave no scene of {table.name}: "
            "they lie outside the ranges of the scan"
        )
    return (weight / total if replaced else weight), tuple(replaced)


def _check_numeric(parameter: ScanParameter, scan: str) -> None:
    if parameter.labels:
        raise InputError(
            f"{parameter.key} is a list of named choices in the scan {scan} ({', '.join(parameter.labels)}); "
            "a value with an error cannot be its prior"
        )


def density(parameter: ScanParameter, values: Array) -> Array:
    """Prior density of a scan parameter, up to a factor: the way it varies in the scan is its prior."""
    if parameter.kind == "log_range":
        return 1.0 / values
    if parameter.kind == "cosine_range":
        return np.maximum(np.sin(values), 1e-12)
    return np.ones_like(values)


def _covered(new: TwoPiece, parameter: ScanParameter) -> float:
    if not math.isfinite(parameter.low):
        return 1.0
    points, weights = new.nodes()
    low, high = min(parameter.low, parameter.high), max(parameter.low, parameter.high)
    return float(weights[(points >= low) & (points <= high)].sum())


def describe(parameter: ScanParameter) -> str:
    """The scan's prior on a parameter in words."""
    if parameter.labels:
        return "one of " + ", ".join(parameter.labels) + ", equal weights"
    if parameter.kind == "list":
        values = ", ".join(shown(value, parameter.unit) for value in np.unique(parameter.values))
        return f"one of {values}, equal weights"
    how = {"log_range": "uniform in the logarithm", "cosine_range": "uniform in the cosine"}
    return (
        f"{how.get(parameter.kind, 'uniform')} from {shown(parameter.low, parameter.unit)} "
        f"to {shown(parameter.high, parameter.unit)}"
    )


def describe_normal(normal: TwoPiece, unit: str) -> str:
    """A value with its errors in words."""
    if normal.plus == normal.minus:
        return f"{shown(normal.mode, unit)} ± {shown(normal.plus, unit)}"
    return f"{shown(normal.mode, unit)} +{shown(normal.plus, unit)} −{shown(normal.minus, unit)}"


def shown(value: float, unit: str) -> str:
    """A number of a scan with its unit; radians are shown as degrees."""
    if unit == "rad":
        return f"{math.degrees(value):.4g}°"
    return f"{value:.4g} {unit}".strip()
