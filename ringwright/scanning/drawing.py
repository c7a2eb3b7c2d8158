"""Which scenes a scan asks for: a grid, or a scrambled Sobol sequence over the prior, always the same for the same seed.

Every varied parameter maps one number in [0, 1) to a value through its own prior, so a Sobol point is a
scene and equal volumes carry equal prior weight (Sobol 1967; scrambling after Owen 1998, from SciPy). No
units: they are the parameters' own.
"""

from __future__ import annotations

import math
from typing import TYPE_CHECKING, Any

import numpy as np

from raytrace.contract import Array

if TYPE_CHECKING:
    from ringwright.scanfile import ScanPlan


def draw(plan: ScanPlan) -> list[tuple[Any, ...]]:
    """Values of the varied parameters, a tuple per scene, in the order of the scan file."""
    cube = _grid(plan) if plan.method == "grid" else _sobol(plan)
    columns = [vary.draw(cube[:, axis]) for axis, vary in enumerate(plan.vary)]
    return list(zip(*columns, strict=True))


def _sobol(plan: ScanPlan) -> Array:
    from scipy.stats import qmc

    sequence = qmc.Sobol(len(plan.vary), scramble=True, rng=np.random.default_rng(plan.seed))
    whole = sequence.random_base2(math.ceil(math.log2(plan.scenes)))
    return whole[: plan.scenes]


def _grid(plan: ScanPlan) -> Array:
    """Middles of equal cells of prior weight, the last parameter running fastest."""
    counts = [len(vary.values) if vary.kind == "list" else vary.points for vary in plan.vary]
    axes = [(np.arange(count) + 0.5) / count for count in counts]
    return np.stack([axis.ravel() for axis in np.meshgrid(*axes, indexing="ij")], axis=1)
