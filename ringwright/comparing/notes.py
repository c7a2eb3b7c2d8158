"""The words that go with every comparison: priors as used, what was held fixed, and the standing cautions.

Nothing is computed here but the text; the facts come from the observation and the scans. Angles in µas,
distances in Mpc, masses in solar masses.
"""

from __future__ import annotations

from typing import Any

from ringwright.comparing import formats
from ringwright.comparing.inputs import Observed
from ringwright.comparing.priors import FlatPrior, Replaced, describe
from ringwright.scanning.table import ScanTable

# Keys of a scene that do not touch the shape of its image in M.
WITHOUT_EFFECT: tuple[str, ...] = (
    "name",
    "path",
    "text",
    "hole.mass",
    "hole.distance",
    "hole.theta_g",
    "view.field",
    "view.pixels",
    "view.orders",
)
WITHOUT_EFFECT += ("view.position_angle", "source.", "scale_free")

RING_IS_NOT_SHADOW = (
    "A ring diameter is not a shadow diameter: where light peaks depends on where the gas shines, how it "
    "moves, the viewing angle and the "
    "resolution, and the conversion factor stands for all of that."
)
PRIOR_IS_NOT_MEASUREMENT = (
    "A prior is not a measurement: the way a parameter varies in a scan is its prior, and the interval "
    "holds for truths drawn from it; it "
    "promises nothing outside."
)
CONSISTENCY = (
    "The conversion factor rests on the emission prior of the scan. Agreement with a published mass whose "
    "factor was derived from similar emission "
    "is a consistency check, not an independent mass."
)
LOWER_BOUND = (
    "Thin disks around a black hole without spin only: no spin in this scan (it moves the critical curve "
    "by up to 7 %), no variability, no thick "
    "flow. The error is a lower bound."
)
CANNOT_CHOOSE = (
    "A diameter alone cannot choose between emitter families: a larger θ_g with a smaller conversion "
    "factor reads the same. The pooled result gives "
    "every family an equal prior weight; no odds are quoted."
)
DEVIATION = (
    "Without spin in the scan the deviation δ is θ_g/θ_g,prior − 1 of ring_only and nothing more; "
    "spin alone spans 7 % in the critical curve."
)
UNSMOOTHED = (
    "Read as already corrected for resolution, synthetic images are read as sharp as their pixels are: "
    "their peak is "
    "often a thin ring of higher order that no observation resolved, and the emission part of the error "
    "is then too "
    "small. Compare with the diameter read as measured before quoting either."
)
COMBINED = (
    "The combined result contains the prior on the scale; only ring_only may be set against that prior."
)
BUDGET_OF_RING = "The budget is that of ring_only, in the variance of the logarithm."
MISSING_PHYSICS = (
    "spin (moves the critical curve by up to 7 %)",
    "variability of the source",
    "a geometrically thick flow",
)


def standing(several: bool, with_scale_prior: bool, smoothed: bool) -> tuple[str, ...]:
    """The cautions that every answer carries."""
    notes = [RING_IS_NOT_SHADOW, PRIOR_IS_NOT_MEASUREMENT, CONSISTENCY, LOWER_BOUND, BUDGET_OF_RING]
    if not smoothed:
        notes.append(UNSMOOTHED)
    if with_scale_prior:
        notes += [COMBINED, DEVIATION]
    if several:
        notes.append(CANNOT_CHOOSE)
    return tuple(notes)


def priors(
    observed: Observed, tables: tuple[ScanTable, ...], replaced: tuple[tuple[Replaced, ...], ...]
) -> dict[str, str]:
    """Every prior in words, by what it is about."""
    low, high = observed.factors
    words = {"theta_g, ring only": f"{FlatPrior(observed.flat).text} from {low:.3g} to {high:.3g} µas"}
    if observed.theta_g is not None:
        words["theta_g, combined"] = formats.published(observed.theta_g, "µas")
    if observed.mass is not None:
        words["mass, combined"] = formats.published(observed.mass, "M☉")
    if observed.distance is not None:
        words["distance"] = formats.published(observed.distance, "Mpc")
    for table, items in zip(tables, replaced, strict=True):
        new = {item.key: item for item in items}
        for parameter in table.parameters:
            key = f"{table.family}: {parameter.key}"
            words[key] = describe(parameter)
            if parameter.key in new:
                words[key] = f"{new[parameter.key].new}, in place of {new[parameter.key].old}"
    return words


def held_fixed(tables: tuple[ScanTable, ...]) -> dict[str, str]:
    """What no scan varied, with the value used; values that differ are listed by family."""
    varied = {parameter.key for table in tables for parameter in table.parameters}
    fixed: dict[str, dict[str, str]] = {}
    for table in tables:
        for key, value in _leaves(table.base):
            if not _under(key, varied) and not key.startswith(WITHOUT_EFFECT):
                fixed.setdefault(key, {})[table.family] = value
    return {key: _same_or_each(values) for key, values in fixed.items()}


def _under(key: str, varied: set[str]) -> bool:
    """Whether a key, or a table that holds it, varies."""
    return any(key == name or key.startswith(f"{name}.") for name in varied)


def _same_or_each(values: dict[str, str]) -> str:
    if len(set(values.values())) == 1:
        return next(iter(values.values()))
    return "; ".join(f"{value} ({family})" for family, value in values.items())


def _leaves(tree: Any, path: str = "") -> list[tuple[str, str]]:
    """Every plain value of a nested scene with its key path; a lone emitter needs no number."""
    if isinstance(tree, dict):
        return [
            leaf
            for key, value in tree.items()
            for leaf in _leaves(value, f"{path}.{key}" if path else str(key))
        ]
    if isinstance(tree, list) and len(tree) == 1:
        return _leaves(tree[0], path)
    if isinstance(tree, list):
        return [leaf for i, value in enumerate(tree) for leaf in _leaves(value, f"{path}.{i}")]
    return [] if tree is None else [(path, str(tree))]
