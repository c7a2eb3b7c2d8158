"""Crossing radii alone, many rays at a time: the closed form of `schwarzschild.py` without branches, for the compiler to vectorise.

Rays that escape and rays that are captured each have their straight-line code, with polynomial sine, cosine and arc tangent
(coefficients of Moshier's Cephes library, error 1e-16 on their ranges); those few that graze the critical curve or run almost
radially are left to the per-ray code. G = c = M = 1.
"""

import math

import numpy as np

from raytrace.kernels.compiling import kernel
from raytrace.kernels.schwarzschild import CAPTURED, CRITICAL_SQUARE, CROSSED, ESCAPED

# The fate of a ray that the straight-line code cannot take.
LEFT = -1
# Rays whose b² differs from 27 by less than this share of it need more rungs than the six of the straight-line code, and b² − 27
# with the digits that rounding of the squares takes.
GRAZING = 4e-4
# Below this b² the first guess of `_cubic_captured` is too poor for its iterations; one captured ray in a hundred on an even screen.
ALMOST_RADIAL = 0.27
QUARTER_TURN = 1.5707963267948966
QUARTER_TURN_REST = 6.123233995736766e-17
HALF_ROOT_3 = 0.8660254037844386
ROOT_3 = 1.7320508075688772
HORIZON = 2.0
# Rays that a thread takes at a time: their arrays stay in the second-level cache.
TILE = 4096


@kernel(inline=True)
def _sine_cosine(x):
    """Sine and cosine of an angle between 0 and π."""
    q = math.floor(x * (1.0 / QUARTER_TURN) + 0.5)
    y = (x - q * QUARTER_TURN) - q * QUARTER_TURN_REST
    z = y * y
    s = 1.58962301576546568060e-10 * z - 2.50507477628578072866e-8
    s = (s * z + 2.75573136213857245213e-6) * z - 1.98412698295895385996e-4
    s = (s * z + 8.33333333332211858878e-3) * z - 1.66666666666666307295e-1
    s = y + y * z * s
    c = -1.13585365213876817300e-11 * z + 2.08757008419747316778e-9
    c = (c * z - 2.75573141792967388112e-7) * z + 2.48015872888517045348e-5
    c = (c * z - 1.38888888888730564116e-3) * z + 4.16666666666665929218e-2
    c = 1.0 - 0.5 * z + z * z * c
    sine = c if q == 1.0 else s
    cosine = -s if q == 1.0 else c
    sign = -1.0 if q == 2.0 else 1.0
    return sine * sign, cosine * sign


@kernel(inline=True)
def _arc_tangent(t):
    """Arc tangent of a number between 0 and 1."""
    large = t > 0.66
    x = (t - 1.0) / (t + 1.0)
    x = x if large else t
    z = x * x
    p = -8.750608600031904122785e-1 * z - 1.615753718733365076637e1
    p = ((p * z - 7.500855792314704667340e1) * z - 1.228866684490136173410e2) * z - 6.485021904942025371773e1
    q = (z + 2.485846490142306297962e1) * z + 1.650270098316988542046e2
    q = ((q * z + 4.328810604912902668951e2) * z + 4.853903996359136964868e2) * z + 1.945506571482613964425e2
    return x + x * z * p / q + (0.5 * QUARTER_TURN if large else 0.0)


@kernel(inline=True)
def _rung(a, c, dn, above, lower):
    """One step up Bulirsch's ladder: the new (a, c, dn)."""
    a = a * c
    c = c * dn
    return c / above, c, (lower + a) / (above + a)


@kernel(inline=True)
def _first_angle(alpha, beta, b, cosine, sine):
    """Angle swept to the first crossing, in (0, π]."""
    side = 1.0 if cosine >= 0.0 else -1.0
    y, x = side * b * cosine, -side * beta * sine
    wide = abs(x)
    psi = _arc_tangent(min(wide, y) / max(wide, y))
    psi = QUARTER_TURN - psi if y > wide else psi
    return 2.0 * QUARTER_TURN - psi if x < 0.0 else psi


