"""FITS images of the sky: reading any with a celestial coordinate system, writing ours.

Greisen & Calabretta 2002 (A&A 395, 1061) and Calabretta & Greisen 2002 (A&A 395, 1077) through `astropy.wcs`;
a model is written with degenerate frequency and Stokes axes in Jy/pixel. Arrays here have row 0 south and
column 0 east; pixels and beams are in µas.
"""

from __future__ import annotations

import math
import re
import warnings
from collections.abc import Iterable
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
from astropy import units
from astropy.io import fits
from astropy.utils.exceptions import AstropyUserWarning
from astropy.wcs import WCS, FITSFixedWarning
from numpy.typing import NDArray

from ringwright.errors import InputError
from ringwright.products import written_whole

Array = NDArray[np.float64]

UAS_PER_DEGREE = 3.6e9
# Relative; headers hold about 14 digits, and a pixel this far from square shifts nothing that a ring reading
# shows.
SQUARE = 1e-4
ALIGNED = 1e-6
ROUND_BEAM = 1e-3
STOKES_I = 1
CHECKSUM_COMMENT = "of this header and data unit"

_PER_PIXEL = re.compile(r"[mukMµ]?jy(/|)(pixel|pix|px)(-1)?")
_PER_BEAM = re.compile(r"[mukMµ]?jy(/|)beam(-1)?")
_FLUX = re.compile(r"([mukµ]?)jy/?(pixel|pix|px|beam|sr|arcsec|mas|uas)[-12]*", re.IGNORECASE)
_PREFIXES = {"": 1.0, "m": 1e-3, "M": 1e6, "u": 1e-6, "U": 1e-6, "µ": 1e-6, "k": 1e3, "K": 1e3}
_SURFACE = re.compile(r"([mukMµ]?jy(/|)(sr|arcsec2|mas2|uas2|arcsec-2|mas-2|uas-2|sr-1))|m?k")


@dataclass(frozen=True)
class SkyImage:
    """An image of the sky as read from a file.

    Attributes
    ----------
    data : array (ny, nx)
        Row 0 south, column 0 east; in `unit`; blank pixels are zero.
    pixel : Quantity
        Side of a pixel, an angle.
    beam : Quantity or None
        FWHM of the round beam that the image is smoothed to already.
    averaged : bool
        Whether a pixel is the mean over its area; False for samples of an image with a beam.
    unit : str
        BUNIT as written, "" where the header has none.
    notes : tuple of str
        What was done to the data on the way in.
    blank : int
        How many pixels are blank.
    """

    name: str
    data: Array
    pixel: units.Quantity
    beam: units.Quantity | None
    averaged: bool
    unit: str
    notes: tuple[str, ...]
    blank: int = 0

    @property
    def jansky(self) -> float | None:
        """What takes `data` to Jy per pixel; None for temperatures and where the header has no unit."""
        found = _FLUX.fullmatch(_bare(self.unit))
        if found is None:
            return None
        per, side = found[2].lower(), 1.0  # side of a pixel, in the angle whose square brightness is per
        if per == "beam" and self.beam is not None:
            fwhm = float(self.beam.to_value(self.pixel.unit))
            side = float(self.pixel.value) / fwhm * math.sqrt(4.0 * math.log(2.0) / math.pi)
        elif per in ("sr", "arcsec", "mas", "uas"):
            side = float(self.pixel.to_value("rad" if per == "sr" else per))
        return _PREFIXES[found[1]] * side**2


def read_fits(path: str | Path) -> SkyImage:
    """Read the first image with a celestial coordinate system from a FITS file.

    Raises
    ------
    InputError
        For a file that is missing, not FITS, truncated, without such an image, with several frequencies, a
        rotated or oblong grid, an elliptical beam, or values that are no brightness.
    """
    name, header, raw = _first_sky_image(Path(path))
    notes: list[str] = []
    data, matrix = _plane(path, header, raw, notes)
    data, pixel = _upright(path, data, matrix, notes)
    unit = str(header.get("BUNIT", "")).strip()
    beam = _beam(path, header, notes)
    per_beam = _check_unit(path, unit, beam is not None, notes)
    blank = int(np.count_nonzero(~np.isfinite(data)))
    data = _filled(data, notes)
    angle = units.Quantity(pixel * UAS_PER_DEGREE, "uas")
    averaged = not (per_beam or beam is not None)
    return SkyImage(name, data, angle, beam, averaged, unit, tuple(notes), blank)


