"""Light times and deflections of single rays, from the same regular integrals as the delay.

The integrals along a path are taken in a variable in which they are smooth, by Gauss–Legendre panels; see `schwarzschild.lag`.
G = c = M = 1.
"""

import math

import numpy as np

from raytrace.kernels.compiling import kernel
from raytrace.kernels.schwarzschild import (
    POINTS,
    WEIGHTS,
    depth,
    lag,
    panels,
    shape,
    square_excess,
    tortoise,
)

# Below this 1/r of closest approach bending is weak and its own integral is used.
WEAK = 0.15


@kernel()
def _swept(u1, u2, gap):
    """∫ du/√P from infinity to the turning point, by u = u2 − gap sinh²θ."""
    last = math.asinh(math.sqrt(u2 / gap))
    count = panels(last)
    step = last / count
    total = 0.0
    for panel in range(count):
        for i in range(POINTS.shape[0]):
            s = math.sinh(step * (panel + 0.5 + 0.5 * POINTS[i]))
            total += WEIGHTS[i] * 2.0 / math.sqrt(2.0 * (u2 - gap * s * s - u1))
    return 0.5 * step * total


@kernel()
def _weak(u2):
    """2 ∫ [1/√(1 − 2 u2 h) − 1] dx over a quarter turn, u = u2 sin x, h = (1 + s + s²)/(1 + s)."""
    count = panels(0.5 * math.pi)
    step = 0.5 * math.pi / count
    total = 0.0
    for panel in range(count):
        for i in range(POINTS.shape[0]):
            s = math.sin(step * (panel + 0.5 + 0.5 * POINTS[i]))
            h = 2.0 * u2 * (1.0 + s + s * s) / (1.0 + s)
            root = math.sqrt(1.0 - h)
            total += WEIGHTS[i] * h / (root * (1.0 + root))
    return step * total


@kernel()
def deflections(b):
    """Deflection angles of impact parameters (n,); infinite for captured rays."""
    angle = np.empty_like(b)
    roots = np.empty(5)
    for i in range(b.shape[0]):
        square, excess = square_excess(b[i], 0.0)
        if excess <= 0.0 or square == 0.0:
            angle[i] = math.inf
            continue
        shape(square, excess, roots)
        if roots[1] < WEAK:
            angle[i] = _weak(roots[1])
        else:
            angle[i] = 2.0 * _swept(roots[0], roots[1], roots[2] - roots[1]) - math.pi
    return angle


@kernel()
def _inner_lag(near, far, b, roots):
    """The same integral as `lag` between two radii within the barrier of an escaping ray's b, by u = u3 + gap sinh²θ."""
    gap = roots[2] - roots[1]
    first = math.asinh(math.sqrt(max(1.0 / far - roots[2], 0.0) / gap))
    last = math.asinh(math.sqrt((1.0 / near - roots[2]) / gap))
    count = panels(last - first)
    step = (last - first) / count
    total = 0.0
    for panel in range(count):
        for i in range(POINTS.shape[0]):
            s = math.sinh(first + step * (panel + 0.5 + 0.5 * POINTS[i]))
            u = roots[2] + gap * s * s
            w2 = 2.0 * b * b * (u - roots[0]) * gap * s * s * gap * (1.0 + s * s)
            total += WEIGHTS[i] * 2.0 * b / (math.sqrt(2.0 * (u - roots[0])) * (1.0 + math.sqrt(w2)))
    return 0.5 * step * total


@kernel()
def _lag_at(r, b, escapes, roots):
    """The lag from infinity to radius r."""
    return lag(depth(1.0 / r, escapes, roots), b, escapes, roots)


@kernel()
def travel_time(near, far, b, turns):
    """Coordinate time between two radii along a ray of impact parameter b; NaN where there is no such ray."""
    climb = tortoise(1.0 / far) - tortoise(1.0 / near)
    if b == 0.0:
        return climb if turns == 0 else math.nan
    roots = np.empty(5)
    square, excess = square_excess(b, 0.0)
    escapes = shape(square, excess, roots)
    if not escapes:
        if turns == 1:
            return math.nan
        return climb + _lag_at(near, b, escapes, roots) - _lag_at(far, b, escapes, roots)
    turning = roots[1]
    if 1.0 / far >= roots[2]:
        return climb + _inner_lag(near, far, b, roots) if turns == 0 else math.nan
    if 1.0 / near > turning * (1.0 + 4e-16):
        return math.nan
    first, last = _lag_at(near, b, escapes, roots), _lag_at(far, b, escapes, roots)
    if turns == 0:
        return climb + first - last
    closest = lag(0.0, b, escapes, roots)
    return tortoise(1.0 / far) + tortoise(1.0 / near) - 2.0 * tortoise(turning) + 2.0 * closest - first - last
