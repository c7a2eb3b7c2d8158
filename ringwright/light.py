"""The light of a scene ready to be shared among pixels: every sampled order on a fine grid of screen angles.

What `ringwright.sampling` found becomes Chebyshev series across panels at equally spaced screen angles, fine
enough that cubics between them add no error. Lengths in M, brightness in the emitters' own unit; fluxes are
∫ I dα dβ in that unit times M².
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from functools import cache
from typing import TYPE_CHECKING

import numpy as np
from numpy.polynomial import chebyshev
from numpy.typing import NDArray

from raytrace.contract import Array
from raytrace.panels import gauss_legendre
from raytrace.series import equally_spaced
from ringwright.kernels.pixels import gather_light
from ringwright.sampling import SampledLight, sample_light

if TYPE_CHECKING:
    from ringwright.scenes import Scene

# Angles per sampled angle, and the fewest, of the table that is interpolated by cubics: error below 1e-7.
FINER_ANGLES = 4
FEWEST_FINE_ANGLES = 512
# Side in pixels of the throw-away image on which light that lower orders hide in part is added up.
COVER_PIXELS = 64
# Terms below this share of the accuracy asked for, relative to the largest, are dropped.
NEGLIGIBLE = 0.03


@dataclass(frozen=True)
class LitBand:
    """One order of one emitter, ready to be shared among pixels.

    Attributes
    ----------
    order : int
    edges : array (panels + 1, n_angles)
        Panel edges against screen angle, from angle 0, padded by one before and two after [M].
    coefficients : array (panels, n_angles, m)
        Chebyshev coefficients of the brightness across each panel.
    terms : int array (panels,)
        How many of them each panel needs for the accuracy asked for.
    blockers : array (m, 2, n_angles)
        Edges of the opaque crossings in front [M].
    flux : float
        All the light of this order, in or out of any field.
    error : float
        Estimated error of the interpolated brightness, relative to its largest value.
    """

    order: int
    edges: Array
    coefficients: Array
    terms: NDArray[np.int64]
    blockers: Array
    flux: float
    error: float

    @property
    def width(self) -> float:
        """Median over screen angle of the distance between the band's edges [M]."""
        return float(np.median(self.edges[-1] - self.edges[0]))

    def add_to(self, image: Array, pixel: float, turn: float) -> None:
        """Add this light to an image (ny, nx) centred on the hole; `turn` is the position angle of +β
        [rad].
        """
        ny, nx = image.shape
        gather_light(
            image,
            pixel,
            -0.5 * nx * pixel,
            -0.5 * ny * pixel,
            turn,
            self.edges,
            _limits(self.edges[[0, -1]]),
            self.coefficients,
            self.terms,
            self.blockers,
            _limits(self.blockers),
        )


def light_up(scene: Scene, *, accuracy: float) -> tuple[LitBand, ...]:
    """Sample and shade every order of every emitter of a scene and make it ready for pixels.

    Parameters
    ----------
    scene : Scene
    accuracy : float
        Largest interpolation error allowed, relative to the brightest point of each order.

    Returns
    -------
    tuple of LitBand
        Brightness is multiplied by each emitter's strength; a band's `error` says what was reached.
    """
    return tuple(lit_band(sampled, accuracy) for sampled in sample_light(scene, accuracy=accuracy))


def lit_band(sampled: SampledLight, accuracy: float) -> LitBand:
    """One sampled order on a fine grid of angles."""
    band = sampled.series.band
    angles = max(FEWEST_FINE_ANGLES, FINER_ANGLES * len(band.angles))
    edges = _padded(band.edges, angles)
    blockers = [_padded(front, angles) for front in sampled.fronts]
    series = np.einsum("mq,pqj->pmj", chebyshev_transform(len(band.nodes)), sampled.series.values)
    lit = LitBand(
        sampled.order,
        edges,
        np.ascontiguousarray(np.moveaxis(_padded(series, angles), 1, 2)),
        _needed_terms(series, NEGLIGIBLE * accuracy),
        np.array(blockers).reshape(-1, 2, edges.shape[1]),
        math.nan if sampled.boundless else sampled.series.flux(),
        sampled.error,
    )
    return _with_hidden_light_removed(lit) if blockers else lit


def _with_hidden_light_removed(lit: LitBand) -> LitBand:
    """The same band with its flux added up on an image that covers it, where lower orders hide part of it."""
    side = 2.0 * float(np.max(lit.edges[-1]))
    cover = np.zeros((COVER_PIXELS, COVER_PIXELS))
    lit.add_to(cover, side / COVER_PIXELS, 0.0)
    return replace(lit, flux=float(np.sum(cover)))


def _needed_terms(series: Array, share: float) -> NDArray[np.int64]:
    """How many terms each panel needs so that what is dropped is below a share of the largest term of all."""
    size = np.max(np.abs(series), axis=2)
    needed = size > share * float(np.max(size))
    return np.where(needed.any(axis=1), size.shape[1] - np.argmax(needed[:, ::-1], axis=1), 1).astype(
        np.int64
    )


def _padded(rows: Array, count: int) -> Array:
    """Trigonometric interpolation of the last axis to `count` angles from 0, padded by one before and two after."""
    fine = equally_spaced(rows, count)
    return np.concatenate([fine[..., -1:], fine, fine[..., :2]], axis=-1)


@cache
def chebyshev_transform(count: int) -> Array:
    """Matrix (count, count) from values at the Gauss–Legendre nodes to Chebyshev coefficients."""
    points, _ = gauss_legendre(count)
    return np.asarray(np.linalg.inv(chebyshev.chebvander(points, count - 1)), dtype=np.float64)


def _limits(edges: Array) -> Array:
    """Least and greatest along the last axis."""
    return np.stack([edges.min(axis=-1), edges.max(axis=-1)], axis=-1)
