"""What was sampled on a band, everywhere: Legendre series across its panels, trigonometric series around the screen.

Between its panels' edges light is smooth, so some ten samples across and some dozens around carry it to nearly
the accuracy of the samples; whatever needs many points (a cut, a pixel, a Fourier integral) asks the series and
traces no ray. G = c = M = 1; angles in radians.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from functools import cache, cached_property
from typing import Any

import numpy as np
from numpy.polynomial import legendre
from numpy.typing import ArrayLike, NDArray

from raytrace.contract import Array
from raytrace.panels import Band, gauss_legendre

# Share of the coefficients of a trigonometric series that are taken as its tail, and the fewest: at the last of
# all, half a step off angle 0, light that is even about the β axis cannot be seen, and at every other one an even ring.
TAIL_SHARE = 0.1
FEWEST_IN_TAIL = 3
# Share that is cut to see what a tail does: in a slowly falling series as much lies beyond its end as in its last quarter.
CUT_SHARE = 0.25
# Units in the last place by which a ray's distance from the origin, and what each angle adds to a sum, is known.
ROUNDING = 32.0
# Legendre coefficients at the end of a panel's series that are taken as its tail.
TAIL_TERMS = 2
# Where brightness has a corner within a panel its N coefficients fall as l^−4 at worst: what lies beyond the last two
# is then this share of N times them.
BEYOND_TAIL = 1.0 / 6.0


@dataclass(frozen=True)
class BandSeries:
    """A quantity on one band as a function of distance and screen angle.

    Attributes
    ----------
    band : Band
    coefficients : array (panels, m, n_angles)
        Legendre coefficients across each panel, at the band's angles.
    """

    band: Band
    coefficients: Array

    @classmethod
    def of(cls, sampled: Band, values: Array) -> BandSeries:
        """The series through values at a band's samples, shape (panels, q, n_angles)."""
        transform = legendre_transform(len(sampled.nodes))
        return cls(sampled, np.einsum("mq,pqj->pmj", transform, values))

    @cached_property
    def values(self) -> Array:
        """The quantity at the band's samples, shape (panels, q, n_angles)."""
        rows = legendre.legvander(self.band.nodes, self.coefficients.shape[1] - 1)
        return np.einsum("qm,pmj->pqj", rows, self.coefficients)

    def at_angles(self, angle: ArrayLike) -> tuple[Array, Array]:
        """Panel edges and coefficients at any screen angles.

        Parameters
        ----------
        angle : array_like (n,)
            [rad]

        Returns
        -------
        offsets : array (panels + 1, n)
            Panel edges as distances from the critical curve [M].
        coefficients : array (panels, m, n)
        """
        weights = trigonometric_weights(len(self.band.angles), np.asarray(angle, dtype=np.float64))
        return self.band.offsets @ weights, self.coefficients @ weights

    def __call__(self, distance: ArrayLike, angle: ArrayLike) -> Array:
        """The quantity at a distance from the screen's origin [M] and a screen angle [rad]; 0 outside the
        band. Broadcast.
        """
        b, phi = np.broadcast_arrays(
            np.asarray(distance, dtype=np.float64), np.asarray(angle, dtype=np.float64)
        )
        offset = (b - self.band.curve(phi)).ravel()
        edges, coefficients = self.at_angles(phi.ravel())
        panel = np.clip(np.sum(offset >= edges[:-1], axis=0) - 1, 0, edges.shape[0] - 2)
        index = np.arange(offset.size)
        low, high = edges[panel, index], edges[panel + 1, index]
        inside = (offset >= edges[0]) & (offset <= edges[-1])
        x = np.where(inside, (2.0 * offset - low - high) / (high - low), 0.0)
        value = legendre.legval(x, coefficients[panel, :, index].T, tensor=False)
        return np.where(inside, value, 0.0).reshape(b.shape)

    @property
    def caution(self) -> float:
        """How many times what the tail across panels holds may lie beyond it."""
        return max(1.0, BEYOND_TAIL * self.coefficients.shape[1])

    def flux(self) -> float:
        """∫ over the band [the quantity's unit times M²]."""
        return float(np.sum(self.band.weight * self.values))

    def tails(self) -> tuple[float, float]:
        """How much is left at the end of the series, across panels and around the screen.

        Returns
        -------
        (float, float)
            What the tail of the Legendre series holds, relative to the largest value; and the largest of three
            things around the screen: what the tail of the trigonometric series holds, relative to the largest
            value, the same for the flux per angle, relative to the flux, and what a shift of the panel edges
            by the tail of theirs does to the quantity.
        """
        values = self.values
        scale = float(np.max(np.abs(values))) or 1.0
        flux = np.sum(self.band.weight * values, axis=(0, 1))
        return (
            self.caution * float(np.max(np.sum(np.abs(self.coefficients[:, -TAIL_TERMS:]), axis=1))) / scale,
            max(
                _tail(values) / scale,
                len(flux) * _tail(flux[None, None]) / (abs(float(flux.sum())) or 1.0),
                self._shift(_tail(self.band.offsets[:, None], each_row=True)) / scale,
            ),
        )

    def error(self) -> float:
        """Estimated error of the interpolant relative to the largest value: both tails, and what the rounding
        of a ray's distance from the origin does in a narrow band.
        """
        scale = float(np.max(np.abs(self.values))) or 1.0
        unit = ROUNDING * float(np.finfo(np.float64).eps)
        moved = self._shift(unit * np.max(np.abs(self.band.edges), axis=1))
        return sum(self.tails()) + moved / scale + unit * len(self.band.angles)

    def without_tails(self) -> BandSeries:
        """The same series cut short where its tails begin, across and around: by how much it differs in what is
        computed from it says how far that can be trusted.
        """
        coefficients = _without_tail(self.coefficients)
        coefficients[:, -TAIL_TERMS:] = 0.0
        return BandSeries(replace(self.band, offsets=_without_tail(self.band.offsets)), coefficients)

    def _shift(self, moved: Array) -> float:
        """Largest change of the quantity if each panel edge moves by a length (panels + 1,) [M]."""
        values = self.values
        ranges = np.max(values, axis=1) - np.min(values, axis=1)
        return float(np.max((moved[1:] + moved[:-1])[:, None] * ranges / self.band.widths))


