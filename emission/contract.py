"""The contract of what shines: what every emitter, radial profile and motion of the gas offers.

An emitter turns crossings of the equatorial plane into specific intensities at the observer, who sits at
rest at infinity. Geometrised units G = c = M = 1; brightness is relative, since the scene sets the total
flux; arrays are float64.
"""

from __future__ import annotations

from typing import NamedTuple, Protocol, runtime_checkable

import numpy as np
from numpy.typing import ArrayLike, NDArray

from raytrace.contract import Hit, Spacetime

Array = NDArray[np.float64]


class FourVelocity(NamedTuple):
    """Contravariant components u^t, u^r, u^φ in the equatorial plane; u^θ = 0."""

    t: Array
    r: Array
    phi: Array


@runtime_checkable
class Profile(Protocol):
    """Brightness of a disk in the frame of its gas as a function of radius."""

    @property
    def edges(self) -> tuple[float, ...]:
        """Ascending radii [M]: first and last bound the support, those between are where a slope jumps."""
        ...

    @property
    def bolometric(self) -> bool:
        """True where the brightness is summed over all frequencies."""
        ...

    def brightness(self, radius: ArrayLike, *, spacetime: Spacetime | None = None) -> Array:
        """Relative brightness at radii [M]: finite, never negative, 0 outside the support."""
        ...


@runtime_checkable
class Flow(Protocol):
    """Motion of the gas within the equatorial plane."""

    def kinks(self, spacetime: Spacetime | None = None) -> tuple[float, ...]:
        """Radii [M] where the motion is continuous but not smooth."""
        ...

    def four_velocity(self, radius: ArrayLike, *, spacetime: Spacetime | None = None) -> FourVelocity:
        """u^t, u^r, u^φ at radii [M] outside the horizon: future-directed, u·u = −1."""
        ...


@runtime_checkable
class Emitter(Protocol):
    """Anything that shines.

    `edges` are ascending radii [M] in the equatorial plane; the first and the last bound the support, those
    between are where the brightness or its slope jumps; empty for light that does not come from the plane.
    `opaque` says that an emitter hides its own higher orders. `scale_free` says that the image in units of M
    does not depend on mass, distance, flux or frequency except through its normalisation.
    """

    @property
    def edges(self) -> tuple[float, ...]: ...

    @property
    def bolometric(self) -> bool: ...

    @property
    def opaque(self) -> bool: ...

    @property
    def scale_free(self) -> bool: ...

    def intensity(
        self, hit: Hit, *, spacetime: Spacetime, frequency: float | None, time: float | None
    ) -> Array:
        """Intensity at the observer, shape (stokes = 1, orders, n): finite, never negative, 0 where no
        light."""
        ...


def checked_radii(spacetime: Spacetime, radius: ArrayLike) -> Array:
    """Radii as float64, refused where gas at such a radius could not be described.

    Raises
    ------
    ValueError
        If a radius is not a number outside the horizon.
    """
    radii = np.asarray(radius, dtype=np.float64)
    if radii.size and not np.min(radii) > spacetime.horizon:
        raise ValueError(
            f"gas at radius {np.min(radii):g} M has no four-velocity here; give radii outside the horizon "
            f"at {spacetime.horizon:g} M"
        )
    return radii
