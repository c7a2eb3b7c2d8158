"""The light of one order that falls into each pixel: the integral over the pixel's area, however thin the ring.

With F(b, φ) = ∫₀ᵇ I b' db', what is held between the screen's origin and a distance b (`ringwright.kernels.held`), the light
within any outline is ∮ F dφ along it (Green's theorem in polar coordinates). A pixel's outline is four segments of grid lines, each of
which its neighbour has too, with the other sign: whatever error a segment has, light is neither lost nor made, and all
the pixels together hold ∮ F dφ around the field. F is smooth between the edges of panels; a segment is cut where it
crosses one. Lengths in M on the image plane, x to the west and y to the north; brightness in any unit, results in
that unit times M².
"""

import math

import numpy as np

from raytrace.kernels.compiling import kernel
from ringwright.kernels.held import (
    PADDING,
    TURN,
    angle_weights,
    at_angle,
    cut_by_fronts,
    is_dark,
    position,
    seen_up_to,
)

# Gauss–Legendre rules on (−1, 1).
POINTS_2, WEIGHTS_2 = np.polynomial.legendre.leggauss(2)
POINTS_4, WEIGHTS_4 = np.polynomial.legendre.leggauss(4)
POINTS_10, WEIGHTS_10 = np.polynomial.legendre.leggauss(10)
# A piece of a segment across less than this share of a panel gets two points, across less than that four, else ten:
# panels hold light that falls by less than a factor of ten, so that a pixel's light is right to 1e-5.
SHORT, MEDIUM = 0.15, 1.0
# A grid line this close to the origin, in pixels, runs through it: no angle is swept along it.
THROUGH_ORIGIN = 1e-9
# Where a piece is asked on which side of every edge it lies, as a share of it away from its ends.
INSET = 1e-7
# Cuts of one piece: more edges than two orders have panels.
MOST_CUTS = 64
# Steps of the search for a crossing, which ends much sooner at rounding.
MOST_STEPS = 60
# A pixel with less than this share of what lies behind it is looked at closely, whether all of it is dark.
NEARLY_DARK = 1e-6


@kernel()
def _distance(phi, line, horizontal):
    """Distance from the origin to a grid line along a direction."""
    return line / (math.sin(phi) if horizontal else math.cos(phi))


@kernel()
def _crossing(start, stop, line, horizontal, turn, row, weights):
    """Angle between two at which a grid line crosses an edge, by the Illinois variant of false position; `stop` where
    it does not.
    """
    count = row.shape[0] - PADDING
    a, b = start, stop
    fa = _distance(a, line, horizontal) - at_angle(row, angle_weights(a - turn, count, weights), weights)
    fb = _distance(b, line, horizontal) - at_angle(row, angle_weights(b - turn, count, weights), weights)
    if (fa > 0.0) == (fb > 0.0):
        return stop
    for _ in range(MOST_STEPS):
        c = (a * fb - b * fa) / (fb - fa)
        if not min(a, b) < c < max(a, b):
            break
        fc = _distance(c, line, horizontal) - at_angle(row, angle_weights(c - turn, count, weights), weights)
        if fc == 0.0:
            return c
        if (fc > 0.0) == (fb > 0.0):
            fa *= 0.5
        else:
            a, fa = b, fb
        b, fb = c, fc
    return b


@kernel()
def _first_crossing(start, stop, here, there, line, horizontal, turn, edges, fronts, weights):
    """Nearest angle to the start at which one of the edges that lie otherwise at the stop is crossed."""
    nearest = stop
    for i in range(fronts.shape[0] - 1, -1, -1):
        for side in range(1, -1, -1):
            if here % 2 != there % 2:
                found = _crossing(start, stop, line, horizontal, turn, fronts[i, side], weights)
                if abs(found - start) < abs(nearest - start):
                    nearest = found
            here //= 2
            there //= 2
    if here != there:
        edge = here if there > here else here - 1
        found = _crossing(start, stop, line, horizontal, turn, edges[edge], weights)
        if abs(found - start) < abs(nearest - start):
            nearest = found
    return nearest


