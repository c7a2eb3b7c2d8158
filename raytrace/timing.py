"""How long light takes and how fast it is: coordinate time between two radii, and coordinate and local speeds.

A local observer always measures 1. In the far observer's coordinates light moves at 1 − 2/r along the radius and at √(1 − 2/r)
across it (common knowledge; the radial form stands in every account of the radar echo delay, Shapiro 1964, PRL 13, 789).
G = c = M = 1.
"""

from __future__ import annotations

from typing import Literal

import numpy as np
from numpy.typing import ArrayLike

from raytrace.bending import require_schwarzschild
from raytrace.contract import Array, Spacetime
from raytrace.registry import or_default


def light_time(
    r_from: float, r_to: float, b: float, turns: int = 0, spacetime: Spacetime | None = None
) -> np.float64:
    """Coordinate time that light of impact parameter b takes between two radii.

    Parameters
    ----------
    r_from, r_to : float
        [M], outside the horizon; which comes first does not matter.
    b : float
        Impact parameter [M].
    turns : int
        0 without and 1 with a passage through the point of closest approach.
    spacetime : Schwarzschild, optional

    Returns
    -------
    float
        [M]

    Raises
    ------
    ValueError
        If a radius is not outside the horizon, or no such ray connects them.
    """
    hole = or_default(spacetime)
    require_schwarzschild(hole, "a light time against b alone")
    near, far = sorted((float(r_from), float(r_to)))
    impact = abs(float(b))
    if not (near > hole.horizon and np.isfinite(far) and np.isfinite(impact)):
        raise ValueError(
            f"light between {r_from:g} M and {r_to:g} M at b = {b:g} M: radii must be finite and outside the horizon at "
            f"{hole.horizon:g} M"
        )
    if turns not in (0, 1):
        raise ValueError(f"turns = {turns!r}: a ray passes its point of closest approach 0 times or once")
    from raytrace.kernels.timing import travel_time

    time = travel_time(near, far, impact, turns)
    if np.isnan(time):
        how = "passing its closest approach between them" if turns else "without a turning point between them"
        raise ValueError(f"no ray of b = {b:g} M connects {r_from:g} M and {r_to:g} M {how}")
    return np.float64(time)


def light_speed(
    r: ArrayLike,
    *,
    direction: Literal["radial", "tangential"] = "radial",
    measured: Literal["coordinate", "local"] = "coordinate",
    spacetime: Spacetime | None = None,
) -> Array | np.float64:
    """Speed of light at a radius, as a far observer reckons it or as one on the spot measures it.

    Parameters
    ----------
    r : float or array_like
        [M], outside the horizon.
    direction : {"radial", "tangential"}
    measured : {"coordinate", "local"}
        dr/dt or r dφ/dt at infinity's clock, or proper length over proper time of a static observer.
    spacetime : Spacetime, optional
        Any static one; Schwarzschild unless given.

    Raises
    ------
    ValueError
        At or inside the horizon, or for a direction or measure that is not known.
    """
    hole = or_default(spacetime)
    radius = np.asarray(r, dtype=np.float64)
    if not np.all(radius > hole.horizon):
        raise ValueError(
            f"there is no static observer at {np.min(radius):g} M; radii outside the horizon at {hole.horizon:g} M "
            "are accepted"
        )
    if direction not in ("radial", "tangential") or measured not in ("coordinate", "local"):
        raise ValueError(
            f"direction {direction!r} measured {measured!r} is not known; directions are radial and tangential, "
            "measures coordinate and local"
        )
    metric = hole.metric(radius, 0.5 * np.pi)
    stretch = np.sqrt(metric.rr) if direction == "radial" else np.sqrt(metric.phi_phi) / radius
    coordinate = np.sqrt(-metric.tt) / stretch
    # On the spot lengths are stretched and clocks run slow by the same factors.
    speed = coordinate if measured == "coordinate" else coordinate * stretch / np.sqrt(-metric.tt)
    return speed if radius.ndim else np.float64(speed)
