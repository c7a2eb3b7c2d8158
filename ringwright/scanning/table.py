"""`ScanTable`: what a scan knows of every scene, in memory and as an HDF5 product.

Each scene carries what the ring estimator reads on it against x = r/θ_g, the resolution in units of the angular
gravitational radius: diameter and width in units of θ_g, asymmetry and central brightness as pure numbers, and the outcome.
Rows are padded with NaN beyond `node_count`; between two nodes a reading is linear, and never across a change of outcome.
"""

from __future__ import annotations

import json
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

import h5py
import numpy as np
from numpy.typing import NDArray

from ringwright import products
from ringwright.errors import InputError

KIND = "scan"
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
    halfway_error: (
        Array  # (scene,) largest relative error of the interpolated diameter half-way between nodes
    )
    base: dict[str, Any] = field(default_factory=dict)  # resolved base scene
    provenance: dict[str, Any] = field(default_factory=dict)
    path: str = ""

    def save(self, path: str | Path, *, replace: bool = False) -> Path:
        """Write the scan as an HDF5 product.

        Raises
        ------
        InputError
            If the path holds something else than this scan, made of the same input, and `replace` is not set.
        """
        target = products.check_target(path, KIND, self.name, replace=replace)
        if target.exists() and not replace and (other := products.differences(target, self.provenance)):
            raise InputError(
                f"{target} holds another scan named '{self.name}', which differs in {', '.join(other)}, so it is "
                "kept; name another file, or ask for it to be replaced"
            )
        products.write_product(target, KIND, self.name, self._fill, self.provenance)
        return target

    @staticmethod
    def open(path: str | Path) -> ScanTable:
        """Read a scan product.

        Raises
        ------
        InputError
            If the file is not a readable, complete scan product.
        """
        with products.open_product(path, KIND) as file:
            described = json.loads(str(file.attrs["parameters"]))
            parameters = tuple(
                ScanParameter(**{**entry, "labels": tuple(entry["labels"])}, values=file[entry["key"]][...])
                for entry in described
            )
            return ScanTable(
                name=str(file.attrs["name"]),
                family=str(file.attrs["family"]),
                parameters=parameters,
                reason=tuple(text.decode() for text in file["reason"][...]),
                base=json.loads(str(file.attrs["resolved"])),
                provenance={key: file.attrs[key] for key in file.attrs if key not in _IDENTITY},
                path=str(path),
                **{name: file[name][...] for name in (*_PER_SCENE, *_PER_NODE)},
            )

    def _fill(self, file: h5py.File) -> None:
        scenes, nodes = self.node.shape
        products.scale(file, "scene", np.arange(scenes), "1", "number of the scene in the order of drawing")
        products.scale(file, "place", np.arange(nodes), "1", "place in a scene's table of readings")
        file.attrs["family"] = self.family
        described = []
        for parameter in self.parameters:
            entry = {
                name: getattr(parameter, name) for name in ("key", "kind", "unit", "low", "high", "labels")
            }
            described.append(entry)
            units = "1" if parameter.unit == "M" else parameter.unit or "1"
            long_name = f"{parameter.key}{' [GM/c^2]' if parameter.unit == 'M' else ''}"
            self._add(file, parameter.key, parameter.values, units, long_name)
        file.attrs["parameters"] = json.dumps(described)
        for name, long_name in (_PER_SCENE | _PER_NODE).items():
            self._add(file, name, getattr(self, name), "1", long_name)
        reason = file.create_dataset("reason", data=list(self.reason), dtype=h5py.string_dtype())
        products.attach(file, reason, ("scene",))

    @staticmethod
    def _add(file: h5py.File, name: str, values: np.ndarray, units: str, long_name: str) -> None:
        dataset = file.create_dataset(name, data=values)
        dataset.attrs["units"], dataset.attrs["long_name"] = units, long_name
        products.attach(file, dataset, ("scene", "place")[: values.ndim])


_IDENTITY = ("product", "name", "format_version", "family", "parameters")
_PER_SCENE = {
    "weight": "prior weight of the scene",
    "status": "0 done, 1 failed",
    "node_count": "how many nodes of the table are used",
    "halfway_error": "largest relative error of the interpolated diameter half-way between nodes",
}
_PER_NODE = {
    "node": "resolution over the angular gravitational radius, r/theta_g",
    "diameter": "diameter over theta_g",
    "width": "width over theta_g",
    "asymmetry": "azimuthal asymmetry",
    "central_brightness": "central brightness over brightness at the ring",
    "outcome": "outcome of the measurement; 0 is a ring",
}
