"""Light paths in the Schwarzschild metric in closed form (Darwin 1959, Proc. R. Soc. A 249, 180), ray by ray.

With u = 1/r and ψ the angle swept from the observer, u'² = 1/b² − u² + 2u³. Weierstrass's formula for a path that starts at u = 0 is
u = [1/(2b²) − ℘'(ψ)/b] / 2y² with y = ℘(ψ) + 1/12, and it follows that b u' = 1 − (1 − 2u)/(2y): neither an incomplete integral nor
a difference of large terms is needed. ℘ comes from Jacobi's functions (Bulirsch 1965, Numer. Math. 7, 78). G = c = M = 1.
"""

import math

import numpy as np

from raytrace.kernels.compiling import kernel

CROSSED, ESCAPED, CAPTURED, IN_PLANE = 0, 1, 2, 3
CRITICAL_SQUARE = 27.0
# Dekker's splitting constant for 53-bit numbers: 2^27 + 1.
SPLITTER = 134217729.0
# The arithmetic–geometric ladder ends when its two means agree to the root of the precision: the next step is exact.
LADDER_END = 3e-9
MOST_RUNGS = 12
# α² + β² = 27 has no solution among floating-point numbers; a difference that underflows is moved off zero by this.
LEAST_EXCESS = 1e-60
# Rays that a thread takes at a time.
TILE = 1024
# Gauss–Legendre rule for the smooth part of the delay: 16 nodes reach 1e-13 on panels no longer than this, because the
# nearest branch point, u = u1, lies at least 0.2 beyond the end (½ ln 1.5 on the critical curve, where it is nearest).
LONGEST_PANEL = 0.75
POINTS, WEIGHTS = np.polynomial.legendre.leggauss(16)


@kernel()
def _product_error(a, b, product):
    """The rounding error of a product (Dekker 1971)."""
    t = SPLITTER * a
    a1 = t - (t - a)
    a2 = a - a1
    t = SPLITTER * b
    b1 = t - (t - b)
    b2 = b - b1
    return ((a1 * b1 - product) + a1 * b2 + a2 * b1) + a2 * b2


@kernel()
def square_excess(alpha, beta):
    """b² and b² − 27, the latter to full relative precision however close to the critical curve."""
    a2, b2 = alpha * alpha, beta * beta
    if abs(a2 + b2 - CRITICAL_SQUARE) > 1.0:
        return a2 + b2, a2 + b2 - CRITICAL_SQUARE
    a2_error, b2_error = _product_error(alpha, alpha, a2), _product_error(beta, beta, b2)
    total = a2 + b2
    part = total - a2
    sum_error = (a2 - (total - part)) + (b2 - part)
    excess = (total - CRITICAL_SQUARE) + (sum_error + (a2_error + b2_error))
    return total, excess if excess != 0.0 else LEAST_EXCESS


@kernel()
def _ladder(m1, upper, lower):
    """Arithmetic–geometric means of 1 and √m1; returns the number of rungs and the last mean, π/(2K)."""
    a = 1.0
    square = m1
    for rung in range(MOST_RUNGS):
        upper[rung] = a
        root = math.sqrt(square)
        lower[rung] = root
        mean = 0.5 * (a + root)
        if abs(a - root) <= LADDER_END * a:
            return rung + 1, mean
        square = root * a
        a = mean
    return MOST_RUNGS, a


@kernel()
def _jacobi(angle, rungs, mean, upper, lower):
    """Jacobi's sn, cn, dn at the argument angle/mean, up the ladder from circular functions (Bulirsch 1965)."""
    sine, cosine = math.sin(angle), math.cos(angle)
    dn = 1.0
    if sine == 0.0:
        return 0.0, cosine, 1.0
    a = cosine / sine
    c = mean * a
    for rung in range(rungs - 1, -1, -1):
        above = upper[rung]
        a *= c
        c *= dn
        dn = (lower[rung] + a) / (above + a)
        a = c / above
    sn = 1.0 / math.sqrt(c * c + 1.0)
    if sine < 0.0:
        sn = -sn
    return sn, c * sn, dn


