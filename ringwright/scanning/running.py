"""Running a scan: every scene drawn is rendered, read at every resolution, and kept in one table.

Scenes run in worker processes and come back as small rows; only the parent writes. A scene that fails is
recorded with its reason and stops nothing. Lengths in M: a scan needs no mass or distance, which enter in
the comparison.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np

from raytrace.contract import Array
from ringwright import products
from ringwright.errors import InputError
from ringwright.machine import core_count
from ringwright.rendering import render
from ringwright.ring.readings import Readings, readings
from ringwright.scanfile import ScanPlan, load_scan
from ringwright.scanning.drawing import draw
from ringwright.scanning.finished import finished, made_of
from ringwright.scanning.pool import process_pool, results
from ringwright.scanning.table import KIND, SCENE_DONE, SCENE_FAILED, ScanParameter, ScanTable

# Estimates of this error are conservative by orders of magnitude, and a diameter is read to 1e-4 with it.
SCAN_ACCURACY = 1e-3
# Scenes handed to a worker at a time.
BATCH = 4

Progress = Callable[[int, int, int], None]


@dataclass(frozen=True)
class Row:
    """What came of one scene: its readings, or why there are none."""

    index: int
    readings: Readings | None
    reason: str = ""


def scan(
    plan: str | Path | ScanPlan,
    out: str | Path | None = None,
    *,
    workers: int | None = None,
    replace: bool = False,
    progress: Progress | None = None,
) -> ScanTable:
    """Render and read every scene of a scan file and write the scan product.

    Parameters
    ----------
    plan : path or ScanPlan
    out : path, optional
        Default outputs/<name>.h5 under the current folder.
    workers : int, optional
        Processes; default all the cores that this process may use. 1 runs in this process.
    replace : bool
        Replace whatever the target holds. Without it, a target that holds this very scan (same file, base scene
        and versions) is read instead of computed again.
    progress : callable, optional
        Called with scenes done, scenes asked for and scenes failed.

    Returns
    -------
    ScanTable

    Raises
    ------
    InputError
        If the scan file cannot be used, the target holds something else, or a scene has an absolute scale.
    """
    if not isinstance(plan, ScanPlan):
        plan = load_scan(plan)
    workers = core_count() if workers is None else workers
    if workers < 1:
        raise InputError(f"a scan needs at least one worker, not {workers}")
    if not plan.base.scale_free:
        raise InputError(
            f"{plan.path}: a scene of this scan depends on an absolute scale, so its ring does not depend on "
            "r/theta_g alone; scan scenes given by dimensionless numbers"
        )
    target = products.default_output(plan.name, ".h5") if out is None else Path(out)
    if replace:
        products.check_target(target, KIND, plan.name, replace=True)
    elif (table := finished(plan, target)) is not None:
        return table
    drawn = draw(plan)
    rows: list[Row | None] = [None] * len(drawn)
    failed = 0
    for done, row in enumerate(_rows(plan, drawn, workers), start=1):
        rows[row.index] = row
        failed += row.readings is None
        if progress is not None:
            progress(done, len(drawn), failed)
    table = _table(plan, drawn, [row for row in rows if row is not None])
    table.save(target, replace=True)  # the target was free, or to be replaced, before the work
    return table


def read_scene(plan: ScanPlan, index: int, values: tuple[Any, ...]) -> Row:
    """Render one scene of a scan and read its ring; any failure becomes a reason."""
    try:
        scene = plan.base
        for vary, value in zip(plan.vary, values, strict=True):
            scene = scene.replace(vary.key, value)
        scene = scene.replace("view.field", f"{plan.field_m!r} M").replace("view.pixels", plan.pixels)
        image = render(scene, accuracy=SCAN_ACCURACY)
        return Row(index, readings(image.total, image.pixel_m))
    except Exception as problem:  # the scan goes on; the reason is kept with the scene
        return Row(index, None, f"{type(problem).__name__}: {problem}".splitlines()[0])


def _rows(plan: ScanPlan, drawn: list[tuple[Any, ...]], workers: int) -> Iterator[Row]:
    if workers == 1:
        for index, values in enumerate(drawn):
            yield read_scene(plan, index, values)
        return
    # The first scene runs here, so that kernels are compiled once before the workers look for them.
    yield read_scene(plan, 0, drawn[0])
    rest = [list(enumerate(drawn))[start : start + BATCH] for start in range(1, len(drawn), BATCH)]
    with process_pool(workers, _remember, (plan,)) as pool:
        for batch in results(pool, _read_batch, rest):
            yield from batch


_plan: ScanPlan | None = None


def _remember(plan: ScanPlan) -> None:
    global _plan
    _plan = plan


def _read_batch(batch: Iterable[tuple[int, tuple[Any, ...]]]) -> list[Row]:
    assert _plan is not None
    return [read_scene(_plan, index, values) for index, values in batch]


def _table(plan: ScanPlan, drawn: list[tuple[Any, ...]], rows: list[Row]) -> ScanTable:
    counts = np.array([0 if row.readings is None else len(row.readings.nodes) for row in rows])
    width = max(1, int(counts.max()))
    columns = list(zip(*drawn, strict=True))

    def stacked(name: str, fill: float) -> Array:
        table = np.full((len(rows), width), fill)
        for row, count in zip(rows, counts, strict=True):
            if row.readings is not None:
                table[row.index, :count] = getattr(row.readings, name)
        return table

    return ScanTable(
        name=plan.name,
        family=plan.family,
        parameters=tuple(
            ScanParameter(
                vary.key,
                vary.kind,
                vary.unit,
                vary.low,
                vary.high,
                tuple(vary.labels),
                vary.numbers(list(column)),
            )
            for vary, column in zip(plan.vary, columns, strict=True)
        ),
        weight=np.full(len(rows), 1.0 / len(rows)),
        status=np.array(
            [SCENE_FAILED if row.readings is None else SCENE_DONE for row in rows], dtype=np.int8
        ),
        reason=tuple(row.reason for row in rows),
        node_count=counts,
        node=stacked("nodes", np.nan),
        diameter=stacked("diameter", np.nan),
        width=stacked("width", np.nan),
        asymmetry=stacked("asymmetry", np.nan),
        central_brightness=stacked("central_brightness", np.nan),
        outcome=stacked("outcome", -1.0).astype(np.int8),
        halfway_error=np.array(
            [np.nan if row.readings is None else row.readings.halfway_error for row in rows]
        ),
        base=plan.base.resolved(),
        provenance=made_of(plan),
    )