def _first_sky_image(path: Path) -> tuple[str, fits.Header, NDArray[Any]]:
    if not path.is_file():
        raise InputError(f"{path}: there is no such file")
    try:
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")
            warnings.filterwarnings("error", message=".*truncated.*", category=AstropyUserWarning)
            with fits.open(path, memmap=False) as hdus:
                for hdu in hdus:
                    if getattr(hdu, "is_image", False) and hdu.header.get("NAXIS", 0) >= 2:
                        header, data = hdu.header.copy(), np.array(hdu.data)
                        if WCS(header).has_celestial:
                            return str(header.get("OBJECT") or path.stem), header, data
    except (AstropyUserWarning, OSError, TypeError, ValueError, EOFError, KeyError) as error:
        raise InputError(f"{path}: this is not a readable FITS file, or it is cut short ({error})") from error
    raise InputError(
        f"{path}: no image in this FITS file has a celestial coordinate system (CTYPE such as RA---SIN and "
        "DEC--SIN); a ring on the sky needs to know its pixels' size and where north is"
    )


def _plane(
    path: str | Path, header: fits.Header, data: NDArray[Any], notes: list[str]
) -> tuple[Array, Array]:
    """The (declination, right ascension) plane, and the matrix from pixels to degrees."""
    with warnings.catch_warnings():
        warnings.simplefilter("ignore", FITSFixedWarning)
        wcs = WCS(header)
    kinds = [
        axis["coordinate_type"] or str(header.get(f"CTYPE{k + 1}", "")).lower()
        for k, axis in enumerate(wcs.get_axis_types())
    ]
    index: list[Any] = [slice(None)] * data.ndim
    for axis, length in enumerate(reversed(data.shape)):  # FITS axis 1 varies fastest and comes last in numpy
        if axis in (wcs.wcs.lng, wcs.wcs.lat):
            continue
        place = data.ndim - 1 - axis
        index[place] = 0
        if length > 1 and axis < len(kinds) and kinds[axis] == "stokes":
            index[place] = _stokes_i(path, header, axis + 1, length)
            notes.append("of several Stokes parameters, the total intensity I is measured")
        elif length > 1:
            raise InputError(
                f"{path}: axis {axis + 1} ({header.get(f'CTYPE{axis + 1}', 'unnamed')}) has {length} planes; "
                "cut out one of them, since one ring is measured on one image"
            )
    plane = data[tuple(index)].astype(np.float64)
    if wcs.wcs.lng > wcs.wcs.lat:
        plane = plane.T
    return plane, np.asarray(wcs.celestial.pixel_scale_matrix, dtype=np.float64)


def _stokes_i(path: str | Path, header: fits.Header, axis: int, length: int) -> int:
    start = float(header.get(f"CRVAL{axis}", 1.0))
    step = float(header.get(f"CDELT{axis}", 1.0)) or 1.0
    place = round((STOKES_I - start) / step + float(header.get(f"CRPIX{axis}", 1.0)) - 1.0)
    if not 0 <= place < length:
        raise InputError(f"{path}: no plane of the Stokes axis is the total intensity I")
    return int(place)


def _upright(path: str | Path, data: Array, matrix: Array, notes: list[str]) -> tuple[Array, float]:
    """North up, east left; the side of a pixel [deg]."""
    across, up = matrix[0, 0], matrix[1, 1]
    size = float(np.hypot(matrix[0, 0], matrix[1, 0]))
    if max(abs(matrix[0, 1]), abs(matrix[1, 0])) > ALIGNED * size:
        turn = np.degrees(np.arctan2(matrix[0, 1], matrix[1, 1]))
        raise InputError(
            f"{path}: the grid is rotated by {turn:.4g} deg against north; regrid it with north up"
        )
    if abs(abs(across / up) - 1.0) > SQUARE:
        raise InputError(
            f"{path}: a pixel is {abs(across) * UAS_PER_DEGREE:.6g} by {abs(up) * UAS_PER_DEGREE:.6g} µas; "
            "regrid the image to square pixels"
        )
    if across > 0.0:
        data = data[:, ::-1]
        notes.append("columns ran to the east and were turned round")
    if up < 0.0:
        data = data[::-1]
        notes.append("rows ran to the south and were turned round")
    return np.ascontiguousarray(data), float(np.sqrt(abs(across * up)))