@kernel(inline=True)
def _jacobi(angle, a1, l1, a2, l2, a3, l3, a4, l4, a5, l5, l0, mean):
    """cn/sn and dn at the argument angle/mean for an angle between 0 and π, six rungs up Bulirsch's ladder."""
    sine, cosine = _sine_cosine(angle)
    a, dn = cosine / sine, 1.0
    c = mean * a
    a, c, dn = _rung(a, c, dn, a5, l5)
    a, c, dn = _rung(a, c, dn, a4, l4)
    a, c, dn = _rung(a, c, dn, a3, l3)
    a, c, dn = _rung(a, c, dn, a2, l2)
    a, c, dn = _rung(a, c, dn, a1, l1)
    a, c, dn = _rung(a, c, dn, 1.0, l0)
    return c, dn


@kernel(inline=True)
def _elliptic(argument, l0):
    """cn/sn and dn of an argument for the complementary modulus l0, and whether the argument lies below 2K."""
    a1, l1 = 0.5 * (1.0 + l0), math.sqrt(l0)
    a2, l2 = 0.5 * (a1 + l1), math.sqrt(a1 * l1)
    a3, l3 = 0.5 * (a2 + l2), math.sqrt(a2 * l2)
    a4, l4 = 0.5 * (a3 + l3), math.sqrt(a3 * l3)
    a5, l5 = 0.5 * (a4 + l4), math.sqrt(a4 * l4)
    mean = 0.5 * (a5 + l5)
    angle = argument * mean
    inside = angle < math.pi
    c, dn = _jacobi(angle if inside else 1.0, a1, l1, a2, l2, a3, l3, a4, l4, a5, l5, l0, mean)
    return c, dn, inside


@kernel(inline=True)
def _cubic_escaping(square):
    """The lowest root u1, half the span u3 − u1, and the complementary modulus of a ray that escapes."""
    excess = (square - CRITICAL_SQUARE) * (1.0 / CRITICAL_SQUARE)
    root = math.sqrt(excess)
    third = (1.0 / 3.0) * _arc_tangent(min(root, 1.0 / root))
    s, c = _sine_cosine(third if root > 1.0 else QUARTER_TURN / 3.0 - third)
    cosine, sine = 1.0 - 2.0 * s * s, 2.0 * s * c
    u1 = -(2.0 / 3.0) * (HALF_ROOT_3 * c - 0.5 * s) * s
    span = HALF_ROOT_3 * cosine + 0.5 * sine
    return u1, 0.5 * span / ROOT_3, math.sqrt((HALF_ROOT_3 * cosine - 0.5 * sine) / span)


@kernel(inline=True)
def _cubic_captured(square):
    """The real root u1, the modulus A = |u1 − p − iq|, and the complementary modulus of a ray that is captured.

    sinh t of a third of the angle solves 4 s³ + 3 s = sinh 3t: Halley's iteration from S/3 or about the cube root of S/4.
    """
    triple = 2.0 * math.sqrt((CRITICAL_SQUARE - square) * CRITICAL_SQUARE) / square
    fourth = math.sqrt(math.sqrt(0.25 * triple))
    s = min(triple * (1.0 / 3.0), fourth * math.sqrt(math.sqrt(fourth)))
    for _ in range(3):
        value, slope = (4.0 * s * s + 3.0) * s - triple, 12.0 * s * s + 3.0
        s -= value * slope / (slope * slope - 12.0 * s * value)
    cosh = math.sqrt(1.0 + s * s)
    modulus = math.sqrt((4.0 * cosh * cosh - 1.0) * (1.0 / 12.0))
    return (0.5 - cosh) * (1.0 / 3.0), modulus, s / math.sqrt(24.0 * modulus * (modulus + 0.5 * cosh))


@kernel()
def _escaping(alpha, beta, cosine, sine, turns, radius):
    """Radii of the crossings `turns` after the first, of rays that escape; NaN where there is none."""
    for i in range(alpha.shape[0]):
        square = alpha[i] * alpha[i] + beta[i] * beta[i]
        b = math.sqrt(square)
        psi = _first_angle(alpha[i], beta[i], b, cosine, sine) + turns
        u1, g2, l0 = _cubic_escaping(square)
        g = math.sqrt(g2)
        c, dn, inside = _elliptic(g * psi, l0)
        s2 = 1.0 / (c * c + 1.0)
        low = g2 + 0.5 * u1 * s2
        r = 2.0 * low * low * square / (s2 * (2.0 * g2 * g * c * dn * b + 0.5 * s2))
        radius[i] = r if inside else np.nan


