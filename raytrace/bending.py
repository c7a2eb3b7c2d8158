"""`deflection`: by how much a ray that passes the hole is turned, all the way from and to infinity.

Weak bending comes from a regularised integral without cancellation, strong bending from the swept angle (Darwin 1959).
G = c = M = 1, angles in radians.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from raytrace.contract import FARTHEST, Array, Spacetime
from raytrace.registry import or_default
from raytrace.schwarzschild import Schwarzschild


def deflection(b: ArrayLike, *, spacetime: Spacetime | None = None) -> Array | np.float64:
    """Deflection angle of a ray against its impact parameter.

    Parameters
    ----------
    b : float or array_like
        Impact parameter [M]; its sign does not matter.
    spacetime : Schwarzschild, optional

    Returns
    -------
    float or array
        [rad]; infinite for rays that are captured. Never below 4/b.

    Raises
    ------
    ValueError
        If an impact parameter is not finite or beyond 1e150 M, or the spacetime is another one.
    """
    require_schwarzschild(or_default(spacetime), "a deflection against b alone")
    parameters = np.asarray(b, dtype=np.float64)
    if not np.max(np.abs(parameters), initial=0.0) <= FARTHEST:
        raise ValueError(
            f"an impact parameter is not finite or lies beyond {FARTHEST:g} M; give finite values of b [M]"
        )
    from raytrace.kernels.timing import deflections

    angle = deflections(np.abs(parameters).ravel()).reshape(parameters.shape)
    return angle if parameters.ndim else np.float64(angle)


def require_schwarzschild(spacetime: Spacetime, what: str) -> None:
    """Refuse what is known in closed form for the Schwarzschild metric only."""
    if not isinstance(spacetime, Schwarzschild):
        raise ValueError(f"{what} is known here for Schwarzschild only, not for '{spacetime.name}'")
