"""A band of light as tables against screen angle: where its edges lie, and what it holds up to a distance.

F(b, φ) = ∫₀ᵇ I b' db' is known as Chebyshev coefficients across each panel at equally spaced angles, and cubic in between;
opaque crossings in front take out what lies behind them. Rows repeat one angle before the first and two after the last.
Lengths in M, angles in radians, light per radian in any unit times M².
"""

import math

from raytrace.kernels.compiling import kernel

TURN = 2.0 * math.pi
# Angles that a row repeats beyond one turn, so that four neighbours are always there.
PADDING = 3


@kernel()
def angle_weights(phi, count, weights):
    """Cubic Lagrange weights at an angle; returns the index of the first of four points in a padded row."""
    place = phi / TURN
    place = (place - math.floor(place)) * count
    base = min(int(place), count - 1)
    f = place - base
    weights[0] = -f * (f - 1.0) * (f - 2.0) / 6.0
    weights[1] = (f + 1.0) * (f - 1.0) * (f - 2.0) / 2.0
    weights[2] = -(f + 1.0) * f * (f - 2.0) / 2.0
    weights[3] = (f + 1.0) * f * (f - 1.0) / 6.0
    return base


@kernel()
def at_angle(row, first, weights):
    """Interpolate one padded row of a table."""
    return (
        weights[0] * row[first]
        + weights[1] * row[first + 1]
        + weights[2] * row[first + 2]
        + weights[3] * row[first + 3]
    )


@kernel()
def within_panel(coefficients, terms, first, weights, x):
    """Light between a panel's inner edge and x in (−1, 1): Clenshaw's recurrence on angle-interpolated Chebyshev
    coefficients.
    """
    above = 0.0
    here = 0.0
    for m in range(terms - 1, 0, -1):
        c = (
            weights[0] * coefficients[first, m]
            + weights[1] * coefficients[first + 1, m]
            + weights[2] * coefficients[first + 2, m]
            + weights[3] * coefficients[first + 3, m]
        )
        here, above = c + 2.0 * x * here - above, here
    c = (
        weights[0] * coefficients[first, 0]
        + weights[1] * coefficients[first + 1, 0]
        + weights[2] * coefficients[first + 2, 0]
        + weights[3] * coefficients[first + 3, 0]
    )
    return c + x * here - above


@kernel()
def up_to(b, beyond, edges, held, coefficients, terms, first, weights):
    """F(b) at an angle, nothing hidden, for a distance beyond so many panel edges."""
    if beyond == 0:
        return 0.0
    k = beyond - 1
    inside = at_angle(held[k], first, weights)
    if beyond == edges.shape[0]:
        return inside
    low = at_angle(edges[k], first, weights)
    high = at_angle(edges[beyond], first, weights)
    x = (2.0 * b - low - high) / (high - low)
    return inside + within_panel(coefficients[k], terms[k], first, weights, x)


@kernel()
def edges_below(b, guess, edges, first, weights):
    """Beyond how many panel edges a distance lies at an angle, searched from a guess."""
    beyond = guess
    while beyond > 0 and b <= at_angle(edges[beyond - 1], first, weights):
        beyond -= 1
    while beyond < edges.shape[0] and b > at_angle(edges[beyond], first, weights):
        beyond += 1
    return beyond


@kernel()
def seen_up_to(b, beyond, edges, held, coefficients, terms, fronts, first, weights):
    """F(b) at an angle without what lies behind opaque crossings, whose extents may overlap."""
    if fronts.shape[0] == 0:
        return up_to(b, beyond, edges, held, coefficients, terms, first, weights)
    total = 0.0
    t = at_angle(edges[0], first, weights)
    while t < b:
        covered = True
        while covered:
            covered = False
            for i in range(fronts.shape[0]):
                outer = at_angle(fronts[i, 1], first, weights)
                if at_angle(fronts[i, 0], first, weights) <= t < outer:
                    t = outer
                    covered = True
        if t >= b:
            break
        end = b
        for i in range(fronts.shape[0]):
            inner = at_angle(fronts[i, 0], first, weights)
            if t < inner < end:
                end = inner
        for side in range(2):
            at = end if side == 1 else t
            sign = 1.0 if side == 1 else -1.0
            below = edges_below(at, beyond, edges, first, weights)
            total += sign * up_to(at, below, edges, held, coefficients, terms, first, weights)
        t = end
    return total


@kernel()
def position(phi, b, guess, turn, edges, fronts, weights):
    """Where a point lies: beyond how many panel edges, searched from a guess, and beyond which edges of what is in
    front, as one number; and how many panels out from the band's inner edge, as a fraction.
    """
    first = angle_weights(phi - turn, edges.shape[1] - PADDING, weights)
    code = edges_below(b, guess, edges, first, weights)
    place = float(code)
    if 0 < code < edges.shape[0]:
        low = at_angle(edges[code - 1], first, weights)
        high = at_angle(edges[code], first, weights)
        place += (b - low) / (high - low) - 1.0
    for i in range(fronts.shape[0]):
        for side in range(2):
            code = 2 * code + (1 if b > at_angle(fronts[i, side], first, weights) else 0)
    return code, place


@kernel()
def is_dark(code, panels, fronts):
    """Whether nothing is seen at a position: inside or outside the band, or behind something opaque."""
    for _ in range(fronts):
        if code % 4 == 2:
            return True
        code //= 4
    return code == 0 or code > panels


@kernel()
def cut_by_fronts(phi, edges, fronts, weights):
    """Whether an edge of something in front lies within the band at a screen angle."""
    first = angle_weights(phi, edges.shape[1] - PADDING, weights)
    low = at_angle(edges[0], first, weights)
    high = at_angle(edges[edges.shape[0] - 1], first, weights)
    for i in range(fronts.shape[0]):
        for side in range(2):
            if low < at_angle(fronts[i, side], first, weights) < high:
                return True
    return False
