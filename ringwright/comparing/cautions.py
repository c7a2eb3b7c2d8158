"""The warnings of a comparison, each with what to do about it (docs/comparing.md, "Warnings").

Every check computes what it says from the posterior at hand; thresholds are named below with their reasons.
Angles in µas; positions within a parameter's range run from 0 to 1 of its prior probability.
"""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray

from ringwright.comparing.budget import Budget, position
from ringwright.comparing.inputs import Observed
from ringwright.comparing.likelihood import Posterior, closed_rings
from ringwright.comparing.priors import Replaced
from ringwright.comparing.results import Caution
from ringwright.comparing.words import named, plain
from ringwright.scanning.table import SCENE_FAILED, ScanParameter, ScanTable

Array = NDArray[np.float64]

FEWEST_EFFECTIVE = 50.0  # scenes; the medians of fewer wander by more than a seventh of the interval
OUTER = 0.2  # share of a range that counts as its end
RISE = 1.5  # of posterior over prior across that share
STILL_CHANGES = 0.01  # of k across that share; below 1 % a wider range would not move the mass
SIGNIFICANT = 2.0  # standard errors that a slope must stand out by, so that few scenes raise no false alarm
FEWEST_IN_END = 8  # scenes needed to fit a slope at all
# At r/d = 0.6 a ring of zero width reads its diameter 18 % small (exact blurred thin ring): r is then 0.73
# of what is read.
RESOLVED = 0.73
# No interferometer of today separates a tenth of its ring: a resolution below that is a slip of digit or unit.
FINE = 0.1
TINY = 1e-3  # no ring, distance or mass of a nucleus is known to better than a part in a thousand
END_SIGMA = 2.0  # a table that stops within two standard errors of the observed diameter cuts the posterior
END_SHARE = 0.05  # of the posterior weight
WIDENED = 0.03  # of the error of the diameter by that of the readings, before it is worth a sentence
COVERED = 0.95  # of a prior on a scene parameter, inside the range of the scan
FIT = 3.0  # standard errors within which a scene can be said to look like the observation

# Where a range cannot be widened, by the end of the key: horizon, face-on and edge-on, none and all of a
# motion.
PHYSICAL_ENDS: dict[str, tuple[float, ...]] = {
    "inclination": (0.0, math.pi / 2.0, math.pi),
    "inner": (2.0,),
    "orbit_fraction": (0.0, 1.0),
    "fall_fraction": (0.0, 1.0),
    "edge_width": (0.0,),
}


def no_scene_fits(table: ScanTable, observed: Observed) -> Caution:
    """For an answer that is none."""
    return Caution(
        "no-scene-fits",
        f"Nothing in this scan looks like the observation: no scene of {table.family} shows a ring of "
        f"{observed.diameter.mode:.4g} µas, within {FIT:g} standard errors, at any θ_g of the prior.",
        "Check the resolution and the unit of the diameter; then widen the ranges of the scan, or scan "
        "another kind of emission.",
    )


def of_scan(
    observed: Observed, table: ScanTable, replaced: tuple[Replaced, ...], ring: Posterior
) -> list[Caution]:
    """Everything about one scan: failed, few, coarsely read, cut by a table, or outside a prior."""
    found = [
        _failed(table),
        _few(table, ring),
        _coarse(observed, table, ring),
        _table_end(observed, table, ring),
    ]
    return [item for item in found if item is not None] + _outside(table, replaced)


def of_observation(observed: Observed) -> list[Caution]:
    """What is odd about the numbers as given, and a ring that its own resolution hardly resolves."""
    found = [_example(observed), *_unlike(observed), *_tiny(observed), _fine(observed), _unresolved(observed)]
    return [item for item in found if item is not None]


def _example(observed: Observed) -> Caution | None:
    if not observed.of_example:
        return None
    return Caution(
        "example-numbers",
        f"The {' and the '.join(observed.of_example)} of this observation are those of the commented example, "
        "and invented.",
        "Write your own numbers into the file.",
    )


def _unlike(observed: Observed) -> list[Caution]:
    return [
        Caution(
            "unlike-units",
            f"{text[:1].upper()}{text[1:]}: the units of value and error differ in size.",
            "Check that both are meant; written in one unit they are easier to read.",
        )
        for text in observed.unlike_units
    ]


def _tiny(observed: Observed) -> list[Caution]:
    given = {
        "diameter": observed.diameter,
        "distance": observed.distance,
        "prior on the mass": observed.mass,
        "prior on θ_g": observed.theta_g,
    }
    return [
        Caution(
            "tiny-error",
            f"The error of the {name} is {100 * number.relative:.2g} % of its value, and the readings of a scan "
            "are good to some 0.3 %.",
            "Check the units and the digits of both.",
        )
        for name, number in given.items()
        if number is not None and 0.0 < number.relative < TINY
    ]