@kernel()
def shape(square, excess, roots):
    """What a ray's b makes of its cubic: fills (u1, second, third, speed, m1) and says whether it escapes.

    For a ray that escapes second and third are the roots u2 < u3; for one that is captured they are the real part p and
    the modulus A = |u1 − p − iq|. `speed` takes the swept angle to the argument of Jacobi's functions.
    """
    if excess > 0.0:
        outer = (2.0 / 3.0) * math.atan(math.sqrt(CRITICAL_SQUARE / excess))
        inner = (2.0 / 3.0) * math.atan(math.sqrt(excess / CRITICAL_SQUARE))
        half = 0.5 * outer
        roots[0] = -(2.0 / 3.0) * math.sin(math.pi / 3.0 - half) * math.sin(half)
        roots[1] = (2.0 / 3.0) * math.sin(2.0 * math.pi / 3.0 - half) * math.sin(half)
        span = math.cos(inner - math.pi / 6.0)
        roots[2] = roots[1] + math.sin(inner) / math.sqrt(3.0)
        roots[3] = math.sqrt(0.5 * span / math.sqrt(3.0))
        roots[4] = math.sin(inner) / span
        return True
    turn = (2.0 / 3.0) * math.asinh(math.sqrt(-excess / square))
    cosh, sinh = math.cosh(turn), math.sinh(turn)
    roots[0] = -(cosh - 0.5) / 3.0
    modulus = math.sqrt((4.0 * cosh * cosh - 1.0) / 12.0)
    roots[1] = 0.25 - 0.5 * roots[0]
    roots[2] = modulus
    roots[3] = math.sqrt(2.0 * modulus)
    roots[4] = sinh * sinh / (24.0 * modulus * (modulus + 0.5 * cosh))
    return False


@kernel()
def _position(psi, b, escapes, roots, rungs, mean, upper, lower):
    """u and y = ℘ + 1/12 at a swept angle; u < 0 where the ray has left or fallen in."""
    angle = roots[3] * psi * mean
    if angle >= math.pi:
        return -1.0, 1.0
    sn, cn, dn = _jacobi(angle, rungs, mean, upper, lower)
    u1 = roots[0]
    if escapes:
        speed = roots[3]
        s2 = sn * sn
        low = speed * speed + 0.5 * u1 * s2
        u = sn * (2.0 * speed * speed * speed * cn * dn / b + sn * s2 / (2.0 * b * b)) / (2.0 * low * low)
        return u, low / s2
    q = (1.0 + cn) / sn if cn > 0.0 else sn / (1.0 - cn)
    modulus = roots[2]
    y = 0.5 * (u1 + modulus * q * q)
    if y <= 0.0:
        return -1.0, 1.0
    slope = modulus * math.sqrt(0.5 * modulus) * q * (q * q + 1.0) * dn
    u = (slope / b + 0.5 / (b * b)) / (2.0 * y * y)
    return (u, y) if u < 0.5 else (-1.0, y)


@kernel()
def panels(length):
    """How many panels the quadrature spends on an interval."""
    return int(length / LONGEST_PANEL) + 1


@kernel()
def depth(u, escapes, roots):
    """The variable θ of `lag` at u: u = u2 − (u3 − u2) sinh²θ, or u = p + q sinh θ."""
    if escapes:
        return math.asinh(math.sqrt(max(roots[1] - u, 0.0) / (roots[2] - roots[1])))
    return math.asinh((u - roots[1]) / _imaginary(roots))


@kernel()
def _depth_by_slope(u, w, b, roots):
    """The same for a ray that escapes, from w = b u': near the closest approach u2 − u itself has lost its digits."""
    gap = roots[2] - roots[1]
    product = w * w / (2.0 * b * b * (u - roots[0]))  # (u2 − u)(u3 − u)
    below = 2.0 * product / (gap + math.sqrt(gap * gap + 4.0 * product))
    return math.asinh(math.sqrt(below / gap))


@kernel()
def lag(theta, b, escapes, roots):
    """J = ∫ b²/[√W (1 + √W)] du with W = 1 − b²u²(1 − 2u), from u = 0 to θ on the way in: what bending adds to the delay.

    The variable θ of `depth` takes 1/√W away, so the integrand is smooth.
    """
    far = depth(0.0, escapes, roots)
    first, last = (theta, far) if escapes else (far, theta)
    u1, middle = roots[0], roots[1]
    scale = roots[2] - roots[1] if escapes else _imaginary(roots)
    count = panels(last - first)
    step = (last - first) / count
    total = 0.0
    for panel in range(count):
        for i in range(POINTS.shape[0]):
            s = math.sinh(first + step * (panel + 0.5 + 0.5 * POINTS[i]))
            if escapes:
                above = middle - scale * s * s - u1
                w = scale * s * b * math.sqrt(2.0 * above * (1.0 + s * s))
                rate = 2.0
            else:
                above = middle + scale * s - u1
                w = scale * b * math.sqrt(2.0 * above * (1.0 + s * s))
                rate = 1.0
            total += WEIGHTS[i] * rate * b / (math.sqrt(2.0 * above) * (1.0 + w))
    return 0.5 * step * total


