"""The profile in plain words: a table of the orders and what interferometers would see of them.

Medians over position angle stand in the table, the ranges are in the product. Lengths in M, fluxes in mJy or shares.
"""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

import numpy as np

from ringwright.profiling.product import CAUTION
from ringwright.profiling.rings import LIMIT_DELAY, LIMIT_RATIO

if TYPE_CHECKING:
    from ringwright.profiling.profile import Profile

COLUMNS = (
    ("order", "{:>5}"),
    ("flux", "{:>11}"),
    ("share", "{:>9}"),
    ("peak [M]", "{:>9}"),
    ("mean [M]", "{:>9}"),
    ("width [M]", "{:>9}"),
    ("FWHM [M]", "{:>9}"),
    ("band [M]", "{:>9}"),
    ("flux ratio", "{:>10}"),
    ("width ratio", "{:>11}"),
    ("turn [°]", "{:>8}"),
    ("delay [M]", "{:>9}"),
)


def describe(profile: Profile) -> str:
    """The whole answer as text."""
    lines = [_title(profile), "", *_table(profile), "", *_baselines(profile), f"Caution: {CAUTION}."]
    return "\n".join(lines)


def _title(profile: Profile) -> str:
    known = "" if profile.theta_g is None else f", 1 M = {profile.theta_g_uas:.3g} µas"
    frequency = "" if profile.frequency is None else f" at {profile.frequency / 1e9:g} GHz"
    return f"{profile.name}{frequency}: {_flux(profile, profile.total_flux)} in all{known}; medians over position angle"


def _table(profile: Profile) -> list[str]:
    rings = profile.rings
    lines = [" ".join(form.format(name) for name, form in COLUMNS)]
    for order in range(rings.flux.size):
        cells = [
            str(order),
            _flux(profile, rings.flux[order]),
            f"{rings.fraction[order]:.3g}",
            *(
                _length(row[order])
                for row in (rings.peak, rings.mean, rings.width, rings.fwhm, rings.band_width)
            ),
            _number(rings.flux_ratio[order]),
            _number(rings.width_ratio[order]),
            _number(math.degrees(rings.rotation[order, 0])),
            _number(rings.delay[order, 0]),
        ]
        lines.append(" ".join(form.format(cell) for cell, (_, form) in zip(cells, COLUMNS, strict=True)))
    limits = [f"{LIMIT_RATIO:.4g}", f"{LIMIT_RATIO:.4g}", "180", f"{LIMIT_DELAY:.4g}"]
    start = sum(len(form.format("")) + 1 for _, form in COLUMNS[:-4])
    forms = [form for _, form in COLUMNS[-4:]]
    lines.append(
        f"{'limits for high orders':<{start}}"
        + " ".join(f.format(c) for f, c in zip(forms, limits, strict=True))
    )
    lines.append(
        f"Width is the root of the second moment; turn and delay follow the circle of {rings.emitting_radius:.3g} M."
    )
    return lines


def _baselines(profile: Profile) -> list[str]:
    found = profile.fringes
    if found is None:
        return []
    lines = []
    for row, (places, _) in enumerate(profile.nulls):
        lines.append(f"Baselines at position angle {math.degrees(found.position_angle[row]) % 180.0:.0f}°:")
        if places.size:
            shown = ", ".join(f"{place / 1e9:.4g}" for place in places[:5])
            lines.append(f"  nulls of all the light: {shown} Gλ{' …' if places.size > 5 else ''}")
        for carrier in profile.carriers:
            if carrier.order == 0:
                continue
            place, flux = carrier.baseline[row], carrier.flux[row]
            if np.isnan(place):
                lines.append(
                    f"  order {carrier.order} has more than half of the envelope on none of them ({carrier.reason})"
                )
                continue
            left = _flux(profile, flux)
            lines.append(
                f"  order {carrier.order} has more than half of the envelope from {place / 1e9:.4g} Gλ, where {left} is left"
            )
    lines += _diameters(profile)
    if profile.first_sight is not None:
        sentence = profile.first_sight.sentence
        lines.append(f"{sentence[0].upper()}{sentence[1:]}.")
    return lines


def _diameters(profile: Profile) -> list[str]:
    lines = []
    for spacing in profile.spacings:
        known = np.isfinite(spacing.diameter)
        if not known.any() or profile.theta_g is None:
            continue
        values, scale = spacing.diameter[known], profile.theta_g_uas
        lines.append(
            f"Diameter of order {spacing.order} by the spacing of its fringes ({spacing.first / 1e9:.3g} to "
            f"{spacing.last / 1e9:.3g} Gλ): {np.median(values):.5g} M = {np.median(values) * scale:.4g} µas, from "
            f"{values.min():.5g} to {values.max():.5g} M with position angle, each ± {np.median(spacing.error[known]):.2g} M"
        )
    return lines


def _flux(profile: Profile, value: float) -> str:
    return f"{value * 1e3:.4g} mJy" if profile.unit == "Jy" else f"{value:.4g}"


def _length(row: np.ndarray) -> str:
    known = row[~np.isnan(row)]
    return _number(float(np.median(known))) if known.size else "–"


def _number(value: float) -> str:
    if math.isinf(value):
        return "no limit"
    return "–" if math.isnan(value) else f"{value:.4g}"
