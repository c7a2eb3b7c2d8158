"""One pass over scenes × grid: how probable the observed diameter is on each scene at every θ_g.

A scene reads the diameter d(θ_g) = θ_g D(r/θ_g) with D its table, linear between nodes that both show a
closed ring; where there is none the likelihood is zero (docs/comparing.md, steps 1 and 2). Angles in µas,
grids in ln θ_g.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Iterator
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from ringwright.comparing.distributions import REACH, LogDensity
from ringwright.comparing.inputs import Observed
from ringwright.ring.outcomes import RingOutcome
from ringwright.scanning.table import SCENE_DONE, ScanTable

Array = NDArray[np.float64]
Prior = Callable[[Array], Array]

# A diameter is all that is compared, so a closed ring whose width is not resolved is a ring as well.
CLOSED_RING = (RingOutcome.RING, RingOutcome.WIDTH_LIMIT)
# Cells per standard deviation of the narrowest factor: quantiles then move by less than 1e-3 of it when
# doubled.
CELLS_PER_SIGMA = 40.0
FEWEST_CELLS = 512
# Doubles in one block of scenes × resolutions × grid: a quarter of a megabyte an array, so that blocks stay
# in the cache.
BLOCK = 1 << 15
# The conversion factor is collected in cells of 1e-4 of itself, over all that a ring can read.
FACTOR_EDGES = np.arange(math.log(1.0), math.log(100.0), 1e-4)


@dataclass(frozen=True)
class Grid:
    """Cells in ln θ_g [µas]."""

    edges: Array

    @classmethod
    def over(cls, low: float, high: float, sigma: float, refine: int = 1) -> Grid:
        """Cells from θ_g = low to high that resolve a relative width sigma."""
        span = math.log(high / low)
        cells = max(FEWEST_CELLS, math.ceil(CELLS_PER_SIGMA * span / sigma)) * refine
        return cls(np.linspace(math.log(low), math.log(high), cells + 1))

    @property
    def centres(self) -> Array:
        """ln θ_g in the middle of each cell."""
        return 0.5 * (self.edges[1:] + self.edges[:-1])


@dataclass(frozen=True)
class Posterior:
    """What one scan says, under one prior on θ_g. Arrays (cells,) or (scene,); masses up to one common
    factor.

    Attributes
    ----------
    cells : array (cells,)
        Prior-weighted probability in each cell of the grid.
    evidence : array (scene,)
        Probability of the observed diameter on each scene; multiply by the weight for the posterior.
    mean, variance : array (scene,)
        Of ln θ_g given the scene; 0 where the evidence is 0.
    nearest : array (scene,)
        How many standard errors the closest reading of a closed ring lies from the observed diameter; inf
        for none.
    factor_cells : array
        Probability of ln k in the cells of FACTOR_EDGES.
    factor : array (scene,)
        Mean of ln k given the scene; NaN where the evidence is 0.
    """

    grid: Grid
    weight: Array
    cells: Array
    evidence: Array
    mean: Array
    variance: Array
    nearest: Array
    factor_cells: Array
    factor: Array

    @property
    def total(self) -> float:
        """Evidence of the whole scan."""
        return float(self.weight @ self.evidence)

    def density(self) -> LogDensity:
        """Posterior of θ_g."""
        return LogDensity.from_cells(self.grid.edges, self.cells)

    def factor_density(self) -> LogDensity:
        """Posterior of the conversion factor k = d/θ_g."""
        return LogDensity.from_cells(FACTOR_EDGES, self.factor_cells)

    def shares(self) -> Array:
        """Posterior weight of every scene."""
        return self.weight * self.evidence / self.total


def merge(posteriors: list[Posterior]) -> Posterior:
    """Several scans under one prior as one, each with an equal share of the prior weight."""
    share = 1.0 / len(posteriors)

    def joined(name: str) -> Array:
        return np.concatenate([getattr(item, name) for item in posteriors])

    return Posterior(
        posteriors[0].grid,
        share * joined("weight"),
        share * sum((item.cells for item in posteriors), np.zeros(1)),
        joined("evidence"),
        joined("mean"),
        joined("variance"),
        joined("nearest"),
        share * sum((item.factor_cells for item in posteriors), np.zeros(1)),
        joined("factor"),
    )


def closed_rings(table: ScanTable) -> Array:
    """Diameters of a scan [θ_g], NaN wherever the estimator found no closed ring."""
    usable = np.isin(table.outcome, CLOSED_RING)
    usable &= np.arange(table.node.shape[1]) < table.node_count[:, None]
    usable &= (table.status == SCENE_DONE)[:, None]
    return np.where(usable, table.diameter, np.nan)


def read(node: Array, diameter: Array, x: Array) -> Array:
    """Diameter [θ_g] of one scene at x = r/θ_g; NaN outside the table and next to a node without a closed
    ring.
    """
    return np.interp(x, node, diameter, left=np.nan, right=np.nan)


def unsmoothed(table: ScanTable, closed: Array) -> Array:
    """Diameter [θ_g] of every scene at x = 0; NaN where there is no such reading."""
    return np.where(table.node[:, 0] == 0.0, closed[:, 0], np.nan)


def factor_range(observed: Observed, table: ScanTable) -> tuple[float, float]:
    """Least and greatest conversion factor that the scan can read at all; NaN if it reads none."""
    closed = closed_rings(table)
    values = closed if observed.resolution else unsmoothed(table, closed)
    values = values[np.isfinite(values)]
    return (float(values.min()), float(values.max())) if values.size else (math.nan, math.nan)


def support(observed: Observed, tables: tuple[ScanTable, ...]) -> tuple[float, float]:
    """The θ_g [µas] at which the likelihood can differ from zero, within the prior; (nan, nan) if nowhere."""
    ranges = np.array([factor_range(observed, table) for table in tables])
    if np.isnan(ranges).all():
        return math.nan, math.nan
    d = observed.diameter
    error = max(float(np.nanmax(table.halfway_error, initial=0.0)) for table in tables) * d.mode
    low = (d.mode - REACH * math.hypot(d.minus, error)) / np.nanmax(ranges)
    high = (d.mode + REACH * math.hypot(d.plus, error)) / np.nanmin(ranges)
    least, most = observed.factors
    low, high = max(low, least), min(high, most)
    return (low, high) if low < high else (math.nan, math.nan)


def run(observed: Observed, table: ScanTable, weight: Array, grid: Grid, prior: Prior) -> Posterior:
    """One pass.

    Parameters
    ----------
    weight : array (scene,)
        Prior weight of every scene; sums to 1.
    prior : callable
        Prior density per unit ln θ_g at θ_g [µas], up to a factor.
    """
    u = grid.centres
    theta = np.exp(u)
    step = float(grid.edges[1] - grid.edges[0])
    scenes = table.status.size
    evidence, mean, variance = np.zeros((3, scenes))
    nearest, factor = np.full(scenes, np.inf), np.full(scenes, np.nan)
    cells, factor_cells = np.zeros(u.size), np.zeros(FACTOR_EDGES.size - 1)
    prior_mass = prior(theta) * step
    for rows, k in _blocks(observed, table, theta):
        likelihood, z = _likelihood(observed, table.halfway_error[rows], k * theta)
        nearest[rows] = np.min(z, axis=(1, 2))
        mass = (
            likelihood
            * (observed.resolution_nodes()[1][:, None] if observed.resolution else 1.0)
            * prior_mass
        )
        per_cell = mass.sum(axis=1)
        evidence[rows] = total = per_cell.sum(axis=1)
        safe = np.where(total > 0.0, total, 1.0)
        mean[rows] = per_cell @ u / safe
        variance[rows] = np.sum(per_cell * (u - mean[rows][:, None]) ** 2, axis=1) / safe
        cells += weight[rows] @ per_cell
        log_k = np.log(np.where(mass > 0.0, k, 1.0))
        factor[rows] = np.where(total > 0.0, np.sum(mass * log_k, axis=(1, 2)) / safe, np.nan)
        where = np.clip(
            (log_k / (FACTOR_EDGES[1] - FACTOR_EDGES[0])).astype(np.int64), 0, factor_cells.size - 1
        )
        share = mass * weight[rows][:, None, None]
        factor_cells += np.bincount(where.ravel(), weights=share.ravel(), minlength=factor_cells.size)
    return Posterior(grid, weight, cells, evidence, mean, variance, nearest, factor_cells, factor)


def _blocks(observed: Observed, table: ScanTable, theta: Array) -> Iterator[tuple[slice, Array]]:
    """Conversion factors (scene, resolution, cell) of a few scenes at a time, NaN where there is no ring."""
    closed = closed_rings(table)
    resolution = observed.resolution_nodes()[0]
    layers = max(resolution.size, 1)
    height = max(1, BLOCK // (theta.size * layers))
    for start in range(0, closed.shape[0], height):
        rows = slice(start, min(start + height, closed.shape[0]))
        if resolution.size == 0:
            still = unsmoothed(table, closed)[rows]
            yield rows, np.broadcast_to(still[:, None, None], (still.size, 1, theta.size))
            continue
        x = (resolution[:, None] / theta).ravel()
        k = np.empty((rows.stop - start, layers, theta.size))
        for i in range(rows.stop - start):
            count = int(table.node_count[start + i])
            node, diameter = table.node[start + i, :count], closed[start + i, :count]
            k[i] = read(node, diameter, x).reshape(layers, theta.size) if count else np.nan
        yield rows, k


def _likelihood(observed: Observed, halfway_error: Array, diameter: Array) -> tuple[Array, Array]:
    """Probability density of the observed diameter, and the distance in standard errors; 0 and inf without
    a ring.

    The numerical error of a reading is added in quadrature to the observed one.
    """
    d = observed.diameter
    numerical = np.nan_to_num(halfway_error)[:, None, None] * d.mode
    plus, minus = np.hypot(d.plus, numerical), np.hypot(d.minus, numerical)
    offset = diameter - d.mode
    z = np.abs(offset) / np.where(offset > 0.0, plus, minus)
    z[np.isnan(z)] = np.inf
    return np.exp(-0.5 * z * z) * (math.sqrt(2.0 / math.pi) / (plus + minus)), z
