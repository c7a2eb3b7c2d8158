"""`measure`: one image in, one `Ring` out, in physical units; `measure_many`: many files, one table.

The estimator is that of docs/measuring.md. Quantities are angles where the image is on the sky, and plain
numbers in units of M = GM/c² where it is not; position angles are in degrees east of north.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any, Literal

import numpy as np
from astropy import units
from astropy.table import Table
from numpy.typing import NDArray

from ringwright.errors import InputError
from ringwright.fits import SkyImage, read_fits
from ringwright.kinds import mistaken
from ringwright.ring.estimator import (
    DYNAMIC_RANGE,
    PIXELS_PER_FWHM,
    PUBLISHED_UAS,
    RAYS,
    RELATIVE,
    SAME_LENGTH,
    Lengths,
    Reading,
    check_image,
    read_blurred,
)
from ringwright.ring.outcomes import RingOutcome
from ringwright.ring.smoothing import FWHM_PER_SIGMA, OVERSAMPLING, prepare

ESTIMATOR = "peak-ring"
# The numerical error is what changes on a finer grid with more rays; the finer reading is the one reported.
FINER = 1.6
MORE_RAYS = 2
HDF5_START = b"\x89HDF"


@dataclass(frozen=True)
class Ring:
    """The ring found on one image.

    Attributes
    ----------
    outcome : RingOutcome
        Readings are NaN unless `outcome.has_diameter`.
    centre : Quantity (2,)
        East and north of the middle of the image.
    diameter, scatter, width : Quantity
        `scatter` is the spread of the diameter around the ring, 2σ(r_pk). It is no uncertainty.
    orientation : Quantity
        Position angle of the brighter side, east of north; NaN for a ring without one.
    asymmetry, central_brightness : float
    resolution : Quantity
        FWHM of the round Gaussian that the image was brought to.
    estimator : str
    unresolved : float
        Share of the directions along which the width is not resolved.
    numerical_error : Quantity
        How far the diameter depends on the sampling of the estimator.
    name : str
    notes : tuple of str
        What was done to the image on the way in.
    """

    outcome: RingOutcome
    centre: units.Quantity
    diameter: units.Quantity
    scatter: units.Quantity
    width: units.Quantity
    orientation: units.Quantity
    asymmetry: float
    central_brightness: float
    resolution: units.Quantity
    estimator: str
    unresolved: float
    numerical_error: units.Quantity
    name: str
    notes: tuple[str, ...] = ()

    def to_json(self) -> dict[str, Any]:
        """Plain values for JSON: a quantity is {"value", "unit"}; what could not be read is null."""
        diameter = _plain(self.diameter)
        diameter["scatter"] = _number(self.scatter.value)
        diameter["numerical_error"] = _number(self.numerical_error.value)
        return {
            "name": self.name,
            "outcome": self.outcome.name,
            "reason": self.outcome.sentence,
            "centre": _plain(self.centre),
            "diameter": diameter,
            "width": _plain(self.width),
            "orientation": _plain(self.orientation),
            "asymmetry": {"value": _number(self.asymmetry), "unit": ""},
            "central_brightness": {"value": _number(self.central_brightness), "unit": ""},
            "resolution": _plain(self.resolution),
            "estimator": self.estimator,
            "unresolved": _number(self.unresolved),
            "notes": list(self.notes),
        }


def measure(
    image: Any,
    *,
    resolution: Any,
    centre: Any = None,
    lengths: Literal["relative", "published"] = "relative",
    dynamic_range: float = DYNAMIC_RANGE,
) -> Ring:
    """Bring an image to a resolution and measure the ring on it.

    Parameters
    ----------
    image : Image, SkyImage or path
        A rendered image, one read by `read_fits`, or the path of our HDF5 or of any FITS image with a
        celestial WCS.
    resolution : Quantity or str
        FWHM of the round Gaussian that the image is brought to, such as "20 uas", or "5 M" for an image in M.
    centre : pair of Quantity or str, optional
        East and north of the middle of the image; found where not given.
    lengths : {"relative", "published"}
        Whether the estimator's lengths follow the diameter, or are the published ones in µas.
    dynamic_range : float
        A ring whose faintest peak is fainter than its brightest by more than this is open.

    Raises
    ------
    InputError
        For an image or a length that cannot be used.
    """
    opened = open_image(image) if isinstance(image, (str, Path)) else image
    unit = opened.pixel.unit
    fwhm = length_in(resolution, unit, "the resolution")
    reading, error, notes = _read(opened, fwhm, centre, lengths, dynamic_range)
    return Ring(
        outcome=reading.outcome,
        centre=units.Quantity([reading.east, reading.north], unit),
        diameter=units.Quantity(reading.diameter, unit),
        scatter=units.Quantity(reading.scatter, unit),
        width=units.Quantity(reading.width, unit),
        orientation=units.Quantity(math.degrees(reading.orientation) % 360.0, "deg"),
        asymmetry=reading.asymmetry,
        central_brightness=reading.central_brightness,
        resolution=units.Quantity(fwhm, unit),
        estimator=ESTIMATOR if lengths == "relative" else f"{ESTIMATOR}, published lengths",
        unresolved=reading.unresolved,
        numerical_error=units.Quantity(error, unit),
        name=opened.name,
        notes=notes,
    )


def measure_many(paths: Iterable[str | Path], *, resolution: Any, **options: Any) -> Table:
    """Measure the ring on many images at one resolution.

    Returns
    -------
    Table
        One row per image. `meta["mean"]` and `meta["spread"]` (standard deviation, of two or more) cover the
        rings found; `table.write(path, format="ascii.ecsv")` keeps units and meta. Options are those of
        `measure`.
    """
    names = [str(path) for path in paths]
    return ring_table(names, [measure(name, resolution=resolution, **options) for name in names])


def ring_table(paths: Sequence[str], found: Sequence[Ring]) -> Table:
    """The table of `measure_many` from rings measured already."""
    if not found:
        raise InputError("no image was given to measure")
    if len({ring.diameter.unit.physical_type for ring in found}) > 1:
        raise InputError("some images are on the sky and some in M: measure them apart")
    unit = found[0].diameter.unit
    table = Table()
    table["file"] = list(paths)
    table["outcome"] = [ring.outcome.name for ring in found]
    for column in ("diameter", "scatter", "width", "resolution", "numerical_error"):
        table[column] = units.Quantity([getattr(ring, column) for ring in found], unit)
    table["east"] = units.Quantity([ring.centre[0] for ring in found], unit)
    table["north"] = units.Quantity([ring.centre[1] for ring in found], unit)
    table["orientation"] = units.Quantity([ring.orientation for ring in found], "deg")
    for column in ("asymmetry", "central_brightness"):
        table[column] = [getattr(ring, column) for ring in found]
    table.meta.update(_summary(table))
    return table


def _summary(table: Table) -> dict[str, Any]:
    mean, spread = {}, {}
    for column in ("diameter", "width", "asymmetry", "central_brightness"):
        values = np.asarray(table[column], dtype=np.float64)
        values = values[np.isfinite(values)]
        mean[column] = float(values.mean()) if values.size else None
        spread[column] = float(values.std(ddof=1)) if values.size > 1 else None
    measured = int(np.isfinite(np.asarray(table["diameter"])).sum())
    return {
        "images": len(table),
        "measured": measured,
        "mean": mean,
        "spread": spread,
        "estimator": ESTIMATOR,
    }


def open_image(path: str | Path) -> Any:
    """An `Image` from our HDF5, or a `SkyImage` from FITS, told apart by the first bytes."""
    path = Path(path)
    if not path.is_file():
        raise InputError(f"{path}: there is no such file")
    with path.open("rb") as file:
        start = file.read(len(HDF5_START))
    if start != HDF5_START:
        if found := mistaken(path, "image"):
            raise InputError(found)
        return read_fits(path)
    from ringwright.image import Image

    return Image.open(path)


def at_resolution(image: Any, resolution: Any) -> tuple[NDArray[np.float64], float]:
    """An image or file as it looks at a resolution, shape (ny, nx), and the side of its pixels."""
    opened = open_image(image) if isinstance(image, (str, Path)) else image
    data, pixel, beam, averaged = _plain_image(opened)
    fwhm = length_in(resolution, opened.pixel.unit, "the resolution")
    check_image(data, pixel, fwhm, beam)
    more = math.sqrt(max(fwhm**2 - beam**2, 0.0))
    spectrum = prepare(data, pixel, widest=more, averaged=averaged and more >= PIXELS_PER_FWHM * pixel)
    return spectrum.smoothed(more / FWHM_PER_SIGMA), pixel


def length_in(given: Any, unit: units.UnitBase, what: str) -> float:
    """A length on the sky or in M as a number in the unit of the image.

    Raises
    ------
    InputError
        For a text that is no quantity, or a unit that does not fit the image.
    """
    on_sky = unit.physical_type == "angle"
    try:
        in_m = isinstance(given, str) and given.split()[-1:] == ["M"]
        value = units.Quantity(float(given.split()[0]) if in_m else given)
        if on_sky or value.unit != units.dimensionless_unscaled:
            return float(value.to_value(unit))
        return float(value.value)
    except (TypeError, ValueError, units.UnitsError) as error:
        accepted = "an angle such as '20 uas'" if on_sky else "a length such as '5 M'"
        raise InputError(f"{what} '{given}' does not fit this image; give {accepted}") from error


def _read(
    image: Any, fwhm: float, centre: Any, lengths: str, dynamic_range: float
) -> tuple[Reading, float, tuple[str, ...]]:
    unit, notes = image.pixel.unit, tuple(image.notes)
    data, pixel, beam, averaged = _plain_image(image)
    check_image(data, pixel, fwhm, beam)
    if not dynamic_range > 1.0:
        raise InputError(f"a dynamic range is larger than 1, not {dynamic_range:g}")
    if pixel * PIXELS_PER_FWHM > fwhm * (1.0 + SAME_LENGTH):
        return Reading(RingOutcome.TOO_COARSE), math.nan, notes
    about = None
    if centre is not None:
        about = (
            length_in(centre[0], unit, "the centre's east"),
            length_in(centre[1], unit, "the centre's north"),
        )
    spectrum = prepare(data, pixel, widest=math.sqrt(max(fwhm**2 - beam**2, 0.0)), averaged=averaged)
    rough, fine = (
        read_blurred(
            spectrum,
            fwhm,
            beam=beam,
            centre=about,
            lengths=_lengths(lengths, unit),
            dynamic_range=dynamic_range,
            oversampling=oversampling,
            rays=rays,
        )
        for oversampling, rays in ((OVERSAMPLING, RAYS), (FINER * OVERSAMPLING, MORE_RAYS * RAYS))
    )
    return fine, abs(fine.diameter - rough.diameter), notes


def _plain_image(image: Any) -> tuple[NDArray[np.float64], float, float, bool]:
    """Brightness, pixel, beam (0 for none), and whether pixels are averages, of either kind of image."""
    unit = image.pixel.unit
    beam = 0.0 if image.beam is None else float(image.beam.to_value(unit))
    if isinstance(image, SkyImage):
        return image.data, float(image.pixel.value), beam, image.averaged
    return image.total, float(image.pixel.value), beam, True


def _lengths(lengths: str, unit: units.UnitBase) -> Lengths:
    if lengths == "relative":
        return RELATIVE
    if lengths != "published":
        raise InputError(f"lengths '{lengths}' are not known; accepted are 'relative' and 'published'")
    if unit.physical_type != "angle":
        raise InputError(
            "the published lengths are angles, and this image is in units of M; use relative ones"
        )
    scale = units.uas.to(unit)
    return Lengths(PUBLISHED_UAS.start * scale, PUBLISHED_UAS.stop * scale, PUBLISHED_UAS.disk * scale, False)


def _number(value: Any) -> float | None:
    return float(value) if np.isfinite(value) else None


def _plain(quantity: units.Quantity) -> dict[str, Any]:
    value = quantity.value
    plain = [_number(v) for v in value] if np.ndim(value) else _number(value)
    return {
        "value": plain,
        "unit": "M" if quantity.unit == units.dimensionless_unscaled else str(quantity.unit),
    }
