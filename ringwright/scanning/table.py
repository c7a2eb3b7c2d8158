"""`ScanTable`: what a scan knows of every scene, in memory and as an HDF5 product.

Each scene carries what the ring estimator reads on it against x = r/θ_g, the resolution in units of the angular
gravitational radius: diameter and width in units of θ_g, asymmetry and central brightness as pure numbers, and the outcome.
Rows are padded with NaN beyond `node_count`; between two nodes a reading is linear, and never across a change of outcome.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

# How a scene of a scan can end.
SCENE_DONE = 0
SCENE_FAILED = 1


@dataclass(frozen=True)
class ScanParameter:
    """One thing that varies in a scan.

    Attributes
    ----------
    key : str
        Path in the scene file, such as "emitter.profile.inner".
    kind : str
        "range" (uniform), "log_range", "cosine_range" (uniform in the cosine) or "list" (equal weights).
    unit : str
        Unit of the stored numbers ("M", "rad", "" for plain numbers and for the index into `labels`).
    low, high : float
        Ends of the range in that unit; NaN for a list.
    labels : tuple of str
        Names of the values of a list; empty for ranges.
    values : array (scene,)
        The value of every scene; for a list of tables, the index into `labels`.
    """

    key: str
    kind: str
    unit: str
    low: float
    high: float
    labels: tuple[str, ...]
    values: Array


@dataclass(frozen=True)
class ScanTable:
    """A finished scan. Arrays are (scene,) or (scene, node)."""

    name: str
    family: str
    parameters: tuple[ScanParameter, ...]
    weight: Array  # prior weight of each scene, sums to 1 over all scenes asked for, failed ones included
    status: NDArray[np.int8]  # SCENE_DONE or SCENE_FAILED
    reason: tuple[str, ...]  # why a scene failed; "" otherwise
    node_count: NDArray[np.int64]
    node: Array  # x = r/θ_g, ascending
    diameter: Array  # [θ_g]
    width: Array  # [θ_g]; NaN where unresolved
    asymmetry: Array
    central_brightness: Array
    outcome: NDArray[np.int8]  # RingOutcome; RING = 0
    halfway_error: Array  # (scene,) largest relative error of the interpolated diameter half-way between nodes
    base: dict[str, Any] = field(default_factory=dict)  # resolved base scene
    provenance: dict[str, Any] = field(default_factory=dict)
    path: str = ""
