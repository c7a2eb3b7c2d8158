"""Scan tables made from a formula, so that a test knows every reading exactly.

A scene of inner edge a and slope s has the conversion factor k₀ = 8 + a − 0.5 (s − 3) + 0.1 (a − 3)(s − 4)
without smoothing and reads k₀ (1 − 0.36 (x/k₀)²) at x = r/θ_g, after the first-order bias of a blurred
ring; the ring is lost beyond x = 0.8 k₀.
"""

from __future__ import annotations

import numpy as np
from scipy.stats import qmc

from ringwright.ring.outcomes import RingOutcome
from ringwright.scanning.table import ScanParameter, ScanTable

BIAS = 0.36  # 1/(4 ln 2)
LOST = 0.8
INNER, SLOPE = (2.0, 4.0), (3.0, 5.0)


def unsmoothed_factor(inner, slope):
    return 8.0 + inner - 0.5 * (slope - 3.0) + 0.1 * (inner - 3.0) * (slope - 4.0)


def factor(inner, slope, x):
    """What the estimator would read at x, in θ_g."""
    k = unsmoothed_factor(inner, slope)
    return k * (1.0 - BIAS * (x / k) ** 2)


def table_of(
    factors, *, parameters=(), name="made up", family="made up", nodes=120, weight=None, lost=LOST, **changes
):
    """A ScanTable of scenes with these unsmoothed conversion factors."""
    k = np.atleast_1d(np.asarray(factors, dtype=float))
    node = np.linspace(0.0, 1.0, nodes) * (lost * k)[:, None]
    node = np.concatenate([node, node[:, -1:] + 0.01], axis=1)
    outcome = np.full(node.shape, RingOutcome.RING, dtype=np.int8)
    outcome[:, -1] = RingOutcome.NO_RING
    diameter = k[:, None] * (1.0 - BIAS * (node / k[:, None]) ** 2)
    diameter[:, -1] = np.nan
    fields = {
        "name": name,
        "family": family,
        "parameters": tuple(parameters),
        "weight": np.full(k.size, 1.0 / k.size) if weight is None else np.asarray(weight),
        "status": np.zeros(k.size, dtype=np.int8),
        "reason": ("",) * k.size,
        "node_count": np.full(k.size, node.shape[1]),
        "node": node,
        "diameter": diameter,
        "width": np.full(node.shape, 2.0),
        "asymmetry": np.zeros(node.shape),
        "central_brightness": np.zeros(node.shape),
        "outcome": outcome,
        "halfway_error": np.zeros(k.size),
        "base": {"hole": {"spacetime": "schwarzschild"}, "view": {"frequency": "230 GHz"}},
    }
    return ScanTable(**{**fields, **changes})


def parameter(key, values, ends, kind="range", unit="M", labels=()):
    return ScanParameter(key, kind, unit, *ends, tuple(labels), np.asarray(values, dtype=float))


def family_table(scenes=256, inner=INNER, slope=SLOPE, seed=3, **changes):
    """A Sobol scan over inner edge and slope."""
    unit = qmc.Sobol(2, seed=seed).random(scenes)
    a = inner[0] + (inner[1] - inner[0]) * unit[:, 0]
    s = slope[0] + (slope[1] - slope[0]) * unit[:, 1]
    parameters = (
        parameter("emitter.profile.inner", a, inner),
        parameter("emitter.profile.slope", s, slope, unit=""),
    )
    return table_of(unsmoothed_factor(a, s), parameters=parameters, **changes)
