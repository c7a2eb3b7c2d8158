"""The error budget: which part of the variance of ln θ_g, or of ln M, comes from what.

Var = E_s[Var(ln θ_g|s)] (measurement) + Var_s(E[ln θ_g|s]) (emission) + Var(ln D) (distance): the law of
total variance. The emission part is split by first-order shares Var(E[ln θ_g|p]) of each scan parameter p
(Sobol 1993; Saltelli et al. 2010, from memory) and what is left, `joint`, which may be negative. No units.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from ringwright.comparing.likelihood import Posterior
from ringwright.scanning.table import ScanParameter

Array = NDArray[np.float64]

# Degree of the polynomial that stands for E[ln θ_g|p]: enough for a curve with one turn, and few numbers to
# fit.
DEGREE = 3
# A split needs a few scenes per fitted number; below this everything is reported as joint.
FEWEST_PER_NUMBER = 3.0
# Emission counts as dominant at this many times the measurement's standard deviation.
DOMINANT = 2.0


@dataclass(frozen=True)
class Budget:
    """Variances of ln θ_g or, with a distance, of ln M. `parts` sums to `emission`, and the three to
    `total`.
    """

    quantity: str
    measurement: float
    emission: float
    distance: float | None
    parts: dict[str, float]

    @property
    def total(self) -> float:
        """Variance of the logarithm."""
        return self.measurement + self.emission + (self.distance or 0.0)

    @property
    def ratio(self) -> float:
        """Standard deviation of the emission part over that of the measurement."""
        return math.sqrt(self.emission / self.measurement) if self.measurement > 0.0 else math.inf

    @property
    def emission_dominates(self) -> bool:
        """Whether emission contributes at least twice the measurement's standard deviation."""
        return self.ratio >= DOMINANT

    def to_json(self) -> dict[str, Any]:
        """Plain numbers; every entry a variance with its standard deviation."""
        lines = {"measurement": self.measurement, "emission": self.emission, "distance": self.distance}
        entries: dict[str, Any] = {
            name: {"variance": value, "standard_deviation": math.sqrt(value)}
            for name, value in lines.items()
            if value is not None
        }
        entries["total"] = {"variance": self.total, "standard_deviation": math.sqrt(self.total)}
        emission = {
            "variance_parts": self.parts,
            "over_measurement": self.ratio if self.measurement else None,
        }
        return {"quantity": self.quantity, **entries, "emission_split": emission}


def budget(posterior: Posterior, parameters: tuple[ScanParameter, ...], distance: float | None) -> Budget:
    """The budget of one scan; `distance` is the variance of ln D, None without a distance."""
    weight = posterior.shares()
    emission = _variance(weight, posterior.mean)
    parts = {item.key: first_order(weight, posterior.mean, _columns(item)) for item in parameters}
    return _assembled(float(weight @ posterior.variance), emission, distance, parts)


def _assembled(
    measurement: float, emission: float, distance: float | None, parts: dict[str, float]
) -> Budget:
    quantity = "ln theta_g" if distance is None else "ln M"
    parts = {**parts, "joint": emission - sum(parts.values())}
    return Budget(quantity, measurement, emission, distance, parts)


def _variance(weight: Array, values: Array) -> float:
    centre = float(weight @ values)
    return float(weight @ (values - centre) ** 2)


def _columns(parameter: ScanParameter) -> Array:
    """Functions of one parameter, one a column, whose best sum stands for E[ln θ_g|p]."""
    if parameter.kind == "list":
        return (parameter.values[:, None] == np.unique(parameter.values)).astype(float)
    return np.asarray(np.polynomial.legendre.legvander(2.0 * position(parameter) - 1.0, DEGREE), dtype=float)


def position(parameter: ScanParameter) -> Array:
    """Where each scene stands in the range of a parameter: its prior probability below, 0 to 1."""
    transform = {"log_range": np.log, "cosine_range": np.cos}.get(parameter.kind, np.asarray)
    low, high = transform(np.array([parameter.low, parameter.high]))
    return (transform(parameter.values) - low) / (high - low)


def first_order(weight: Array, values: Array, columns: Array) -> float:
    """Var(E[values|p]) by weighted least squares, less what noise alone would give it; never negative.

    The correction is that of the adjusted coefficient of determination (Ezekiel 1930, from memory), with
    the effective number of scenes in place of the number of points.
    """
    effective = float(weight.sum() ** 2 / (weight @ weight))
    fitted = columns.shape[1] - 1
    if effective < FEWEST_PER_NUMBER * (fitted + 1):
        return 0.0
    root = np.sqrt(weight)
    answer = np.linalg.lstsq(root[:, None] * columns, root * (values - weight @ values), rcond=None)[0]
    explained = _variance(weight, columns @ answer)
    left = max(_variance(weight, values) - explained, 0.0)
    return max(explained - left * fitted / (effective - fitted - 1.0), 0.0)
