"""`trace`: screen positions in, crossings of the equatorial plane out, in whatever spacetime.

The observer is at infinity in the direction (sin i, 0, cos i); β points along the projected +z axis and α to the right of it.
Order n counts the half turns more than the direct image. G = c = M = 1, angles in radians.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from raytrace.contract import FARTHEST, Hit, Spacetime
from raytrace.isoradials import checked_inclination
from raytrace.registry import or_default


def trace(
    alpha: ArrayLike,
    beta: ArrayLike,
    *,
    inclination: float,
    orders: int = 3,
    spacetime: Spacetime | None = None,
    azimuth: bool = True,
    delay: bool = True,
    momentum: bool = True,
) -> Hit:
    """Follow rays backward from the screen to their crossings of the equatorial plane.

    Parameters
    ----------
    alpha, beta : float or array_like (n,)
        Screen position [M].
    inclination : float
        [rad], 0 to π.
    orders : int
        How many crossings, from n = 0.
    spacetime : Spacetime, optional
        Schwarzschild unless given.
    azimuth, delay, momentum : bool
        Whether to compute these; those left out are None.

    Returns
    -------
    Hit
        Arrays (orders, n), or (orders,) for scalars; momentum with a leading axis of 3.

    Raises
    ------
    ValueError
        If positions are not finite one-dimensional arrays of one length, lie beyond 1e150 M, or orders or inclination make no sense.
    """
    hole = or_default(spacetime)
    scalar = np.ndim(alpha) == 0 and np.ndim(beta) == 0
    x, y = (np.atleast_1d(np.asarray(axis, dtype=np.float64)) for axis in (alpha, beta))
    if x.ndim != 1 or x.shape != y.shape:
        raise ValueError(
            f"alpha and beta have the shapes {np.shape(alpha)} and {np.shape(beta)}; give two numbers or two "
            "one-dimensional arrays of one length"
        )
    if not all(np.max(np.abs(axis), initial=0.0) <= FARTHEST for axis in (x, y)):
        raise ValueError(
            f"a screen position is not finite or lies beyond {FARTHEST:g} M; every ray needs a finite alpha and beta [M]"
        )
    count = _checked_count(orders)
    hit = hole.trace_rays(x, y, checked_inclination(inclination), count, azimuth, delay, momentum)
    return _first_ray(hit) if scalar else hit


def _checked_count(orders: int) -> int:
    """The number of orders as an int, or a ValueError."""
    try:
        count = 0 if isinstance(orders, bool) or int(orders) != orders else int(orders)
    except (TypeError, ValueError, OverflowError):  # not a number, or not a finite one
        count = 0
    if count < 1:
        raise ValueError(
            f"orders = {orders!r} is a count of crossings and must be a whole number from 1 upward"
        )
    return count


def _first_ray(hit: Hit) -> Hit:
    """The same crossings without the axis of rays."""
    return Hit(
        radius=hit.radius[..., 0],
        azimuth=None if hit.azimuth is None else hit.azimuth[..., 0],
        delay=None if hit.delay is None else hit.delay[..., 0],
        momentum=None if hit.momentum is None else hit.momentum[..., 0],
        status=hit.status[..., 0],
        fate=hit.fate[0],
        inclination=hit.inclination,
    )
