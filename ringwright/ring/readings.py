"""What the estimator reads on one scene against x = r/θ_g, the resolution in gravitational radii.

A scene given by dimensionless numbers is scale-free, so this table is all that a comparison needs
(docs/measuring.md). Nodes at 0 and from 1 in steps of 0.75 until the ring is lost, halved wherever a straight
line between two of them misses the diameter by more than 0.3 % half-way or the outcome changes. Lengths in M
on the screen, that is in units of θ_g.
"""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from ringwright.errors import InputError
from ringwright.ring.estimator import PIXELS_PER_FWHM, RELATIVE, Reading, read_blurred
from ringwright.ring.outcomes import RingOutcome
from ringwright.ring.smoothing import Spectrum, prepare

Array = NDArray[np.float64]

FIRST_STEP = 1.0
STEP = 0.75
BASE_NODES = 18  # reaches 13: a ring of emission from the innermost stable orbit is resolved far beyond 8
MOST_NODES = 48
HALFWAY_TOLERANCE = 0.003
# No interval is halved below this: a jump of the diameter or the loss of the ring is placed to 0.03 θ_g,
# which moves a comparison by less than the width of the prior weight found there.
LEAST_STEP = 0.03
# Below x = 1, finer than one gravitational radius, nodes cost most and no observation stands: coarser.
LEAST_STEP_BELOW_ONE = 0.125


@dataclass(frozen=True)
class Readings:
    """One scene's table. Arrays are (node,); NaN where the outcome has no such reading.

    Attributes
    ----------
    nodes : array
        x = r/θ_g, ascending. Below `finest` the image holds no more detail: the readings at 0 are those at
        `finest`.
    diameter, width : array
        In units of θ_g, that is M on the screen.
    asymmetry, central_brightness : array
        Pure numbers.
    outcome : array of int8
        `RingOutcome`. Interpolate linearly between nodes of one outcome, never across a change.
    halfway_error : float
        Largest relative error of the interpolated diameter half-way between two nodes of one closed ring.
    finest : float
        Three pixels: the least resolution that the image allows.
    """

    nodes: Array
    diameter: Array
    width: Array
    asymmetry: Array
    central_brightness: Array
    outcome: NDArray[np.int8]
    halfway_error: float
    jump: float
    finest: float


def readings(pixels: Array, pixel: float) -> Readings:
    """Read one scene's ring at every resolution that a comparison may ask for.

    Parameters
    ----------
    pixels : array (ny, nx)
        Flux per pixel, any unit; row 0 south, column 0 east. The field should hold the ring with two FWHM to
        spare.
    pixel : float
        Side of a pixel [M].

    Raises
    ------
    InputError
        For an array that is no image, is not finite, or a pixel that is not positive.
    """
    if pixels.ndim != 2 or not np.isfinite(pixels).all():
        raise InputError("readings need a finite image with two axes, north and east")
    if not (np.isfinite(pixel) and pixel > 0.0):
        raise InputError(f"the size of a pixel must be a positive number of M, not {pixel:g}")
    widest = FIRST_STEP + (BASE_NODES - 2) * STEP
    return _Table(prepare(pixels, pixel, widest=widest, averaged=True)).filled()


class _Table:
    """A table while it grows."""

    def __init__(self, spectrum: Spectrum) -> None:
        self.spectrum = spectrum
        self.finest = PIXELS_PER_FWHM * spectrum.pixel
        self.known: dict[float, Reading] = {}
        self.nodes: set[float] = set()
        self.error = 0.0
        self.jump = 0.0

    def read(self, x: float) -> Reading:
        resolution = max(x, self.finest)
        if resolution not in self.known:
            self.known[resolution] = read_blurred(self.spectrum, resolution, lengths=RELATIVE)
        return self.known[resolution]

    def filled(self) -> Readings:
        base = self.base_nodes()
        self.nodes.update(base)
        for low, high in pairwise(base):
            self.refine(low, high)
        return self.finished()

    def base_nodes(self) -> list[float]:
        """The regular nodes, down to the first one without a ring after one with a ring."""
        base = []
        ring_seen = False
        for x in [0.0] + [FIRST_STEP + STEP * k for k in range(BASE_NODES - 1)]:
            base.append(x)
            has_diameter = self.read(x).outcome.has_diameter
            if ring_seen and not has_diameter:
                break
            ring_seen |= has_diameter
        return base

    def refine(self, low: float, high: float) -> None:
        """Halve an interval until a straight line serves, or the interval is as short as it may be."""
        left, right = self.read(low), self.read(high)
        closed = left.outcome <= RingOutcome.WIDTH_LIMIT  # on arcs a diameter means nothing worth a node
        if left.outcome == right.outcome and (not closed or high <= self.finest):
            return
        shortest = high - low <= (LEAST_STEP if high > FIRST_STEP else LEAST_STEP_BELOW_ONE)
        if left.outcome != right.outcome and shortest:
            return
        middle = 0.5 * (low + high)
        between = self.read(middle)
        if left.outcome == right.outcome == between.outcome:
            miss = abs(0.5 * (left.diameter + right.diameter) / between.diameter - 1.0)
            if miss > HALFWAY_TOLERANCE and shortest:
                self.jump = max(self.jump, miss)  # two rings of nearly one brightness change places here
                return
            if miss <= HALFWAY_TOLERANCE or len(self.nodes) >= MOST_NODES:
                self.error = max(self.error, miss)
                return
        if len(self.nodes) < MOST_NODES:
            self.nodes.add(middle)
            self.refine(low, middle)
            self.refine(middle, high)

    def finished(self) -> Readings:
        nodes = sorted(self.nodes)
        rows = [self.read(x) for x in nodes]
        return Readings(
            nodes=np.array(nodes),
            diameter=np.array([row.diameter for row in rows]),
            width=np.array([row.width for row in rows]),
            asymmetry=np.array([row.asymmetry for row in rows]),
            central_brightness=np.array([row.central_brightness for row in rows]),
            outcome=np.array([row.outcome for row in rows], dtype=np.int8),
            halfway_error=self.error,
            jump=self.jump,
            finest=self.finest,
        )


def lost(table: Readings) -> float:
    """The smallest x beyond which no ring is found; infinite where the table ends with a ring."""
    held = np.flatnonzero(table.outcome <= RingOutcome.OPEN)
    if held.size == 0:
        return 0.0
    after = int(held[-1]) + 1
    return float(table.nodes[after]) if after < table.nodes.size else np.inf
