"""What `ringwright measure` says: one paragraph per image in plain words, and mean and spread for several.

Each number with its unit, and beside it the usual caution (docs/measuring.md). Lengths in µas, or in M where
there is no sky.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from astropy import units
from astropy.table import Table

from ringwright.ring.measuring import Ring
from ringwright.ring.outcomes import RingOutcome

CAUTION = (
    "The bright ring is not the edge of the shadow, and its scatter (how far it is from a circle) is not an "
    "uncertainty."
)


def describe(rings: Sequence[Ring], table: Table) -> str:
    """Plain words for rings measured, and for their table where there are several."""
    parts = [_one(ring) for ring in rings]
    if len(rings) > 1:
        parts.append(_several(table, _unit(rings[0].diameter)))
    if any(ring.outcome.has_diameter for ring in rings):
        parts.append(CAUTION)
    return "\n\n".join(parts)


def _one(ring: Ring) -> str:
    unit = _unit(ring.diameter)
    at = f"{ring.resolution.value:.4g} {unit} resolution"
    lines = [f"{ring.name} at {at} ({ring.estimator}): {ring.outcome.name}"]
    if ring.outcome is not RingOutcome.RING:
        lines.append(f"  {ring.outcome.sentence}")
    if ring.outcome.has_diameter:
        lines += _numbers(ring, unit)
    return "\n".join(lines + [f"  note: {note}" for note in ring.notes])


def _numbers(ring: Ring, unit: str) -> list[str]:
    east, north = ring.centre.value
    error = f"numerical error {ring.numerical_error.value:.1g} {unit}"
    place = f"{east:+.2f} {unit} east, {north:+.2f} {unit} north of the middle"
    dark = f"central brightness {ring.central_brightness:.3f}"
    return [
        f"  diameter {ring.diameter.value:.3f} {unit}, {error}; scatter {ring.scatter.value:.3f} {unit}",
        f"  width {_width(ring, unit)}; centre {place}",
        f"  asymmetry {ring.asymmetry:.3f}{_toward(ring)}; {dark}",
    ]


def _width(ring: Ring, unit: str) -> str:
    if not np.isfinite(ring.width.value):
        return "not resolved"
    limit = "at least " if ring.outcome is RingOutcome.WIDTH_LIMIT else ""
    return f"{limit}{ring.width.value:.3f} {unit}"


def _toward(ring: Ring) -> str:
    angle = ring.orientation.value
    return f", brighter toward {angle:.1f} deg east of north" if np.isfinite(angle) else ""


def _several(table: Table, unit: str) -> str:
    mean, spread = table.meta["mean"]["diameter"], table.meta["spread"]["diameter"]
    counted = f"{table.meta['measured']} of {table.meta['images']} images have a diameter"
    if spread is None:
        return f"{counted}."
    return f"{counted}: mean {mean:.3f} {unit}, spread (standard deviation over images) {spread:.3f} {unit}."


def _unit(length: units.Quantity) -> str:
    return "M" if length.unit == units.dimensionless_unscaled else str(length.unit)
