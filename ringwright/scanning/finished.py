"""What made a scan, and whether a product that stands there is that scan already.

A scan is hours of work, so a product is taken for the same only when scan file, base scene, tables of brightness and versions all
agree; another one is kept. Nothing here has a unit.
"""

from __future__ import annotations

from collections.abc import Iterator
from hashlib import sha256
from pathlib import Path
from typing import Any

from ringwright import products
from ringwright.errors import InputError
from ringwright.scanfile import ScanPlan
from ringwright.scanning.table import KIND, ScanTable


def finished(plan: ScanPlan, target: str | Path) -> ScanTable | None:
    """The table of this very scan, where the target holds it; None where the target is free.

    Raises
    ------
    InputError
        If the target holds anything else: it is kept.
    """
    target = products.check_target(target, KIND, plan.name, replace=False)
    if not target.exists():
        return None
    other = products.differences(target, made_of(plan))
    if other:
        raise InputError(
            f"{target} holds a finished scan of the same name, '{plan.name}', that differs in {', '.join(other)}; "
            "it is kept, because a scan is long work: change the name in the scan file, name another file with "
            "--out, or say --replace"
        )
    return ScanTable.open(target)


def made_of(plan: ScanPlan) -> dict[str, Any]:
    """Provenance of a scan: its file, base scene, tables of brightness, versions, seed and method."""
    return products.provenance(
        plan.text, plan.base.resolved(), tables=_tables(plan), seed=plan.seed, method=plan.method
    )


def _tables(plan: ScanPlan) -> str:
    """Checksums of the files that the base scene or a list of the scan names, which stand beside the base scene."""
    folder = Path(plan.base.path).parent
    named = {*_texts(plan.base.data["emitter"]), *_texts([vary.values for vary in plan.vary])}
    found = sorted(name for name in named if (folder / name).is_file())
    return ", ".join(f"{name} {sha256((folder / name).read_bytes()).hexdigest()}" for name in found)


def _texts(tree: Any) -> Iterator[str]:
    if isinstance(tree, str):
        yield tree
    elif isinstance(tree, dict | list | tuple):
        for inner in tree.values() if isinstance(tree, dict) else tree:
            yield from _texts(inner)
