"""The profile in files and in words: the HDF5 product, the JSON summary, the table on the terminal.

Lengths on the screen in M (and µas where θ_g is known), angles in degrees, baselines in wavelengths, fluxes in Jy or
shares of the light; what could not be measured is NaN in the product and null in JSON, with a sentence among the notes.
"""

from __future__ import annotations

import json
import math
from pathlib import Path
from typing import TYPE_CHECKING, Any

import h5py
import numpy as np

from raytrace.contract import Array
from ringwright import products
from ringwright.profiling.rings import LIMIT_DELAY, LIMIT_RATIO, LIMIT_ROTATION

if TYPE_CHECKING:
    from ringwright.profiling.profile import Profile

KIND = "profile"
GIGA = 1e9
# Fields of the table of rings and what they are; M and M² of flux aside.
LENGTHS = {
    "band_inner": "where the innermost emitting circle appears",
    "band_outer": "the farthest that the order can appear",
    "peak": "distance of the brightest point from the origin",
    "mean": "mean distance of the light from the origin",
    "peak_offset": "distance of the brightest point from the critical curve",
    "mean_offset": "mean distance of the light from the critical curve",
    "width": "root of the second moment of the light about its mean",
    "fwhm": "full width at half maximum between the outermost points",
}
CAUTION = "what is seen here is the scene's emission; another emission has other rings, and a ring's diameter is not the shadow's"


def save(profile: Profile, path: str | Path | None, *, replace: bool) -> Path:
    """Write the HDF5 product beside any earlier one of the same scene, or where asked."""
    target = Path(path) if path is not None else products.default_output(f"{profile.name}-profile", ".h5")
    products.check_target(target, KIND, profile.name, replace=replace)
    products.write_product(target, KIND, profile.name, lambda file: _fill(file, profile), profile.provenance)
    return target


def _fill(file: h5py.File, profile: Profile) -> None:
    unit = profile.unit or "1"
    file.attrs["notes"] = json.dumps(profile.notes, ensure_ascii=False)
    file.attrs["accuracy_asked"] = profile.accuracy
    file.attrs["total_flux"] = profile.total_flux
    file.attrs["emitting_radius_m"] = profile.rings.emitting_radius
    for name, value in (("theta_g_rad", profile.theta_g), ("frequency_hz", profile.frequency)):
        if value is not None:
            file.attrs[name] = value
    _fill_rings(file, profile, unit)
    for index, (cut, angle) in enumerate(zip(profile.cuts, profile.cut_angle, strict=True)):
        _fill_cut(file.create_group(f"cut_{index}"), cut.distance, cut.intensity, angle, unit)
    if profile.fringes is not None:
        _fill_fringes(file, profile, unit)


def _fill_rings(file: h5py.File, profile: Profile, unit: str) -> None:
    rings = profile.rings
    products.scale(
        file, "order", np.arange(rings.flux.size), "1", "order n, half turns more than the direct image"
    )
    products.scale(
        file, "position_angle", np.degrees(rings.position_angle), "deg", "position angle, east of north"
    )
    for name, what in LENGTHS.items():
        _dataset(file, name, getattr(rings, name), "1", f"{what} [GM/c^2]", ("order", "position_angle"))
    _dataset(file, "angular_flux", rings.angular_flux, unit, "flux per radian", ("order", "position_angle"))
    per_order = {
        "flux": (rings.flux, unit, "flux of the order"),
        "flux_fraction": (rings.fraction, "1", "share of all the flux"),
        "flux_ratio": (rings.flux_ratio, "1", "flux over that of the order before"),
        "width_ratio": (rings.width_ratio, "1", "median width over that of the order before"),
        "interpolation_error": (profile.reached, "1", "estimated error of brightness over its maximum"),
    }
    for name, (values, units, what) in per_order.items():
        _dataset(file, name, values, units, what, ("order",))
    for name, values, units, what in (
        ("rotation", np.degrees(rings.rotation), "deg", "rotation after the order before"),
        ("delay", rings.delay, "1", "delay after the order before [GM/c^3]"),
    ):
        for column, which in enumerate(("", "_least", "_greatest")):
            _dataset(file, name + which, values[:, column], units, what, ("order",))


def _fill_cut(group: h5py.Group, distance: Array, intensity: Array, angle: float, unit: str) -> None:
    group.attrs["position_angle_deg"] = math.degrees(angle) % 360.0
    for name, values, units, what in (
        ("distance", distance, "1", "distance from the origin [GM/c^2]"),
        ("intensity", intensity, unit, "brightness per order, flux per square of GM/c^2"),
    ):
        data = group.create_dataset(name, data=values)
        data.attrs["units"], data.attrs["long_name"] = units, what


def _fill_fringes(file: h5py.File, profile: Profile, unit: str) -> None:
    found = profile.fringes
    assert found is not None
    products.scale(file, "baseline", found.baseline, "1", "length of the baseline [wavelengths]")
    products.scale(
        file,
        "direction",
        np.degrees(found.position_angle),
        "deg",
        "position angle of the baseline, east of north",
    )
    along, each = ("direction", "baseline"), ("order", "direction", "baseline")
    amplitude, phase = "visibility amplitude", "visibility phase about the hole"
    _dataset(file, "amplitude", np.abs(found.visibility), unit, amplitude, each)
    _dataset(file, "phase", np.degrees(np.angle(found.visibility)), "deg", phase, each)
    _dataset(file, "envelope", found.envelope, unit, "largest amplitude within one fringe", each)
    _dataset(file, "total_amplitude", np.abs(found.total), unit, f"{amplitude}, all orders", along)
    _dataset(file, "total_phase", np.degrees(np.angle(found.total)), "deg", f"{phase}, all orders", along)
    _dataset(file, "total_envelope", found.total_envelope, unit, "its envelope, all orders", along)
    _dataset(file, "error", found.error, unit, "estimated numerical error of the total", along)
    for spacing in profile.spacings:
        name = f"fringe_diameter_{spacing.order}"
        what = f"diameter of order {spacing.order} by the spacing of its fringes [GM/c^2]"
        _dataset(file, name, spacing.diameter, "1", what, ("position_angle",))
        _dataset(file, f"{name}_error", spacing.error, "1", f"error of the {what}", ("position_angle",))