@kernel()
def _piece(
    start, stop, code, share, line, horizontal, turn, edges, held, coefficients, terms, fronts, weights
):
    """∫ F dφ along a piece of a grid line that crosses no edge, but a share of a panel. Where something opaque cuts
    the band, its edge may cross all of it within a small angle: as many points as there are.
    """
    beyond = code >> (2 * fronts.shape[0])
    if beyond == 0:
        return 0.0
    middle, half = 0.5 * (start + stop), 0.5 * (stop - start)
    count = 2 if share < SHORT else (4 if share < MEDIUM else 10)
    if fronts.shape[0] > 0 and cut_by_fronts(middle - turn, edges, fronts, weights):
        count = 10
    total = 0.0
    for i in range(count):
        if count == 2:
            point, weight = POINTS_2[i], WEIGHTS_2[i]
        elif count == 4:
            point, weight = POINTS_4[i], WEIGHTS_4[i]
        else:
            point, weight = POINTS_10[i], WEIGHTS_10[i]
        phi = middle + half * point
        first = angle_weights(phi - turn, edges.shape[1] - PADDING, weights)
        b = _distance(phi, line, horizontal)
        total += weight * seen_up_to(b, beyond, edges, held, coefficients, terms, fronts, first, weights)
    return total * half


@kernel()
def _stretch(start, stop, line, horizontal, turn, edges, held, coefficients, terms, fronts, weights):
    """∫ F dφ along a short stretch of a grid line, cut where it crosses an edge."""
    total = 0.0
    at = stop - INSET * (stop - start)
    guess = edges.shape[0] // 2
    there, place = position(at, _distance(at, line, horizontal), guess, turn, edges, fronts, weights)
    for _ in range(MOST_CUTS):
        inset = INSET * (stop - start)
        at = start + inset
        guess = there >> (2 * fronts.shape[0])
        here, from_place = position(at, _distance(at, line, horizontal), guess, turn, edges, fronts, weights)
        end, share = stop, abs(place - from_place)
        if here != there:
            end = _first_crossing(
                start + inset, stop - inset, here, there, line, horizontal, turn, edges, fronts, weights
            )
            share = 1.0
        total += _piece(
            start, end, here, share, line, horizontal, turn, edges, held, coefficients, terms, fronts, weights
        )
        if end == stop or abs(stop - end) <= abs(inset):
            break
        start = end
    return total


@kernel()
def _between(start, stop, line, horizontal, turn, edges, held, coefficients, terms, fronts, corners, weights):
    """∫ F dφ along a grid line between two angles, on one side of its point nearest to the origin."""
    step = TURN / (edges.shape[1] - PADDING)
    pieces = max(1, math.ceil(abs(stop - start) / step))
    total = 0.0
    a = start
    for i in range(pieces):
        z = start + (stop - start) * (i + 1) / pieces
        while a != z:
            end = z
            for k in range(corners.shape[0]):
                corner = corners[k] + turn
                corner += TURN * math.floor((0.5 * (a + z) - corner) / TURN + 0.5)
                if min(a, end) < corner < max(a, end):
                    end = corner
            total += _stretch(
                a, end, line, horizontal, turn, edges, held, coefficients, terms, fronts, weights
            )
            a = end
    return total


@kernel()
def _segment(
    line, low, high, horizontal, limits, turn, edges, held, coefficients, terms, fronts, corners, weights
):
    """∫ F dφ along one side of a pixel, toward growing x or y."""
    size = high - low
    if abs(line) < THROUGH_ORIGIN * size:
        return 0.0
    beside = max(abs(low), abs(high))
    if math.hypot(line, beside) < limits[0]:
        return 0.0
    apart = 0.0 if low < 0.0 < high else min(abs(low), abs(high))
    if math.hypot(line, apart) > limits[1] + 2.0 * size:
        # No pixel beside it holds light.
        return 0.0
    foot = math.atan2(line, 0.0) if horizontal else math.atan2(0.0, line)
    start = foot + (-math.atan(low / line) if horizontal else math.atan(low / line))
    stop = foot + (-math.atan(high / line) if horizontal else math.atan(high / line))
    turning = foot if low < 0.0 < high else start
    total = 0.0
    # One call in a loop: a second one would be compiled a second time.
    for half in range(2):
        a, z = (start, turning) if half == 0 else (turning, stop)
        total += _between(
            a, z, line, horizontal, turn, edges, held, coefficients, terms, fronts, corners, weights
        )
    return total


