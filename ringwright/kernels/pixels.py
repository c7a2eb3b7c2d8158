"""The light of one order that falls into each pixel: the integral over the pixel's area, however thin the ring.

A band of light is known by its edges B_k(φ) and, between two edges, by Chebyshev coefficients of its
brightness at equally spaced screen angles. Where a pixel lies inside the band its integral is a small Gauss
rule; where an edge crosses it, rays from the screen's origin cut the pixel into chords, chords are cut at
the edges, and each piece is integrated by itself. Lengths in M on the image plane, x to the west and y to
the north; brightness in any unit, results in that unit times M².
"""

import math

import numba
import numpy as np

from raytrace.kernels.compiling import kernel

TURN = 2.0 * math.pi
# Gauss–Legendre rules on (−1, 1).
POINTS_2 = np.array([-0.5773502691896257, 0.5773502691896257])
POINTS_3 = np.array([-0.7745966692414834, 0.0, 0.7745966692414834])
WEIGHTS_3 = np.array([5.0 / 9.0, 8.0 / 9.0, 5.0 / 9.0])
POINTS_4 = np.array([-0.8611363115940526, -0.3399810435848563, 0.3399810435848563, 0.8611363115940526])
WEIGHTS_4 = np.array([0.34785484513745385, 0.6521451548625461, 0.6521451548625461, 0.34785484513745385])
POINTS_8, WEIGHTS_8 = np.polynomial.legendre.leggauss(8)
# A piece of a chord shorter than this share of its panel gets four points instead of eight.
SHORT_PIECE = 0.4
# A pixel wider than this share of the panel that it lies in is integrated by chords cut at the panel's
# edges; a narrower one by three points a side, a narrow one by two. A panel holds light that falls by less
# than a factor of ten.
SMOOTH_SHARE = 0.6
FINE_SHARE = 0.25
# Wedges between neighbouring corners of a cut pixel; a wedge is cut once more where an edge leaves the
# pixel, so that only a pixel that an edge enters and leaves within one wedge is integrated with a kink
# inside.
CUT_STEPS = 6
KINK_BISECTIONS = 20
# Corners are approached this closely, in wedges, when asking how the edges lie to the chord.
CORNER_INSET = 1e-6
# Tables repeat one angle before the first and two after the last, so that four neighbours are always there.
PADDING = 3
# A pixel with a corner this close to the origin (in pixels) has no angle for that corner.
AT_ORIGIN = 1e-9


@kernel()
def _angle_weights(phi, count, weights):
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
def _at_angle(row, first, weights):
    """Interpolate one padded row of a table."""
    return (
        weights[0] * row[first]
        + weights[1] * row[first + 1]
        + weights[2] * row[first + 2]
        + weights[3] * row[first + 3]
    )


@kernel()
def _brightness(coefficients, terms, first, weights, x):
    """Brightness at x in (−1, 1) of a panel: Clenshaw's recurrence on angle-interpolated Chebyshev
    coefficients.
    """
    above = 0.0
    here = 0.0
    for m in range(terms - 1, -1, -1):
        c = (
            weights[0] * coefficients[first, m]
            + weights[1] * coefficients[first + 1, m]
            + weights[2] * coefficients[first + 2, m]
            + weights[3] * coefficients[first + 3, m]
        )
        if m == 0:
            return c + x * here - above
        here, above = c + 2.0 * x * here - above, here
    return 0.0


@kernel()
def _hidden(t, blockers, first, weights):
    """Whether an opaque crossing of a lower order lies in front at distance t from the origin."""
    for k in range(blockers.shape[0]):
        inner = _at_angle(blockers[k, 0], first, weights)
        outer = _at_angle(blockers[k, 1], first, weights)
        if inner < t < outer:
            return True
    return False


