"""Images of equatorial circles: where on the screen the circle of radius r appears, order by order; the critical curve.

At a fixed screen angle the crossing radius of a given order grows with the distance b from the screen's origin, so the
image is the root of r(b) = r, found by the bracketing method of `raytrace.roots`. G = c = M = 1; angles in radians;
nothing here depends on a particular metric.
"""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import ArrayLike, NDArray

from raytrace.contract import Array, RayStatus, Spacetime
from raytrace.registry import or_default
from raytrace.roots import bracketed_roots

# Outside this factor times the radius no image of a circle lies: the direct image of a distant circle is at
# b ≈ r + 1.
BRACKET_GROWTH = 1.25
BRACKET_OFFSET = 12.0
# An order that still appears this far from the origin [M] appears without limit: the direct one always, the others
# edge-on where the plane's far half starts.
FARTHEST_LIMIT = 1e8
# A ray this close to the origin falls in as the radial one does, which has no screen angle and edge-on lies in the plane.
NEARLY_RADIAL = 1e-12


def critical_curve(
    *, inclination: float, angle: ArrayLike, spacetime: Spacetime | None = None
) -> Array | np.float64:
    """Radius of the critical curve on the screen, the edge of the shadow of a hole lit from everywhere behind.

    Parameters
    ----------
    inclination : float
        [rad], 0 to π.
    angle : array_like, any shape
        Screen angle from +α [rad].
    spacetime : Spacetime, optional
        Schwarzschild unless given; there it is √27 at every angle.

    Returns
    -------
    array or float
        [M], of the shape of `angle`.

    Raises
    ------
    ValueError
        If the inclination is outside 0 to π.
    """
    inclination = checked_inclination(inclination)
    angles = np.asarray(angle, dtype=np.float64)
    radius = or_default(spacetime).critical_radius(inclination, angles.ravel()).reshape(angles.shape)
    return radius if angles.ndim else np.float64(radius)


def isoradial(
    radius: ArrayLike,
    *,
    order: int,
    angle: ArrayLike,
    inclination: float,
    spacetime: Spacetime | None = None,
) -> Array | np.float64:
    """Distance from the screen's origin at which the equatorial circle of a radius appears.

    Parameters
    ----------
    radius : array_like
        Radius of the circle [M], at or outside the horizon; infinite for the farthest that an order n ≥ 1 can
        appear. Broadcast against `angle`.
    order : int
        n = 0, 1, 2, …: how many half turns more than the direct image.
    angle : array_like
        Screen angle from +α [rad].
    inclination : float
        [rad], 0 to π.
    spacetime : Spacetime, optional
        Schwarzschild unless given.

    Returns
    -------
    array or float
        b [M]; NaN where this order has no image at this angle (a ray within the equatorial plane); infinite
        where there is no limit.

    Raises
    ------
    ValueError
        If a radius lies inside the horizon, the order is negative or the inclination outside 0 to π.
    """
    hole = or_default(spacetime)
    inclination = checked_inclination(inclination)
    radii, angles = np.broadcast_arrays(
        np.asarray(radius, dtype=np.float64), np.asarray(angle, dtype=np.float64)
    )
    if order < 0 or int(order) != order:
        raise ValueError(f"the order {order!r} is not a whole number from 0 upward")
    if not np.all(radii >= hole.horizon):
        raise ValueError(
            f"a circle of radius {np.min(radii):g} M lies inside the horizon at {hole.horizon:g} M "
            "and has no image; give radii at or outside the horizon"
        )
    images = _solve(hole, radii.ravel(), angles.ravel(), inclination, int(order)).reshape(radii.shape)
    return images if radii.ndim else np.float64(images)


def checked_inclination(inclination: float) -> float:
    """Return the inclination as a float, or refuse what is not an angle from 0 to π."""
    value = float(inclination)
    if not 0.0 <= value <= math.pi:
        raise ValueError(
            f"the inclination {value:g} rad is outside 0 to π; 0 looks down the +z axis, π/2 along the plane"
        )
    return value


def _solve(hole: Spacetime, radii: Array, angles: Array, inclination: float, order: int) -> Array:
    unlimited = np.isinf(radii)
    target = 1.0 / radii

    def mismatch(b: Array, index: NDArray[np.int64]) -> Array:
        hit = hole.trace_rays(
            b * np.cos(angles[index]), b * np.sin(angles[index]), inclination, order + 1, False, False, False
        )
        value = _monotone(hit.radius[order], hit.status[order], hole.horizon) - target[index]
        # Where an order ends toward infinity 1/r only touches 0; what lies beyond must have the other sign.
        value[unlimited[index] & (hit.status[order] == RayStatus.ESCAPED)] = -1.0
        return value

    far = np.where(unlimited, FARTHEST_LIMIT, BRACKET_GROWTH * radii + BRACKET_OFFSET)
    found = bracketed_roots(mismatch, np.full_like(radii, NEARLY_RADIAL), far)
    return np.where(unlimited & np.isnan(found), np.inf, found)


def _monotone(radius: Array, status: NDArray[np.int8], horizon: float) -> Array:
    """1/r at the crossing, continued beyond both ends of where a crossing exists so that a root stays
    bracketed.
    """
    value = np.zeros_like(radius)
    crossed = status == RayStatus.CROSSED
    value[crossed] = 1.0 / radius[crossed]
    value[status == RayStatus.CAPTURED] = 2.0 / horizon
    value[status == RayStatus.IN_PLANE] = np.nan
    return value