@kernel()
def _all_dark(x, y, half, turn, edges, fronts, weights):
    """Whether all corners of a pixel lie in the same dark place."""
    code = -1
    for i in range(4):
        cx = x + (half if i % 2 else -half)
        cy = y + (half if i // 2 else -half)
        here, _ = position(math.atan2(cy, cx), math.hypot(cx, cy), 0, turn, edges, fronts, weights)
        if code >= 0 and here != code:
            return False
        code = here
    return is_dark(code, edges.shape[0] - 1, fronts.shape[0])


@kernel()
def integrate_sides(
    first,
    last,
    sides,
    pixel,
    first_x,
    first_y,
    turn,
    edges,
    limits,
    held,
    coefficients,
    terms,
    fronts,
    corners,
):
    """Integrals of F along the sides of all pixels that begin on some grid lines.

    Parameters
    ----------
    first, last : int
        From one grid line up to another.
    sides : float64 array (2, ny + 1, nx + 1)
        Filled: along x and along y, each toward growing x or y.
    pixel, first_x, first_y : float
        Side of a pixel; x where the first column begins (its east side), y where the first row begins [M].
    turn : float
        Position angle of +β [rad]: image angle minus screen angle.
    edges : array (panels + 1, n_angles)
        Edges of the panels against screen angle, from angle 0, padded by one before and two after [M].
    limits : array (2,)
        Least of the first and greatest of the last edge [M].
    held : array (panels + 1, n_angles)
        Light per radian between the origin and each panel edge.
    coefficients : array (panels, n_angles, terms)
        Chebyshev coefficients of the light per radian between a panel's inner edge and a point in it.
    terms : int array (panels,)
        How many of them each panel needs.
    fronts : array (m, 2, n_angles)
        Inner and outer edges of opaque crossings in front [M].
    corners : array (c,)
        Screen angles, ascending, at which edges cross each other [rad].
    """
    weights = np.empty(4)
    for row in range(first, last):
        y = first_y + row * pixel
        for column in range(sides.shape[2]):
            x = first_x + column * pixel
            for along in range(2):
                low = y if along else x
                sides[along, row, column] = _segment(
                    x if along else y,
                    low,
                    low + pixel,
                    along == 0,
                    limits,
                    turn,
                    edges,
                    held,
                    coefficients,
                    terms,
                    fronts,
                    corners,
                    weights,
                )


@kernel()
def gather_light(first, last, image, sides, pixel, first_x, first_y, turn, edges, limits, most, fronts):
    """Add the light that the sides of every pixel enclose, from one row of an image up to another.

    Parameters
    ----------
    first, last : int
        Rows.
    image : float64 array (ny, nx)
        Added to in place; row 0 south, column 0 east.
    sides : array (2, ny + 1, nx + 1)
        From `integrate_sides`.
    most : float
        Greatest light per radian.
    pixel, first_x, first_y, turn, edges, limits, fronts
        As there.
    """
    weights = np.empty(4)
    half = 0.5 * pixel
    for row in range(first, last):
        y = first_y + (row + 0.5) * pixel
        for column in range(image.shape[1]):
            x = first_x + (column + 0.5) * pixel
            nearest = math.hypot(max(abs(x) - half, 0.0), max(abs(y) - half, 0.0))
            if nearest >= limits[1] or math.hypot(abs(x) + half, abs(y) + half) <= limits[0]:
                continue
            light = sides[0, row, column] - sides[0, row + 1, column]
            light += sides[1, row, column + 1] - sides[1, row, column]
            behind = most * min(TURN, 2.0 * pixel / max(nearest, half))
            if abs(light) > NEARLY_DARK * behind or not _all_dark(x, y, half, turn, edges, fronts, weights):
                image[row, column] += light