def _beam(path: str | Path, header: fits.Header, notes: list[str]) -> units.Quantity | None:
    major, minor = header.get("BMAJ"), header.get("BMIN", header.get("BMAJ"))
    if not major:
        return None
    major, minor = float(major) * UAS_PER_DEGREE, float(minor) * UAS_PER_DEGREE
    if not 0.0 < minor <= major * (1.0 + ROUND_BEAM):
        raise InputError(f"{path}: a beam of {major:.4g} by {minor:.4g} µas is no beam; check BMAJ and BMIN")
    if major > minor * (1.0 + ROUND_BEAM):
        raise InputError(
            f"{path}: the beam is elliptical, {major:.4g} by {minor:.4g} µas; "
            "restore the image with a round beam, or give its model in Jy/pixel"
        )
    notes.append(f"smoothed to {major:.4g} µas already, as BMAJ says")
    return units.Quantity(np.sqrt(major * minor), "uas")


def _check_unit(path: str | Path, unit: str, has_beam: bool, notes: list[str]) -> bool:
    """Whether brightness is per beam; refuses what is no brightness."""
    plain = _bare(unit).lower()
    if not plain:
        notes.append("the header has no BUNIT: values are read as brightness, in a unit unknown")
        return False
    if _PER_BEAM.fullmatch(plain):
        if not has_beam:
            raise InputError(
                f"{path}: brightness is in {unit}, but the header has no BMAJ and BMIN to say which beam"
            )
        return True
    if not (_PER_PIXEL.fullmatch(plain) or _SURFACE.fullmatch(plain)):
        raise InputError(
            f"{path}: BUNIT '{unit}' is no surface brightness; accepted are "
            "Jy/pixel, Jy/beam, Jy/sr, Jy/arcsec2 and K"
        )
    return False


def _bare(unit: str) -> str:
    return re.sub(r"[\s.*^()]", "", unit)


def _filled(data: Array, notes: list[str]) -> Array:
    blank = ~np.isfinite(data)
    if blank.any():
        notes.append(f"{int(blank.sum())} of {data.size} pixels are blank and count as dark")
        data = np.where(blank, 0.0, data)
    negative = data < 0.0
    if negative.any():
        share = -float(data[negative].sum()) / float(np.abs(data).sum())
        notes.append(
            f"{int(negative.sum())} of {data.size} pixels are negative, with {share:.2g} of the flux; "
            "they are kept, and left out of the centroid"
        )
    return data


def write_fits(
    path: str | Path,
    data_jy_per_pixel: Array,
    pixel_uas: float,
    frequency_hz: float | None,
    ra_deg: float,
    dec_deg: float,
    name: str,
    overwrite: bool = False,
    history: Iterable[str] = (),
) -> Path:
    """Write a model image in Jy/pixel with axes (RA, DEC, FREQ, STOKES).

    Parameters
    ----------
    data_jy_per_pixel : array (ny, nx)
        Row 0 south, column 0 east. The middle of the array lies at (`ra_deg`, `dec_deg`).

    Raises
    ------
    InputError
        If the file exists and `overwrite` is not set, or the image has no frequency.
    """
    target = Path(path)
    if target.exists() and not overwrite:
        raise InputError(f"{target}: this file exists; give another path or ask for it to be replaced")
    if frequency_hz is None:
        raise InputError(f"the image of '{name}' has no frequency, which a FITS image in Jy/pixel states")
    header = _header(data_jy_per_pixel.shape, pixel_uas, frequency_hz, ra_deg, dec_deg, name)
    for line in history:
        header["HISTORY"] = line
    hdu = fits.PrimaryHDU(np.asarray(data_jy_per_pixel, dtype=">f8")[None, None], header)
    hdu.add_checksum(when=CHECKSUM_COMMENT)  # astropy would write the time here
    with written_whole(target) as temporary:
        hdu.writeto(temporary, overwrite=True)
    return target


def _header(
    shape: tuple[int, ...], pixel_uas: float, frequency_hz: float, ra_deg: float, dec_deg: float, name: str
) -> fits.Header:
    ny, nx = shape
    step = pixel_uas / UAS_PER_DEGREE
    axes = (
        ("RA---SIN", ra_deg, -step, 0.5 * (nx + 1), "deg"),
        ("DEC--SIN", dec_deg, step, 0.5 * (ny + 1), "deg"),
        ("FREQ", frequency_hz, 1.0, 1.0, "Hz"),
        ("STOKES", float(STOKES_I), 1.0, 1.0, ""),
    )
    header = fits.Header()
    header["OBJECT"] = name
    header["ORIGIN"] = "ringwright"
    header["BUNIT"] = "Jy/pixel"
    header["RADESYS"] = "ICRS"
    for k, (kind, value, delta, pixel, unit) in enumerate(axes, start=1):
        header[f"CTYPE{k}"] = kind
        header[f"CRVAL{k}"] = value
        header[f"CDELT{k}"] = delta
        header[f"CRPIX{k}"] = pixel
        if unit:
            header[f"CUNIT{k}"] = unit
    return header
