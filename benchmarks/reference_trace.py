"""The reference that light paths are timed against: the same closed form in plain NumPy and `scipy.special`.

Schwarzschild crossing radii from Jacobi's elliptic functions (Darwin 1959), one array operation after the other.
G = c = M = 1; good to about 1e-9 away from the critical curve, which is all that a yardstick needs.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy.special import ellipj, ellipk, ellipkinc

Array = NDArray[np.float64]
HORIZON = 2.0
CRITICAL_SQUARE = 27.0


def swept_angle(alpha: Array, beta: Array, inclination: float) -> Array:
    """Angle swept from the observer to the first crossing of the plane, in (0, π]."""
    b = np.hypot(alpha, beta)
    side = 1.0 if np.cos(inclination) >= 0.0 else -1.0
    return np.arctan2(side * b * np.cos(inclination), -side * beta * np.sin(inclination))


def crossing_radius(alpha: Array, beta: Array, inclination: float, orders: int) -> Array:
    """Crossing radii (orders, n) [M]; NaN where there is no crossing outside the horizon."""
    psi = swept_angle(alpha, beta, inclination) + np.pi * np.arange(orders)[:, None]
    square = alpha**2 + beta**2
    u = np.full(psi.shape, np.nan)
    wide = square > CRITICAL_SQUARE
    u[:, wide] = _scattered(square[wide], psi[:, wide])
    u[:, ~wide] = _falling(square[~wide], psi[:, ~wide])
    with np.errstate(divide="ignore", invalid="ignore"):
        return np.where((u > 0.0) & (u < 1.0 / HORIZON), 1.0 / u, np.nan)


def _scattered(square: Array, psi: Array) -> Array:
    t = np.arccos(1.0 - 54.0 / square) / 3.0
    u1, u2, u3 = (
        1.0 / 6.0 + np.cos(t + shift) / 3.0 for shift in (2.0 * np.pi / 3.0, -2.0 * np.pi / 3.0, 0.0)
    )
    m, g = (u2 - u1) / (u3 - u1), np.sqrt(0.5 * (u3 - u1))
    start = ellipkinc(np.arcsin(np.sqrt(-u1 / (u2 - u1))), m)
    phase = g * psi + start
    sn = ellipj(phase, m)[0]
    return np.where(phase < 2.0 * ellipk(m) - start, u1 + (u2 - u1) * sn**2, np.nan)


def _falling(square: Array, psi: Array) -> Array:
    square = np.maximum(square, 1e-300)
    u1 = 1.0 / 6.0 - np.cosh(np.arccosh(54.0 / square - 1.0) / 3.0) / 3.0
    a = np.sqrt(3.0 * u1**2 - u1)
    m, g = 0.5 + 0.5 * (0.25 - 1.5 * u1) / a, np.sqrt(2.0 * a)
    start = ellipkinc(2.0 * np.arctan(np.sqrt(-u1 / a)), m)
    end = ellipkinc(2.0 * np.arctan(np.sqrt((0.5 - u1) / a)), m)
    phase = g * psi + start
    cn = ellipj(phase, m)[1]
    return np.where(phase < end, u1 + a * (1.0 - cn) / (1.0 + cn), np.nan)
