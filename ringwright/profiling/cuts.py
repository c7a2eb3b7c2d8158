"""Cuts through the light from the screen's origin outward, on samples that resolve every order.

Along a cut the places where brightness may jump or bend are known: the edges of every order's panels and of opaque
crossings in front. Between two of them the light is smooth, so some points there show all there is, however thin the
ring; nothing is traced again. Distances in M, angles in radians, brightness in the emitters' own unit.
"""

from __future__ import annotations

import itertools
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.polynomial import legendre

from raytrace.contract import Array
from raytrace.series import trigonometric_weights
from ringwright.sampling import SampledLight

# Points between two corners of a cut: enough to draw a smooth curve through.
POINTS = 24
# Corners closer than this share of their distance are one.
SAME_CORNER = 1e-13


@dataclass(frozen=True)
class Cut:
    """Brightness along one direction from the screen's origin.

    Attributes
    ----------
    distance : array (n,)
        [M], ascending; at a corner twice, so that a jump is drawn as one.
    intensity : array (orders, n)
        Of every order; the total is the sum.
    """

    distance: Array
    intensity: Array

    @property
    def total(self) -> Array:
        """All orders together, shape (n,)."""
        return self.intensity.sum(axis=0)


def radial_cut(light: Sequence[SampledLight], *, angle: float, orders: int) -> Cut:
    """Brightness of every order along one screen angle.

    Parameters
    ----------
    light : sequence of SampledLight
    angle : float
        Screen angle from +α [rad].
    orders : int
    """
    lines = [Line(part, angle) for part in light]
    marks = corners(lines)
    distance = np.concatenate([np.linspace(low, high, POINTS) for low, high in itertools.pairwise(marks)])
    middle = np.repeat(0.5 * (marks[1:] + marks[:-1]), POINTS)
    intensity = np.zeros((orders, distance.size))
    for line in lines:
        intensity[line.order] += line.brightness(distance, middle)
    return Cut(distance, np.maximum(intensity, 0.0))


class Line:
    """One order of one emitter along one screen angle."""

    def __init__(self, part: SampledLight, angle: float) -> None:
        offsets, coefficients = part.series.at_angles(np.array([angle]))
        self.order = part.order
        self.edges: Array = part.series.band.curve(np.array([angle])) + offsets[:, 0]
        self.coefficients: Array = coefficients[:, :, 0]
        self.fronts = [
            (front @ trigonometric_weights(front.shape[1], np.array([angle])))[:, 0] for front in part.fronts
        ]

    def brightness(self, distance: Array, inside: Array) -> Array:
        """Brightness at distances, each known to lie in the piece that a point inside it belongs to."""
        panel = np.searchsorted(self.edges, inside) - 1
        lit = (panel >= 0) & (panel < len(self.edges) - 1)
        for inner, outer in self.fronts:
            lit &= ~((inside > inner) & (inside < outer))
        panel = np.clip(panel, 0, len(self.edges) - 2)
        low, high = self.edges[panel], self.edges[panel + 1]
        x = np.where(lit, (2.0 * distance - low - high) / (high - low), 0.0)
        value = legendre.legval(x, self.coefficients[panel].T, tensor=False)
        return np.where(lit, value, 0.0)


def corners(lines: Sequence[Line]) -> Array:
    """Where brightness may jump or bend along a cut: every panel's edges and those of what is in front, ascending."""
    everything = np.unique(np.concatenate([np.concatenate([line.edges, *line.fronts]) for line in lines]))
    apart = np.diff(everything) > SAME_CORNER * everything[1:]
    return everything[np.concatenate([[True], apart])]
