"""Cuts through the light from the screen's origin outward, on samples that resolve every order.

Along a cut the places where brightness may jump or bend are known: the edges of every order's panels and of opaque
crossings in front. Between two of them the light is smooth, so some points there show all there is, however thin the
ring; nothing is traced again. Distances in M, angles in radians, brightness in the emitters' own unit.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.polynomial import legendre

from raytrace.contract import Array
from raytrace.series import trigonometric_weights
from ringwright.errors import InputError
from ringwright.sampling import SampledLight

# Points between two corners of a cut: enough to draw a smooth curve through.
POINTS = 24
# Corners closer than this share of their distance are one: what rounding leaves between two names of one edge.
SAME_CORNER = 1e-13


@dataclass(frozen=True)
class Cut:
    """Brightness along one direction from the screen's origin.

    Attributes
    ----------
    distance : array (n,)
        [M], ascending; at a corner twice, so that a jump is drawn as one, and so where the light begins and ends.
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

    Returns
    -------
    Cut

    Raises
    ------
    InputError
        If some of the light comes from infinity and ends only where the field does.
    """
    lines = [Lines(part, np.array([angle])) for part in light]
    marks = corners(lines)
    marks = marks[np.concatenate([[True], np.isfinite(middles(marks)[:, 0])])]
    distance = np.linspace(marks[:-1], marks[1:], POINTS, axis=1)
    intensity = np.zeros((orders, distance.size))
    for line in lines:
        intensity[line.order] += line.brightness(distance, middles(marks)).ravel()
    dark = np.zeros((orders, 1))
    return Cut(
        np.concatenate([marks[0], distance.ravel(), marks[-1]]),
        np.concatenate([dark, np.maximum(intensity, 0.0), dark], axis=1),
    )


class Lines:
    """One order of one emitter along several screen angles.

    Attributes
    ----------
    order : int
    edges : array (panels + 1, n)
        Of the panels [M].
    coefficients : array (m, panels, n)
        Legendre coefficients of the brightness across each panel.
    fronts : list of arrays (2, n)
        Inner and outer edge of each opaque crossing in front [M].
    """

    def __init__(self, part: SampledLight, angle: Array) -> None:
        if part.boundless:
            raise InputError(
                "light from infinity (a backdrop) fills whatever field is drawn and has no profile of its own; leave it out"
            )
        offsets, coefficients = part.series.at_angles(angle)
        self.order = part.order
        self.edges: Array = part.series.band.curve(angle) + offsets
        self.coefficients: Array = np.moveaxis(coefficients, 1, 0)
        self.fronts: list[Array] = [
            front @ trigonometric_weights(front.shape[1], angle) for front in part.fronts
        ]

    def brightness(self, distance: Array, middle: Array) -> Array:
        """Brightness along pieces that no edge cuts.

        Parameters
        ----------
        distance : array (pieces, q, n)
            Places on each piece, its ends among them if wanted [M].
        middle : array (pieces, n)
            A place inside each piece, which says to what it belongs; NaN for a piece that is none, which is dark [M].
        """
        panel = np.sum(middle >= self.edges[:, None, :], axis=0) - 1
        lit = (panel >= 0) & (panel < len(self.edges) - 1)
        for inner, outer in self.fronts:
            lit &= ~((middle > inner) & (middle < outer))
        panel, each = np.where(lit, panel, 0), np.arange(middle.shape[1])
        low, high = self.edges[panel, each][:, None, :], self.edges[panel + 1, each][:, None, :]
        x = np.where(lit[:, None, :], (2.0 * distance - low - high) / (high - low), 0.0)
        value = legendre.legval(x, self.coefficients[:, panel, each][:, :, None, :], tensor=False)
        return np.where(lit[:, None, :], value, 0.0)


def corners(lines: Sequence[Lines]) -> Array:
    """Where brightness may jump or bend, ascending along each angle: every panel's edges and those of what is in front;
    shape (k, n).
    """
    return np.sort(np.concatenate([rows for line in lines for rows in (line.edges, *line.fronts)]), axis=0)


def middles(marks: Array) -> Array:
    """The middle of each piece between ascending corners (k, n); NaN where the piece is nothing but rounding."""
    low, high = marks[:-1], marks[1:]
    return np.where(high - low > SAME_CORNER * high, 0.5 * (low + high), np.nan)