@kernel()
def _captured(alpha, beta, cosine, sine, turns, radius):
    """The same of rays that are captured."""
    for i in range(alpha.shape[0]):
        square = alpha[i] * alpha[i] + beta[i] * beta[i]
        b = math.sqrt(square)
        psi = _first_angle(alpha[i], beta[i], b, cosine, sine) + turns
        u1, modulus, l0 = _cubic_captured(square)
        c, dn, inside = _elliptic(math.sqrt(2.0 * modulus) * psi, l0)
        h = math.sqrt(c * c + 1.0)
        q = h + c if c > 0.0 else 1.0 / (h - c)
        y = 0.5 * (u1 + modulus * q * q)
        slope = modulus * math.sqrt(0.5 * modulus) * q * (q * q + 1.0) * dn
        r = 2.0 * y * y * square / (slope * b + 0.5)
        radius[i] = r if inside and y > 0.0 else np.nan


@kernel()
def _select(alpha, beta, above, below, x, y, place):
    """Copy the rays with b² between two bounds, and their places, to the front of x, y and place; returns how many."""
    n = 0
    for i in range(alpha.shape[0]):
        square = alpha[i] * alpha[i] + beta[i] * beta[i]
        x[n], y[n], place[n] = alpha[i], beta[i], i
        n += above < square < below
    return n


@kernel()
def _mark(place, kind, status, fate):
    """Give rays the fate and, until a crossing is found, the status of their kind."""
    for i in place:
        fate[i] = kind
    for order in range(status.shape[0]):
        row = status[order]
        for i in place:
            row[i] = kind


@kernel()
def _keep_crossed(x, y, place, found, radius, status):
    """Write the crossings found and move their rays to the front, for the next order; returns how many."""
    kept = 0
    for j in range(found.shape[0]):
        i = place[j]
        crossed = found[j] > HORIZON
        radius[i] = found[j] if crossed else radius[i]
        status[i] = CROSSED if crossed else status[i]
        x[kept], y[kept], place[kept] = x[j], y[j], i
        kept += crossed
    return kept


@kernel()
def _trace_tile(alpha, beta, cosine, sine, radius, status, fate):
    """`crossing_radii` for the rays that one thread takes."""
    count = alpha.shape[0]
    # One place more than rays: `_select` writes before it decides.
    x, y, found = np.empty(count + 1), np.empty(count + 1), np.empty(count + 1)
    place = np.empty(count + 1, np.int64)
    fate[:] = LEFT
    n = _select(alpha, beta, CRITICAL_SQUARE * (1.0 + GRAZING), np.inf, x, y, place)
    _mark(place[:n], ESCAPED, status, fate)
    for order in range(radius.shape[0]):
        _escaping(x[:n], y[:n], cosine, sine, order * math.pi, found[:n])
        n = _keep_crossed(x, y, place, found[:n], radius[order], status[order])
    n = _select(alpha, beta, ALMOST_RADIAL, CRITICAL_SQUARE * (1.0 - GRAZING), x, y, place)
    _mark(place[:n], CAPTURED, status, fate)
    for order in range(radius.shape[0]):
        _captured(x[:n], y[:n], cosine, sine, order * math.pi, found[:n])
        n = _keep_crossed(x, y, place, found[:n], radius[order], status[order])


@kernel()
def crossing_radii(first, last, alpha, beta, cosine, sine, radius, status, fate):
    """Fill status (orders, n), fate (n,) and, where rays cross, radius (orders, n) from one ray up to another, as
    `schwarzschild.trace_rays` does.

    Rays that it cannot take get the fate LEFT and nothing else; the cosine of the inclination may not be 0.
    """
    for start in range(first, last, TILE):
        stop = min(start + TILE, last)
        _trace_tile(
            alpha[start:stop],
            beta[start:stop],
            cosine,
            sine,
            radius[:, start:stop],
            status[:, start:stop],
            fate[start:stop],
        )