@cache
def legendre_transform(count: int) -> Array:
    """Matrix (count, count) from values at the Gauss–Legendre nodes to Legendre coefficients."""
    points, weights = gauss_legendre(count)
    degree = np.arange(count)
    return (degree[:, None] + 0.5) * legendre.legvander(points, count - 1).T * weights


def trigonometric_weights(count: int, angle: Array) -> Array:
    """Matrix (count, n) that interpolates values at equally spaced angles, half a step off 0, to any angles.

    The kernel is Dirichlet's for an even number of samples, sin(Nδ/2) cot(δ/2) / N (any text on Fourier series).
    """
    step = 2.0 * np.pi / count
    half = 0.5 * (angle[None, :] - (np.arange(count)[:, None] + 0.5) * step)
    sine = np.sin(half)
    at_sample = np.abs(sine) < np.finfo(np.float64).eps
    with np.errstate(divide="ignore", invalid="ignore"):
        weights = np.sin(count * half) * np.cos(half) / (count * sine)
    return np.where(at_sample, 1.0, weights)


def equally_spaced(rows: Array, count: int) -> Array:
    """Trigonometric interpolation of the last axis, half a step off angle 0, to `count` angles from 0."""
    sampled = rows.shape[-1]
    spectrum: NDArray[np.complex128] = np.fft.rfft(rows, axis=-1)
    shift = np.exp(-1j * np.arange(spectrum.shape[-1]) * np.pi / sampled)
    if sampled % 2 == 0:
        spectrum[..., -1] *= 0.5
    return np.asarray(np.fft.irfft(spectrum * shift, n=count, axis=-1) * (count / sampled))


def _tail(rows: Array, each_row: bool = False) -> Any:
    """What the last Fourier coefficients along the last axis hold together, largest over the second axis, and
    over the first unless each row is asked for.
    """
    sizes = np.max(np.abs(np.fft.rfft(rows, axis=-1)), axis=1)
    count = max(FEWEST_IN_TAIL, int(TAIL_SHARE * sizes.shape[-1]))
    held = 2.0 * np.sum(sizes[:, -count:], axis=1) / rows.shape[-1]
    return held if each_row else float(np.max(held))


def _without_tail(rows: Array) -> Array:
    """The same rows without the last coefficients of their trigonometric series."""
    spectrum = np.fft.rfft(rows, axis=-1)
    spectrum[..., -max(FEWEST_IN_TAIL, int(CUT_SHARE * spectrum.shape[-1])) :] = 0.0
    return np.fft.irfft(spectrum, n=rows.shape[-1], axis=-1)
