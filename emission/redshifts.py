"""Redshift factor g = ν_observed/ν_emitted of light from moving gas, for an observer at rest at infinity.

With the photon's momentum p per unit energy (p_t = −1) and the gas's four-velocity u,
1/g = −p·u = u^t − p_r u^r − p_φ u^φ (Cunningham 1975, ApJ 202, 788). Pure numbers; radii in M = 1.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from emission.contract import Array, Flow
from raytrace.contract import Hit, RayStatus, Spacetime
from raytrace.registry import or_default


def redshift(flow: Flow, hit: Hit, spacetime: Spacetime | None = None) -> Array:
    """Redshift factor at every crossing.

    Parameters
    ----------
    flow : Flow
        Motion of the gas.
    hit : Hit
        Crossings traced with their momentum.
    spacetime : Spacetime, optional
        Schwarzschild unless given; the one the rays were traced in.

    Returns
    -------
    array (orders, n)
        g > 0, 0 for light from the horizon itself, NaN where `hit.status` is not CROSSED.

    Raises
    ------
    ValueError
        If the rays were traced without their momentum.
    """
    hole = or_default(spacetime)
    crossed = hit.status == RayStatus.CROSSED
    factor = np.where(crossed, 0.0, np.nan)
    outside = crossed & (hit.radius > hole.horizon)
    factor[outside] = redshift_factor(flow, hit.radius[outside], momentum_at(outside, hit), hole)
    return factor


def momentum_at(chosen: NDArray[np.bool_], hit: Hit) -> Array:
    """Momentum (3, n) at the chosen crossings, in their order.

    Raises
    ------
    ValueError
        If the rays were traced without their momentum.
    """
    if hit.momentum is None:
        raise ValueError(
            "the redshift of moving gas needs the momentum of the light; trace the rays with momentum=True"
        )
    # One component at a time: NumPy selects from two axes at once much faster than from three.
    return np.stack([component[chosen] for component in hit.momentum])


def redshift_factor(flow: Flow, radius: Array, momentum: Array, hole: Spacetime) -> Array:
    """Redshift factor at radii (n,) outside the horizon for light of momentum (3, n)."""
    gas = flow.four_velocity(radius, spacetime=hole)
    return 1.0 / (gas.t - momentum[0] * gas.r - momentum[2] * gas.phi)