def _dataset(file: h5py.File, name: str, values: Array, units: str, what: str, axes: tuple[str, ...]) -> None:
    data = file.create_dataset(name, data=values, compression="gzip", shuffle=True, fletcher32=True)
    data.attrs["units"], data.attrs["long_name"] = units, what
    products.attach(file, data, axes)


def summary(profile: Profile) -> dict[str, Any]:
    """What a program wants to know: one JSON object."""
    rings, sight = profile.rings, profile.first_sight
    return {
        "name": profile.name,
        "theta_g": None if profile.theta_g is None else _quantity(profile.theta_g_uas, "uas"),
        "frequency": None if profile.frequency is None else _quantity(profile.frequency / 1e9, "GHz"),
        "total_flux": _quantity(profile.total_flux, profile.unit),
        "emitting_radius": _quantity(rings.emitting_radius, "M"),
        "orders": [_order(profile, order) for order in range(rings.flux.size)],
        "limits": {
            "width_and_flux_ratio": LIMIT_RATIO,
            "rotation": _quantity(math.degrees(LIMIT_ROTATION), "deg"),
            "delay": _quantity(LIMIT_DELAY, "M"),
        },
        "directions": _directions(profile),
        "first_sight": None
        if sight is None
        else {
            "baseline": _quantity(sight.baseline / GIGA, "Glambda"),
            "position_angle": _quantity(math.degrees(sight.position_angle) % 180.0, "deg"),
            "flux": _quantity(sight.flux, profile.unit),
            "length": _quantity(sight.length / 1e3, "km"),
            "earth_diameters": _number(sight.earth_diameters),
            "ground_frequency": _quantity(sight.ground_frequency / 1e9, "GHz"),
            "sentence": sight.sentence,
        },
        "trusted_to": _quantity(profile.trusted / GIGA, "Glambda"),
        "accuracy_asked": profile.accuracy,
        "notes": [*profile.notes, CAUTION],
    }


def _order(profile: Profile, order: int) -> dict[str, Any]:
    rings = profile.rings
    lengths = {name: _range(getattr(rings, name)[order], "M") for name in LENGTHS}
    return {
        "order": order,
        "flux": _quantity(float(rings.flux[order]), profile.unit),
        "fraction": _number(float(rings.fraction[order])),
        **lengths,
        "band_width": _range(rings.band_width[order], "M"),
        "flux_ratio": _number(float(rings.flux_ratio[order])),
        "width_ratio": _number(float(rings.width_ratio[order])),
        "rotation": _spread(np.degrees(rings.rotation[order]), "deg"),
        "delay": _spread(rings.delay[order], "M"),
        "interpolation_error": float(profile.reached[order]),
    }


def _directions(profile: Profile) -> list[dict[str, Any]]:
    found = profile.fringes
    if found is None:
        return []
    answers = []
    for row, (places, depth) in enumerate(profile.nulls):
        answers.append(
            {
                "position_angle": _quantity(math.degrees(found.position_angle[row]) % 180.0, "deg"),
                "nulls": [
                    {"baseline": _quantity(place / GIGA, "Glambda"), "depth": _number(low)}
                    for place, low in zip(places, depth, strict=True)
                ],
                "carriers": [
                    {
                        "order": carrier.order,
                        "from": _quantity(carrier.baseline[row] / GIGA, "Glambda"),
                        "flux": _quantity(carrier.flux[row], profile.unit),
                        "reason": carrier.reason if np.isnan(carrier.baseline[row]) else "",
                    }
                    for carrier in profile.carriers
                ],
                "fringe_diameters": [
                    _nearest(spacing, found.position_angle[row]) for spacing in profile.spacings
                ],
            }
        )
    return answers


def _nearest(spacing: Any, angle: float) -> dict[str, Any]:
    """A fringe diameter at the tabulated direction nearest to an angle."""
    away = np.abs((spacing.position_angle - angle + 0.5 * math.pi) % math.pi - 0.5 * math.pi)
    at = int(np.argmin(away))
    return {
        "order": spacing.order,
        "diameter": {**_quantity(spacing.diameter[at], "M"), "error": _number(spacing.error[at])},
        "reason": spacing.note,
    }


def _number(value: float) -> float | None:
    return float(value) if math.isfinite(value) else None


def _quantity(value: float, unit: str) -> dict[str, Any]:
    return {"value": _number(value), "unit": unit}


def _range(row: Array, unit: str) -> dict[str, Any]:
    known = row[np.isfinite(row)]
    if not known.size:
        return {**_quantity(math.nan, unit), "least": None, "greatest": None}
    return {
        **_quantity(float(np.median(known)), unit),
        "least": float(known.min()),
        "greatest": float(known.max()),
    }


def _spread(three: Array, unit: str) -> dict[str, Any]:
    return {**_quantity(three[0], unit), "least": _number(three[1]), "greatest": _number(three[2])}
