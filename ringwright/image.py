"""`Image`: a rendered view with its light per order, and the HDF5 product it is kept in.

Arrays have the axes (order, y, x); row 0 is the southernmost, column 0 the easternmost. An image of a scene
with a total flux is in Jy per pixel on a sky grid; one without is normalised so that all of the source's
light is 1, and refuses to be read in Jy. Sky coordinates in µas where θ_g is known, else in M = GM/c².
"""

from __future__ import annotations

import json
from dataclasses import dataclass, field
from pathlib import Path
from typing import TYPE_CHECKING, Any

import h5py
import numpy as np

from raytrace.contract import Array
from ringwright import products
from ringwright.errors import InputError

if TYPE_CHECKING:
    from astropy.units import Quantity

KIND = "image"
MAPS = {
    "crossing_radius": ("1", "radius at the crossing [GM/c^2]"),
    "redshift_factor": ("1", "observed over emitted frequency"),
    "delay": ("1", "coordinate time after a radial reference ray [GM/c^3]"),
}


@dataclass(frozen=True)
class Image:
    """A view of a scene, order by order.

    Attributes
    ----------
    name : str
    intensity : array (order, y, x)
        Light in each pixel: Jy if `in_jansky`, else the share of the source's light.
    pixel_m : float
        Side of a pixel [M].
    theta_g_uas, frequency_hz : float or None
    position_angle : float
        Of the disk's projected +z axis, east of north [rad].
    in_jansky : bool
    flux, flux_in_field : arrays (order,)
        All the light of each order, and what the field holds; in the unit of `intensity`.
    band_width : array (order,)
        Median width of the ring that each order can reach [M].
    accuracy : float or None
        Interpolation error of brightness that was asked for, relative to the brightest point of each order.
    interpolation_error : array (order,) or None
        The same as reached, estimated; None in products written before it was kept.
    maps : dict of arrays (order, y, x)
        Crossing radius, redshift factor and delay at pixel centres, where asked for.
    notes : tuple of str
        What a reader of this image should know: light outside the field, orders thinner than a pixel.
    position : (float, float) or None
        Right ascension and declination [deg].
    provenance : dict
    """

    name: str
    intensity: Array
    pixel_m: float
    theta_g_uas: float | None
    frequency_hz: float | None
    position_angle: float
    in_jansky: bool
    flux: Array
    flux_in_field: Array
    band_width: Array
    accuracy: float | None = None
    interpolation_error: Array | None = None
    maps: dict[str, Array] = field(default_factory=dict)
    notes: tuple[str, ...] = ()
    position: tuple[float, float] | None = None
    provenance: dict[str, Any] = field(default_factory=dict)

    @property
    def total(self) -> Array:
        """Light of all orders in each pixel, shape (y, x)."""
        return self.intensity.sum(axis=0)

    @property
    def beam(self) -> None:
        """A rendered image has no beam: nothing has smoothed it."""
        return

    @property
    def pixel(self) -> Quantity:
        """Side of a pixel: µas where θ_g is known, else in M (dimensionless)."""
        from astropy import units

        if self.theta_g_uas is None:
            return units.Quantity(self.pixel_m)
        return units.Quantity(self.pixel_m * self.theta_g_uas, "uas")

    @property
    def units(self) -> str:
        """Unit of the stored light."""
        return "Jy/pixel" if self.in_jansky else "1/pixel"

    @property
    def axes(self) -> tuple[Array, Array, str]:
        """Offsets of the pixel centres: (north, east, unit). East falls with the column."""
        step = self.pixel_m * (self.theta_g_uas or 1.0)
        ny, nx = self.intensity.shape[1:]
        north = (np.arange(ny) - 0.5 * (ny - 1)) * step
        east = -(np.arange(nx) - 0.5 * (nx - 1)) * step
        return north, east, "uarcsec" if self.theta_g_uas is not None else "1"

    def save(self, path: str | Path, *, replace: bool = False) -> Path:
        """Write the HDF5 product.

        Raises
        ------
        InputError
            If the path holds something that is not the image of a scene of this name and `replace` is not
            set.
        """
        target = products.check_target(path, KIND, self.name, replace=replace)
        products.write_product(target, KIND, self.name, self._fill, self.provenance)
        return target

    @staticmethod
    def open(path: str | Path) -> Image:
        """Read an image product.

        Raises
        ------
        InputError
            If the file is not a readable image product.
        """
        with products.open_product(path, KIND) as file:
            attrs = dict(file["intensity"].attrs)
            order = [str(label) for label in (d.label for d in file["intensity"].dims)]
            axes = [order.index(name) for name in ("order", "y", "x")]
            known = {
                "accuracy_asked",
                "theta_g_uas",
                "frequency_hz",
                "right_ascension_deg",
                "declination_deg",
            }
            value = {key: float(attrs[key]) for key in known & attrs.keys()}
            sky = ("right_ascension_deg", "declination_deg")
            return Image(
                name=str(file.attrs["name"]),
                intensity=file["intensity"][...].astype(np.float64).transpose(axes),
                pixel_m=float(attrs["pixel_m"]),
                theta_g_uas=value.get("theta_g_uas"),
                frequency_hz=value.get("frequency_hz"),
                position_angle=float(attrs["position_angle_rad"]),
                in_jansky=str(attrs["units"]) == "Jy/pixel",
                flux=file["flux"][...],
                flux_in_field=file["flux_in_field"][...],
                band_width=file["band_width"][...],
                accuracy=value.get("accuracy_asked"),
                interpolation_error=file["interpolation_error"][...]
                if "interpolation_error" in file
                else None,
                maps={name: file[name][...].astype(np.float64) for name in MAPS if name in file},
                notes=tuple(json.loads(str(attrs["notes"]))),
                position=(value[sky[0]], value[sky[1]]) if sky[0] in value else None,
                provenance={
                    key: file.attrs[key]
                    for key in file.attrs
                    if key not in ("product", "name", "format_version")
                },
            )

    def to_fits(self, path: str | Path, *, replace: bool = False) -> Path:
        """Write the total light as a FITS image with a celestial coordinate system.

        Raises
        ------
        InputError
            If the image is not in Jy on a sky grid, or the file exists and `replace` is not set.
        """
        from ringwright.fits import write_fits

        if not self.in_jansky or self.theta_g_uas is None:
            raise InputError(
                f"the image of '{self.name}' is normalised or in units of M, so it has no flux density on the sky; "
                "give the scene a total_flux and theta_g (or mass and distance)"
            )
        ra, dec = self.position or (0.0, 0.0)
        write_fits(
            path,
            self.total,
            self.pixel_m * self.theta_g_uas,
            self.frequency_hz,
            ra,
            dec,
            self.name,
            overwrite=replace,
        )
        return Path(path)

    def summary(self) -> dict[str, Any]:
        """What the command line prints as JSON."""
        unit = "Jy" if self.in_jansky else "share of the source's light"
        return {
            "name": self.name,
            "pixels": list(self.intensity.shape[1:]),
            "pixel": {"value": float(self.pixel.value), "unit": str(self.pixel.unit) or "M"},
            "flux_per_order": {"value": self.flux.tolist(), "unit": unit},
            "flux_per_order_in_field": {"value": self.flux_in_field.tolist(), "unit": unit},
            "accuracy_asked": self.accuracy,
            "interpolation_error": None
            if self.interpolation_error is None
            else self.interpolation_error.tolist(),
            "notes": list(self.notes),
        }

    def _fill(self, file: h5py.File) -> None:
        north, east, unit = self.axes
        products.scale(
            file, "order", np.arange(len(self.flux)), "1", "how many half turns more than the direct image"
        )
        products.scale(file, "y", north, unit, _offset("north", unit))
        products.scale(file, "x", east, unit, _offset("east", unit))
        stack = products.image_dataset(
            file, "intensity", self.intensity, self.units, "light in each pixel, per order"
        )
        total = products.image_dataset(
            file, "total", self.total, self.units, "light in each pixel, all orders"
        )
        products.attach(file, stack, ("order", "y", "x"))
        products.attach(file, total, ("y", "x"))
        for name, data in self.maps.items():
            units, long_name = MAPS[name]
            products.attach(
                file, products.image_dataset(file, name, data, units, long_name), ("order", "y", "x")
            )
        per_order = {
            "flux": (self.flux, self.units.split("/")[0], "all the light of each order"),
            "flux_in_field": (
                self.flux_in_field,
                self.units.split("/")[0],
                "light of each order within the field",
            ),
            "band_width": (self.band_width, "1", "median width of the ring of each order [GM/c^2]"),
        }
        if self.interpolation_error is not None:
            what = "estimated error of the brightness of each order over its maximum"
            per_order["interpolation_error"] = (self.interpolation_error, "1", what)
        for name, (values, units, long_name) in per_order.items():
            dataset = file.create_dataset(name, data=values)
            dataset.attrs["units"], dataset.attrs["long_name"] = units, long_name
            products.attach(file, dataset, ("order",))
        stack.attrs.update(self._geometry())

    def _geometry(self) -> dict[str, Any]:
        found: dict[str, Any] = {
            "pixel_m": self.pixel_m,
            "position_angle_rad": self.position_angle,
            "notes": json.dumps(list(self.notes)),
        }
        if self.accuracy is not None:
            found["accuracy_asked"] = self.accuracy
        if self.theta_g_uas is not None:
            found["theta_g_uas"] = self.theta_g_uas
        if self.frequency_hz is not None:
            found["frequency_hz"] = self.frequency_hz
        if self.position is not None:
            found["right_ascension_deg"], found["declination_deg"] = self.position
        return found


def _offset(direction: str, unit: str) -> str:
    return f"offset to the {direction}" + ("" if unit != "1" else " [GM/c^2]")