@kernel()
def _point(x, y, turn, edges, coefficients, terms, blockers, weights):
    """Brightness at a point of the image plane; 0 outside the band or behind an opaque crossing."""
    b = math.sqrt(x * x + y * y)
    first = _angle_weights(math.atan2(y, x) - turn, edges.shape[1] - PADDING, weights)
    low = _at_angle(edges[0], first, weights)
    if b < low:
        return 0.0
    for k in range(edges.shape[0] - 1):
        high = _at_angle(edges[k + 1], first, weights)
        if b <= high:
            if _hidden(b, blockers, first, weights):
                return 0.0
            return _brightness(
                coefficients[k], terms[k], first, weights, (2.0 * b - low - high) / (high - low)
            )
        low = high
    return 0.0


@kernel()
def _along(t0, t1, edges, coefficients, terms, blockers, first, weights):
    """∫ I t dt along a ray from the origin between t0 and t1, cut at every panel edge and blocker."""
    total = 0.0
    panels = edges.shape[0] - 1
    low = _at_angle(edges[0], first, weights)
    for k in range(panels):
        high = _at_angle(edges[k + 1], first, weights)
        start = max(t0, low)
        stop = min(t1, high)
        while start < stop:
            end = stop
            for i in range(blockers.shape[0]):
                for side in range(2):
                    cut = _at_angle(blockers[i, side], first, weights)
                    if start < cut < end:
                        end = cut
            middle = 0.5 * (start + end)
            half = 0.5 * (end - start)
            if not _hidden(middle, blockers, first, weights):
                few = 2.0 * half < SHORT_PIECE * (high - low)
                for i in range(4 if few else 8):
                    point = POINTS_4[i] if few else POINTS_8[i]
                    weight = WEIGHTS_4[i] if few else WEIGHTS_8[i]
                    t = middle + half * point
                    x = (2.0 * t - low - high) / (high - low)
                    light = _brightness(coefficients[k], terms[k], first, weights, x)
                    total += weight * half * t * light
            start = end
        low = high
    return total


@kernel()
def _chord(x, y, half, cosine, sine):
    """Where a ray from the origin enters and leaves a pixel; an empty interval where it misses."""
    near, far = 0.0, 1e300
    for axis in range(2):
        slope = cosine if axis == 0 else sine
        centre = x if axis == 0 else y
        if abs(slope) < 1e-300:
            if abs(centre) > half:
                return 1.0, 0.0
            continue
        t0 = (centre - half) / slope
        t1 = (centre + half) / slope
        near = max(near, min(t0, t1))
        far = min(far, max(t0, t1))
    return near, far


