"""Kernels for cubic B-splines on a plane: value, derivatives along a line, and a maximum along a line.

Unser 1999 (IEEE Signal Processing Magazine 16, 22), on coefficients that ring/smoothing.py makes. Lengths are
in samples of the coefficient grid; a line steps (drow, dcol).
"""

from __future__ import annotations

import math
from typing import Any

from raytrace.kernels.compiling import kernel

NEWTON_STEPS = 12
NEWTON_TOLERANCE = 1e-11  # [samples]; far below any reading, so that machines agree


@kernel()
def value(coef: Any, row: float, col: float) -> float:
    """The spline at one point; nothing shines outside the grid."""
    i = math.floor(row)
    j = math.floor(col)
    if i < 1 or j < 1 or i > coef.shape[0] - 3 or j > coef.shape[1] - 3:
        return 0.0
    u = row - i
    v = col - j
    a0 = (1.0 - u) ** 3
    a1 = (3.0 * u - 6.0) * u * u + 4.0
    a3 = u * u * u
    a2 = 6.0 - a0 - a1 - a3
    b0 = (1.0 - v) ** 3
    b1 = (3.0 * v - 6.0) * v * v + 4.0
    b3 = v * v * v
    b2 = 6.0 - b0 - b1 - b3
    j0 = j - 1
    s0 = b0 * coef[i - 1, j0] + b1 * coef[i - 1, j] + b2 * coef[i - 1, j + 1] + b3 * coef[i - 1, j + 2]
    s1 = b0 * coef[i, j0] + b1 * coef[i, j] + b2 * coef[i, j + 1] + b3 * coef[i, j + 2]
    s2 = b0 * coef[i + 1, j0] + b1 * coef[i + 1, j] + b2 * coef[i + 1, j + 1] + b3 * coef[i + 1, j + 2]
    s3 = b0 * coef[i + 2, j0] + b1 * coef[i + 2, j] + b2 * coef[i + 2, j + 1] + b3 * coef[i + 2, j + 2]
    return (a0 * s0 + a1 * s1 + a2 * s2 + a3 * s3) / 36.0


@kernel()
def bend(coef: Any, row: float, col: float, drow: float, dcol: float) -> tuple[float, float]:
    """First and second derivative of the spline along the direction (drow, dcol)."""
    i = math.floor(row)
    j = math.floor(col)
    if i < 1 or j < 1 or i > coef.shape[0] - 3 or j > coef.shape[1] - 3:
        return 0.0, 0.0
    u = row - i
    v = col - j
    a = ((1.0 - u) ** 3, (3.0 * u - 6.0) * u * u + 4.0, (3.0 - 3.0 * u) * u * u + 3.0 * u + 1.0, u**3)
    b = ((1.0 - v) ** 3, (3.0 * v - 6.0) * v * v + 4.0, (3.0 - 3.0 * v) * v * v + 3.0 * v + 1.0, v**3)
    a1 = (-3.0 * (1.0 - u) ** 2, (9.0 * u - 12.0) * u, (6.0 - 9.0 * u) * u + 3.0, 3.0 * u * u)
    b1 = (-3.0 * (1.0 - v) ** 2, (9.0 * v - 12.0) * v, (6.0 - 9.0 * v) * v + 3.0, 3.0 * v * v)
    a2 = (6.0 - 6.0 * u, 18.0 * u - 12.0, 6.0 - 18.0 * u, 6.0 * u)
    b2 = (6.0 - 6.0 * v, 18.0 * v - 12.0, 6.0 - 18.0 * v, 6.0 * v)
    first = 0.0
    second = 0.0
    for m in range(4):
        flat = 0.0
        slope = 0.0
        curve = 0.0
        for n in range(4):
            c = coef[i - 1 + m, j - 1 + n]
            flat += b[n] * c
            slope += b1[n] * c
            curve += b2[n] * c
        first += drow * a1[m] * flat + dcol * a[m] * slope
        second += drow * drow * a2[m] * flat + 2.0 * drow * dcol * a1[m] * slope + dcol * dcol * a[m] * curve
    return first / 36.0, second / 36.0


@kernel()
def climb(
    coef: Any, row: float, col: float, drow: float, dcol: float, low: float, high: float, r: float
) -> float:
    """Radius of the maximum between `low` and `high`: Newton's method inside a shrinking bracket."""
    for _ in range(NEWTON_STEPS):
        first, second = bend(coef, row + r * drow, col + r * dcol, drow, dcol)
        if first > 0.0:
            low = r
        else:
            high = r
        step = -first / second if second < 0.0 else math.inf
        if abs(step) < NEWTON_TOLERANCE:
            return r + step
        if not (low < r + step < high):
            step = 0.5 * (low + high) - r
        r += step
    return r