def _fine(observed: Observed) -> Caution | None:
    finest = min(observed.resolution, default=math.inf)
    if finest >= FINE * observed.diameter.mode:
        return None
    return Caution(
        "fine-resolution",
        f"A resolution of {finest:.3g} µas is less than a tenth of the ring's diameter, "
        f"{observed.diameter.mode:.4g} µas: synthetic images are then read so sharply that thin rings of higher "
        "order take the peak.",
        "Check its digits and its unit; it is the FWHM of the whole image, not an error or a pixel.",
    )


def _unresolved(observed: Observed) -> Caution | None:
    """A ring that its own resolution hardly resolves."""
    widest = max(observed.resolution, default=0.0)
    if widest <= RESOLVED * observed.diameter.mode:
        return None
    return Caution(
        "unresolved-ring",
        f"At a resolution of {widest:.3g} µas a ring that reads {observed.diameter.mode:.3g} µas is hardly "
        "resolved: even one of zero width reads its diameter at least 18 % too small.",
        f"Ask for a resolution finer than {RESOLVED * observed.diameter.mode:.2g} µas, or for a diameter "
        "fitted to the visibilities.",
    )


def of_budget(budget: Budget, family: str) -> list[Caution]:
    """Emission that dominates the error."""
    if not budget.emission_dominates:
        return []
    return [
        Caution(
            "emission-dominates",
            f"In {family} what is not known about the emission contributes {budget.ratio:.1f} times the "
            "standard deviation of the measurement "
            f"({100 * math.sqrt(budget.emission):.0f} % against {100 * math.sqrt(budget.measurement):.0f} "
            "%).",
            "A better diameter would hardly help: state what is known about the emission (inclination, "
            "inner edge, motion) as priors.",
        )
    ]


def _failed(table: ScanTable) -> Caution | None:
    failed = int(np.count_nonzero(table.status == SCENE_FAILED))
    if failed == 0:
        return None
    weight = float(table.weight[table.status == SCENE_FAILED].sum())
    return Caution(
        "failed-scenes",
        f"{failed} of {table.status.size} scenes of {table.name} failed and count as excluded "
        f"({100 * weight:.1f} % of the prior weight).",
        "Read the reasons in the scan's product, mend the scenes and run the scan again.",
    )


def _few(table: ScanTable, ring: Posterior) -> Caution | None:
    effective = effective_scenes(ring.shares())
    if effective >= FEWEST_EFFECTIVE:
        return None
    needed = 2 ** math.ceil(math.log2(table.status.size * FEWEST_EFFECTIVE / effective))
    return Caution(
        "few-scenes",
        f"The answer of {table.name} rests on {effective:.0f} effective scenes of {table.status.size}.",
        f"Run the scan with at least {needed} scenes.",
    )


def _coarse(observed: Observed, table: ScanTable, ring: Posterior) -> Caution | None:
    numerical = math.sqrt(float(ring.shares() @ np.nan_to_num(table.halfway_error) ** 2))
    widened = math.hypot(1.0, numerical / observed.diameter.relative) - 1.0
    if widened <= WIDENED or observed.diameter.relative < TINY:  # then the error is what is wrong
        return None
    return Caution(
        "coarse-readings",
        f"The scenes of {table.name} are read to {100 * numerical:.1f} % only, which was added to the "
        "error of the "
        f"diameter and widens it by {100 * widened:.0f} %; a diameter that jumps with the resolution is "
        "one cause.",
        "Run the scan with more pixels or a larger field; where the diameter jumps, look at the images of "
        "those scenes.",
    )


def _table_end(observed: Observed, table: ScanTable, ring: Posterior) -> Caution | None:
    share = cut_share(observed, table, ring)
    if share <= END_SHARE:
        return None
    lost = _share_that_is_cut(observed, table, ring)[1] > 0.5 * share
    why = "the ring is lost at this resolution" if lost else "the table of the scan stops"
    remedy = (
        "Quote the lower ends with this caution; only an image of finer resolution, or knowledge that leaves such "
        "scenes out of the scan, would settle them."
        if lost
        else "State a finer resolution, or extend the tables of the scan to larger r/θ_g."
    )
    return Caution(
        "table-end",
        f"For {100 * share:.0f} % of the posterior weight of {table.name} {why} just below the θ_g that fits, so "
        "the side of small θ_g is cut off: the lower ends of θ_g and of the mass rest on where that happens, and "
        "the answer leans toward large ones.",
        remedy,
    )


