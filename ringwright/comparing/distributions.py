"""Distributions of one positive quantity: published numbers with their errors, and posteriors on a grid.

A quoted value with two errors is a two-piece normal with its mode at the value (Fechner; reviewed by Wallis
2014, Statistical Science 29, 106, from memory). Posteriors live on cells in the logarithm of a positive
quantity, so that a product with an independent factor is a sum of shifted copies. Units are those of the
caller.
"""

from __future__ import annotations

import math
from collections.abc import Iterable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

# A normal beyond eight of its standard deviations holds 1e-15 of the probability.
REACH = 8.0
# Nodes across 2 × REACH standard deviations: steps of 0.08, where the trapezoid rule on a normal is exact
# to 1e-15.
NODES = 201
# Cells of a product's distribution; its quantiles are then good to 1e-5 of its width.
PRODUCT_CELLS = 4096
# Probability left out at either end of a product's grid.
TAIL = 1e-9
CURVE_POINTS = 400
QUANTILES = {"low95": 0.025, "low68": 0.16, "value": 0.5, "high68": 0.84, "high95": 0.975}


@dataclass(frozen=True)
class TwoPiece:
    """A two-piece normal: mode, standard deviations above and below; both zero for an exact number."""

    mode: float
    plus: float
    minus: float

    @property
    def exact(self) -> bool:
        """Whether the number carries no error."""
        return self.plus == 0.0 and self.minus == 0.0

    @property
    def relative(self) -> float:
        """The smaller error over the mode."""
        return min(self.plus, self.minus) / abs(self.mode)

    def density(self, x: Array | float) -> Array:
        """Probability density at x; integrates to 1 over the whole line."""
        offset = np.asarray(x, dtype=float) - self.mode
        z = offset / np.where(offset > 0.0, self.plus, self.minus)
        return np.exp(-0.5 * z * z) * (math.sqrt(2.0 / math.pi) / (self.plus + self.minus))

    def span(self) -> tuple[float, float]:
        """The positive interval that holds all but 1e-15 of the probability."""
        high = self.mode + REACH * self.plus
        return max(self.mode - REACH * self.minus, 1e-6 * high), high

    def nodes(self, count: int = NODES) -> tuple[Array, Array]:
        """Positive points and weights that sum to 1: integrals over the distribution as sums."""
        if self.exact:
            return np.array([self.mode]), np.array([1.0])
        points = np.linspace(*self.span(), count)
        weights = self.density(points)
        return points, weights / weights.sum()


@dataclass(frozen=True)
class LogDensity:
    """A distribution of a positive quantity, known as cumulative probability at the edges of cells in its
    logarithm.
    """

    edges: Array  # (cells + 1,) ascending, natural logarithm
    cumulative: Array  # (cells + 1,) from 0 to 1

    @classmethod
    def from_cells(cls, edges: Array, mass: Array) -> LogDensity:
        """From the probability in each cell, up to a factor."""
        cumulative = np.concatenate([[0.0], np.cumsum(mass)])
        return cls(edges, cumulative / cumulative[-1])

    @classmethod
    def of(cls, normal: TwoPiece, cells: int = PRODUCT_CELLS) -> LogDensity:
        """A two-piece normal, cut at zero."""
        edges = np.log(np.linspace(*normal.span(), cells + 1))
        return cls.from_cells(
            edges, normal.density(np.exp(0.5 * (edges[1:] + edges[:-1]))) * np.diff(np.exp(edges))
        )

    def quantile(self, probability: float) -> float:
        """The quantity (not its logarithm) below which that probability lies."""
        return math.exp(float(np.interp(probability, self.cumulative, self.edges)))

    def quantiles(self) -> dict[str, float]:
        """Median and the equal-tailed 68 % and 95 % intervals."""
        return {name: self.quantile(p) for name, p in QUANTILES.items()}

    def probability_below(self, value: float) -> float:
        """Probability that the quantity is smaller than a value."""
        if value <= 0.0:
            return 0.0
        return float(np.interp(math.log(value), self.edges, self.cumulative, left=0.0, right=1.0))

    def variance(self) -> float:
        """Variance of the logarithm."""
        mass, centre = np.diff(self.cumulative), 0.5 * (self.edges[1:] + self.edges[:-1])
        mean = float(mass @ centre)
        return float(mass @ (centre - mean) ** 2)

    def nodes(self, count: int = NODES) -> tuple[Array, Array]:
        """Points (of the quantity) of equal weight, and the weights."""
        probability = (np.arange(count) + 0.5) / count
        return np.exp(np.interp(probability, self.cumulative, self.edges)), np.full(count, 1.0 / count)

    def curve(self, points: int = CURVE_POINTS) -> tuple[Array, Array]:
        """For drawing: values of the quantity between the far tails, and its probability density there."""
        low, high = np.interp([TAIL, 1.0 - TAIL], self.cumulative, self.edges)
        edges = np.linspace(low, high, points + 1)
        values = np.exp(edges)
        below = np.interp(edges, self.edges, self.cumulative)
        return 0.5 * (values[1:] + values[:-1]), np.diff(below) / np.diff(values)

    def times(self, factors: Array, weights: Array) -> LogDensity:
        """Distribution of the product with an independent quantity, given by its nodes and weights."""
        columns = ((weight, self.cumulative) for weight in weights)
        return mixture(self.edges, columns, np.log(factors))


def mixture(edges: Array, columns: Iterable[tuple[float, Array]], shifts: Array) -> LogDensity:
    """Sum of weighted distributions on one set of cells, the j-th moved by shifts[j] in the logarithm."""
    pairs = [(weight, cumulative, shift) for (weight, cumulative), shift in zip(columns, shifts, strict=True)]
    heavy = [pair for pair in pairs if pair[0] > 0.0]
    low = min(shift + float(np.interp(TAIL, cumulative, edges)) for _, cumulative, shift in heavy)
    high = max(shift + float(np.interp(1.0 - TAIL, cumulative, edges)) for _, cumulative, shift in heavy)
    grid = np.linspace(low, high, PRODUCT_CELLS + 1)
    total = np.zeros(grid.size)
    for weight, cumulative, shift in heavy:
        total += weight * np.interp(grid - shift, edges, cumulative)
    total -= total[0]
    return LogDensity(grid, total / total[-1])
