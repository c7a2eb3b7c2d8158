"""`shadow_angle`: how large the shadow looks to a static observer at a finite radius.

sin²α = 27 (1 − 2/r)/r² (Synge 1966, MNRAS 131, 463); inside the photon orbit the shadow fills more than half the sky.
G = c = M = 1, angles in radians.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from raytrace.bending import require_schwarzschild
from raytrace.contract import Array, Spacetime
from raytrace.registry import or_default


def shadow_angle(r: ArrayLike, *, spacetime: Spacetime | None = None) -> Array | np.float64:
    """Angular radius of the shadow for a static observer at radius r.

    Parameters
    ----------
    r : float or array_like
        [M], outside the horizon.
    spacetime : Schwarzschild, optional

    Returns
    -------
    float or array
        [rad]; π/2 at the photon orbit, more inside it.

    Raises
    ------
    ValueError
        At or inside the horizon.
    """
    hole = or_default(spacetime)
    require_schwarzschild(hole, "the shadow from a finite radius")
    radius = np.asarray(r, dtype=np.float64)
    if not np.all(radius > hole.horizon):
        raise ValueError(
            f"there is no static observer at {np.min(radius):g} M; radii outside the horizon at {hole.horizon:g} M "
            "are accepted"
        )
    # cos²α = (1 − 3/r)² (1 + 6/r): exact near the photon orbit, where sin α alone loses half its digits.
    cosine = (1.0 - hole.photon_orbit / radius) * np.sqrt(1.0 + 6.0 / radius)
    sine = np.sqrt(27.0 * (1.0 - 2.0 / radius)) / radius
    angle = np.arctan2(sine, cosine)
    return angle if radius.ndim else np.float64(angle)