def cut_share(observed: Observed, table: ScanTable, ring: Posterior) -> float:
    """Share of the posterior weight of scenes whose readings end just below the θ_g that fits."""
    return _share_that_is_cut(observed, table, ring)[0]


def _share_that_is_cut(observed: Observed, table: ScanTable, ring: Posterior) -> tuple[float, float]:
    """The same, and the part of it where the ring is lost rather than the table at its end."""
    if not observed.resolution:
        return 0.0, 0.0
    last, goes_on = _last_reading(table)
    theta = max(observed.resolution) / np.where(last[0] > 0.0, last[0], np.nan)
    d = observed.diameter
    cut = (theta * last[1] - d.mode) / d.minus > -END_SIGMA
    return float(ring.shares()[cut].sum()), float(ring.shares()[cut & ~goes_on].sum())


def _last_reading(table: ScanTable) -> tuple[tuple[Array, Array], NDArray[np.bool_]]:
    """Node and diameter of the last closed ring of every scene, and whether the table ends with it."""
    closed = np.isfinite(closed_rings(table))
    columns = np.arange(table.node.shape[1])
    last = np.where(closed, columns, -1).max(axis=1)
    rows, safe = np.arange(last.size), np.maximum(last, 0)
    node = np.where(last >= 0, table.node[rows, safe], np.nan)
    ends = last == table.node_count - 1
    return (node, np.where(last >= 0, table.diameter[rows, safe], np.nan)), ends


def _outside(table: ScanTable, replaced: tuple[Replaced, ...]) -> list[Caution]:
    return [
        Caution(
            "prior-outside-scan",
            f"Only {100 * item.covered:.0f} % of the prior on {plain(item.key)} ({item.new}) lies within the "
            f"range of {table.name} ({item.old}).",
            f"Widen the range of {item.key} in the scan.",
        )
        for item in replaced
        if item.covered < COVERED
    ]


def range_ends(table: ScanTable, posterior: Posterior, which: str) -> list[Caution]:
    """Parameters whose posterior over prior still rises at an end of its range while k still changes."""
    found = []
    for parameter in table.parameters:
        if parameter.kind == "list":
            continue
        for end, at, side in (
            ("lower", parameter.low, 1.0 - position(parameter)),
            ("upper", parameter.high, position(parameter)),
        ):
            if not _physical(parameter, at) and _rises(posterior, side):
                found.append(_widen(parameter, end, table.name, which))
    return found


def _physical(parameter: ScanParameter, end: float) -> bool:
    ends = PHYSICAL_ENDS.get(parameter.key.rsplit(".", 1)[-1], ())
    return any(math.isclose(end, at, abs_tol=1e-9) for at in ends)


def _rises(posterior: Posterior, side: Array) -> bool:
    """Whether posterior over prior rises by RISE, and k changes, over the last fifth of `side` (0 to 1)."""
    rows = (side > 1.0 - OUTER) & (posterior.weight > 0.0) & np.isfinite(posterior.factor)
    if np.count_nonzero(rows) < FEWEST_IN_END:
        return False
    place = (side[rows] - 1.0 + 0.5 * OUTER) / OUTER  # −1/2 to 1/2 across the fifth
    weight = posterior.weight[rows]
    level, slope, error = _line(place, posterior.evidence[rows], weight)
    inner, outer = level - 0.5 * slope, level + 0.5 * slope
    if not (slope > SIGNIFICANT * error and outer > RISE * max(inner, 0.0)):
        return False
    _, change, change_error = _line(place, posterior.factor[rows], weight)
    return abs(change) > max(STILL_CHANGES, SIGNIFICANT * change_error)


def _line(x: Array, y: Array, weight: Array) -> tuple[float, float, float]:
    """Weighted straight line: value at x = 0, slope, and the standard error of the slope."""
    columns = np.stack([np.ones_like(x), x], axis=1)
    normal = np.linalg.inv(columns.T @ (columns * weight[:, None]))
    level, slope = normal @ (columns.T @ (weight * y))
    left = y - level - slope * x
    scatter = float(weight @ left**2) / float(weight.sum()) * x.size / (x.size - 2.0)
    return float(level), float(slope), math.sqrt(scatter * normal[1, 1] * float(weight.mean()))


def _widen(parameter: ScanParameter, end: str, scan: str, which: str) -> Caution:
    return Caution(
        "range-end",
        f"The {which} posterior of {named(parameter.key)} in {scan} still rises toward the {end} end of its "
        "range, and the conversion factor still changes there: the answer depends on where the range was cut.",
        f"Widen the range of {plain(parameter.key)} at its {end} end, or say why it stops there.",
    )


def effective_scenes(shares: Array) -> float:
    """Effective number of scenes of a posterior (Kish 1965)."""
    return float(shares.sum() ** 2 / (shares @ shares))