@kernel()
def _imaginary(roots):
    """Imaginary part q of the complex roots: A² = (u1 − p)² + q², with A − |u1 − p| known through m1."""
    modulus, distance = roots[2], roots[1] - roots[0]
    # A − c = 2 A m1, and c = |u1 − p| because c = 1/4 − 3u1/2.
    return math.sqrt(2.0 * modulus * roots[4] * (modulus + distance))


@kernel()
def tortoise(u):
    """r* = r + 2 ln(r/2 − 1)."""
    return 1.0 / u + 2.0 * math.log(0.5 / u - 1.0)


@kernel()
def _first_angle(alpha, beta, cosine, sine, view):
    """Fills (ψ₀, azimuth, p_θ) of the first crossing; False for a ray within the plane.

    The ray's plane meets the equator along (−sβ, sα cos i, 0)/N with N = √(β² + α² cos² i) and s the sign of cos i.
    """
    side = 1.0 if cosine >= 0.0 else -1.0
    square = alpha * alpha + beta * beta
    normal = math.sqrt(beta * beta + alpha * alpha * cosine * cosine)
    if normal == 0.0:
        return False
    if cosine == 0.0:
        view[0] = math.pi
        view[1] = math.pi
        view[2] = -beta
        return True
    view[0] = math.atan2(side * math.sqrt(square) * cosine, -side * beta * sine)
    view[1] = math.atan2(side * alpha * cosine, -side * beta)
    view[2] = -side * normal
    return True


@kernel()
def _crossing_delay(u, w, b, escapes, roots):
    """Delay of a crossing at u: −r* + J on the way in; by symmetry about the turning point on the way out."""
    theta = _depth_by_slope(u, w, b, roots) if escapes else depth(u, escapes, roots)
    inward = -tortoise(u) + lag(theta, b, escapes, roots)
    if w >= 0.0:
        return inward
    return 2.0 * (-tortoise(roots[1]) + lag(0.0, b, escapes, roots)) - inward


@kernel()
def _wrapped(angle):
    """An angle brought into (−π, π]."""
    return angle - 2.0 * math.pi if angle > math.pi else angle


@kernel()
def trace_ray(i, alpha, beta, cosine, sine, radius, azimuth, delay, momentum, status, fate, work):
    """Trace ray i to its crossings; `work` holds two ladders, five numbers of the cubic and three of the view."""
    upper, lower = work[:MOST_RUNGS], work[MOST_RUNGS : 2 * MOST_RUNGS]
    roots, view = work[2 * MOST_RUNGS : 2 * MOST_RUNGS + 5], work[2 * MOST_RUNGS + 5 :]
    square, excess = square_excess(alpha[i], beta[i])
    fate[i] = ESCAPED if excess > 0.0 else CAPTURED
    if square == 0.0 or not _first_angle(alpha[i], beta[i], cosine, sine, view):
        status[:, i] = IN_PLANE if square > 0.0 or cosine == 0.0 else CAPTURED
        return
    b = math.sqrt(square)
    escapes = shape(square, excess, roots)
    rungs, mean = _ladder(roots[4], upper, lower)
    for order in range(radius.shape[0]):
        psi = view[0] + order * math.pi
        u, y = _position(psi, b, escapes, roots, rungs, mean, upper, lower)
        if not u > 0.0:
            status[order:, i] = fate[i]
            return
        status[order, i] = CROSSED
        radius[order, i] = 1.0 / u
        odd = order % 2 == 1
        if azimuth.shape[0] > 0:
            azimuth[order, i] = _wrapped(view[1] + (math.pi if odd else 0.0))
        w = 1.0 - (1.0 - 2.0 * u) / (2.0 * y)
        if delay.shape[0] > 0:
            delay[order, i] = _crossing_delay(u, w, b, escapes, roots)
        if momentum.shape[1] > 0:
            momentum[0, order, i] = w / (1.0 - 2.0 * u)
            momentum[1, order, i] = -view[2] if odd else view[2]
            momentum[2, order, i] = -alpha[i] * sine


@kernel()
def trace_rays(first, last, alpha, beta, cosine, sine, radius, azimuth, delay, momentum, status, fate):
    """Trace rays from one up to another to their crossings.

    Parameters
    ----------
    first, last : int
    alpha, beta : float64 arrays (n,)
    cosine, sine : float
        Of the inclination; the cosine is exactly 0 edge-on.
    radius, azimuth, delay : float64 arrays (orders, n)
        Filled; azimuth and delay may have no rows where they are not asked for.
    momentum : float64 array (3, orders, n)
        Filled with p_r, p_θ, p_φ unless it has no rows.
    status : int8 array (orders, n)
    fate : int8 array (n,)
    """
    work = np.empty(2 * MOST_RUNGS + 8)
    for i in range(first, last):
        trace_ray(i, alpha, beta, cosine, sine, radius, azimuth, delay, momentum, status, fate, work)