@kernel()
def _corner_angles(x, y, half, corners):
    """Directions of the corners as seen from the origin, ascending, unwrapped around the pixel's own; how
    many.
    """
    middle = math.atan2(y, x)
    found = 0
    for i in range(4):
        cx = x + (half if i % 2 else -half)
        cy = y + (half if i // 2 else -half)
        if abs(cx) + abs(cy) < AT_ORIGIN * half:
            continue
        offset = math.atan2(cy, cx) - middle
        offset -= TURN * math.floor(offset / TURN + 0.5)
        place = found
        while place > 0 and corners[place - 1] > middle + offset:
            corners[place] = corners[place - 1]
            place -= 1
        corners[place] = middle + offset
        found += 1
    if abs(x) < half * (1.0 - AT_ORIGIN) and abs(y) < half * (1.0 - AT_ORIGIN):
        corners[found] = corners[0] + TURN
        found += 1
    return found


@kernel()
def _lie(phi, x, y, half, turn, edges, blockers, weights):
    """How the outer edges and the blockers lie to the chord at an angle: short of it, within, beyond; as
    one number.
    """
    near, far = _chord(x, y, half, math.cos(phi), math.sin(phi))
    first = _angle_weights(phi - turn, edges.shape[1] - PADDING, weights)
    code = 0
    for side in range(2):
        edge = _at_angle(edges[side * (edges.shape[0] - 1)], first, weights)
        code = 3 * code + (0 if edge < near else (1 if edge <= far else 2))
    for i in range(blockers.shape[0]):
        for side in range(2):
            edge = _at_angle(blockers[i, side], first, weights)
            code = 3 * code + (0 if edge < near else (1 if edge <= far else 2))
    return code


@kernel()
def _wedge(start, stop, x, y, half, turn, edges, coefficients, terms, blockers, weights):
    """The integral over the part of a pixel between two directions, by three chords."""
    total = 0.0
    middle, reach = 0.5 * (start + stop), 0.5 * (stop - start)
    for j in range(3):
        phi = middle + reach * POINTS_3[j]
        near, far = _chord(x, y, half, math.cos(phi), math.sin(phi))
        if far > near:
            first = _angle_weights(phi - turn, edges.shape[1] - PADDING, weights)
            light = _along(near, far, edges, coefficients, terms, blockers, first, weights)
            total += reach * WEIGHTS_3[j] * light
    return total


@kernel()
def _leaving(start, stop, here, x, y, half, turn, edges, blockers, weights):
    """Bisect for the direction at which the edges no longer lie to the chord as they did: just before and
    just after.
    """
    for _ in range(KINK_BISECTIONS):
        middle = 0.5 * (start + stop)
        if _lie(middle, x, y, half, turn, edges, blockers, weights) == here:
            start = middle
        else:
            stop = middle
    return start, stop


@kernel()
def _cut_pixel(x, y, half, steps, turn, edges, coefficients, terms, blockers, corners, weights):
    """The integral over a pixel by chords from the origin, in wedges that end where an edge leaves the
    pixel.
    """
    found = _corner_angles(x, y, half, corners)
    total = 0.0
    for piece in range(found - 1):
        step = (corners[piece + 1] - corners[piece]) / steps
        inset = CORNER_INSET * step
        for i in range(steps):
            start = corners[piece] + i * step
            stop = start + step
            look = start + inset
            here = _lie(look, x, y, half, turn, edges, blockers, weights)
            there = _lie(stop - inset, x, y, half, turn, edges, blockers, weights)
            while here != there:
                before, look = _leaving(look, stop - inset, here, x, y, half, turn, edges, blockers, weights)
                total += _wedge(
                    start, before, x, y, half, turn, edges, coefficients, terms, blockers, weights
                )
                start = before
                here = _lie(look, x, y, half, turn, edges, blockers, weights)
            total += _wedge(start, stop, x, y, half, turn, edges, coefficients, terms, blockers, weights)
    return total


@kernel()
def _smooth_pixel(x, y, half, points, turn, edges, coefficients, terms, blockers, weights):
    """The integral over a pixel that no edge crosses: a Gauss rule of two or three points a side."""
    total = 0.0
    if points == 2:
        for i in range(2):
            for j in range(2):
                px, py = x + half * POINTS_2[i], y + half * POINTS_2[j]
                total += _point(px, py, turn, edges, coefficients, terms, blockers, weights)
        return total * half * half
    for i in range(3):
        for j in range(3):
            px, py = x + half * POINTS_3[i], y + half * POINTS_3[j]
            light = _point(px, py, turn, edges, coefficients, terms, blockers, weights)
            total += WEIGHTS_3[i] * WEIGHTS_3[j] * light
    return total * half * half


@kernel()
def _panel_width(x, y, turn, edges, weights):
    """Width of the panel that holds a point within the band."""
    b = math.sqrt(x * x + y * y)
    first = _angle_weights(math.atan2(y, x) - turn, edges.shape[1] - PADDING, weights)
    low = _at_angle(edges[0], first, weights)
    high = low
    for k in range(1, edges.shape[0]):
        high = _at_angle(edges[k], first, weights)
        if b <= high:
            break
        if k < edges.shape[0] - 1:
            low = high
    return high - low


@kernel()
def _range_within(row, x, y, half, turn, weights):
    """Least and greatest of an edge over the directions of a pixel, with its own spread as slack."""
    least, most = 1e300, 0.0
    for i in range(-1, 2):
        for j in range(-1, 2):
            px, py = x + i * half, y + j * half
            first = _angle_weights(math.atan2(py, px) - turn, row.shape[0] - PADDING, weights)
            value = _at_angle(row, first, weights)
            least, most = min(least, value), max(most, value)
    slack = most - least
    return least - slack, most + slack


@kernel()
def _touched(row, limits, nearest, farthest, x, y, half, turn, weights):
    """Side of a pixel against one edge: −1 inside it, +1 beyond it, 0 where the edge may cross."""
    if farthest < limits[0]:
        return -1
    if nearest > limits[1]:
        return 1
    if nearest < 2.0 * half:
        return 0
    least, most = _range_within(row, x, y, half, turn, weights)
    if farthest < least:
        return -1
    if nearest > most:
        return 1
    return 0


@kernel()
def _pixel(x, y, half, turn, edges, limits, coefficients, terms, blockers, blocker_limits, corners, weights):
    """The light of the band within one pixel."""
    nearest = math.hypot(max(abs(x) - half, 0.0), max(abs(y) - half, 0.0))
    farthest = math.hypot(abs(x) + half, abs(y) + half)
    last = edges.shape[0] - 1
    inner = _touched(edges[0], limits[0], nearest, farthest, x, y, half, turn, weights)
    outer = _touched(edges[last], limits[1], nearest, farthest, x, y, half, turn, weights)
    if inner < 0 or outer > 0:
        return 0.0
    cut = inner == 0 or outer == 0
    for i in range(blockers.shape[0]):
        for side in range(2):
            where = _touched(
                blockers[i, side], blocker_limits[i, side], nearest, farthest, x, y, half, turn, weights
            )
            cut = cut or where == 0
    if cut:
        return _cut_pixel(x, y, half, CUT_STEPS, turn, edges, coefficients, terms, blockers, corners, weights)
    share = 2.0 * half / _panel_width(x, y, turn, edges, weights)
    if share > SMOOTH_SHARE or nearest < 2.0 * half:
        return _cut_pixel(x, y, half, 1, turn, edges, coefficients, terms, blockers, corners, weights)
    points = 3 if share > FINE_SHARE else 2
    return _smooth_pixel(x, y, half, points, turn, edges, coefficients, terms, blockers, weights)


@kernel(parallel=True)
def gather_light(
    image, pixel, first_x, first_y, turn, edges, limits, coefficients, terms, blockers, blocker_limits
):
    """Add the light of one band to an image.

    Parameters
    ----------
    image : float64 array (ny, nx)
        Added to in place; row 0 south, column 0 east.
    pixel, first_x, first_y : float
        Side of a pixel; x where the first column begins (its east side), y where the first row begins [M].
    turn : float
        Position angle of +β [rad]: image angle minus screen angle.
    edges : array (panels + 1, n_angles)
        Edges of the panels against screen angle, from angle 0, padded by one before and two after [M].
    limits : array (2, 2)
        Least and greatest of the first and of the last edge [M].
    coefficients : array (panels, n_angles, terms)
        Chebyshev coefficients of the brightness across each panel.
    terms : int array (panels,)
        How many of them each panel needs.
    blockers, blocker_limits : arrays (m, 2, n_angles), (m, 2, 2)
        Inner and outer edges of opaque crossings in front, and their ranges [M].
    """
    rows, columns = image.shape
    half = 0.5 * pixel
    for row in numba.prange(rows):
        corners = np.empty(6)
        weights = np.empty(4)
        y = first_y + (row + 0.5) * pixel
        for column in range(columns):
            x = first_x + (column + 0.5) * pixel
            image[row, column] += _pixel(
                x,
                y,
                half,
                turn,
                edges,
                limits,
                coefficients,
                terms,
                blockers,
                blocker_limits,
                corners,
                weights,
            )
