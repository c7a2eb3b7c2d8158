"""The light of a scene ready to be shared among pixels: every sampled order on a fine grid of screen angles.

What `ringwright.sampling` found becomes the light held between the origin and any distance, as Chebyshev series
across panels at equally spaced screen angles, fine enough that cubics between them add no error. Lengths in M,
brightness in the emitters' own unit; fluxes are ∫ I dα dβ in that unit times M².
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import cache
from typing import TYPE_CHECKING

import numpy as np
from numpy.polynomial import chebyshev
from numpy.typing import NDArray

from raytrace.contract import Array
from raytrace.kernels.threads import in_blocks
from raytrace.panels import Band, gauss_legendre
from raytrace.series import equally_spaced
from ringwright.kernels.pixels import gather_light, integrate_sides
from ringwright.sampling import SampledLight, needed_terms, sample_light, seen_flux

if TYPE_CHECKING:
    from ringwright.scenes import Scene

# Angles per sampled angle, and the fewest, of the table that is interpolated by cubics: error below 1e-7.
FINER_ANGLES = 4
FEWEST_FINE_ANGLES = 512
# Terms that multiplying by the distance and integrating add to a series.
ADDED_TERMS = 2
# Rows of an image that are worth a thread.
FEWEST_ROWS = 8
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
    held : array (panels + 1, n_angles)
        Light per radian between the origin and each panel edge, nothing hidden.
    coefficients : array (panels, n_angles, m)
        Chebyshev coefficients of the light per radian between a panel's inner edge and a point in it.
    terms : int array (panels,)
        How many of them each panel needs for the accuracy asked for.
    fronts : array (f, 2, n_angles)
        Edges of the opaque crossings in front [M].
    corners : array (c,)
        Screen angles at which edges cross each other [rad].
    flux : float
        All the light of this order that is seen, in or out of any field.
    error : float
        Estimated error of the interpolated brightness, relative to its largest value.
    """

    order: int
    edges: Array
    held: Array
    coefficients: Array
    terms: NDArray[np.int64]
    fronts: Array
    corners: Array
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
        sides = np.zeros((2, ny + 1, nx + 1))
        limits = np.array([self.edges[0].min(), self.edges[-1].max()])
        place = pixel, -0.5 * nx * pixel, -0.5 * ny * pixel, turn, self.edges, limits
        rest = self.held, self.coefficients, self.terms, self.fronts, self.corners
        most = float(self.held[-1].max())
        in_blocks(lambda a, b: integrate_sides(a, b, sides, *place, *rest), ny + 1, least=FEWEST_ROWS)
        in_blocks(
            lambda a, b: gather_light(a, b, image, sides, *place, most, self.fronts), ny, least=FEWEST_ROWS
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
    series = np.einsum("mq,pqj->pmj", chebyshev_transform(len(band.nodes)), sampled.series.values)
    within = _within_panels(series, band)
    held = np.concatenate([np.zeros_like(within[:1, 0]), np.cumsum(within.sum(axis=1), axis=0)])
    edges = _padded(band.edges, angles)
    return LitBand(
        sampled.order,
        edges,
        _padded(held, angles),
        np.ascontiguousarray(np.moveaxis(_padded(within, angles), 1, 2)),
        needed_terms(series, NEGLIGIBLE * accuracy) + ADDED_TERMS,
        np.array([_padded(front, angles) for front in sampled.fronts]).reshape(-1, 2, edges.shape[1]),
        sampled.corners(),
        math.nan if sampled.boundless else seen_flux(sampled),
        sampled.error,
    )


def _within_panels(series: Array, band: Band) -> Array:
    """Chebyshev series (panels, m + 2, n_angles) of ∫ I b db from each panel's inner edge, from those of I.

    By x T_m = (T_{m+1} + T_{|m−1|}) / 2 and the integrals of T_m (NIST DLMF 18.9.1, 18.17).
    """
    half = 0.5 * band.widths[:, None]
    middle = 0.5 * (band.edges[1:] + band.edges[:-1])[:, None]
    product = np.zeros((series.shape[0], series.shape[1] + 1, series.shape[2]))
    product[:, :-1] = series * middle
    product[:, 1:] += 0.5 * half * series
    product[:, :-2] += 0.5 * half * series[:, 1:]
    product[:, 1:2] += 0.5 * half * series[:, :1]
    return np.asarray(half * chebyshev.chebint(product, lbnd=-1, axis=1), dtype=np.float64)


def _padded(rows: Array, count: int) -> Array:
    """Trigonometric interpolation of the last axis to `count` angles from 0, padded by one before and two after."""
    fine = equally_spaced(rows, count)
    return np.concatenate([fine[..., -1:], fine, fine[..., :2]], axis=-1)


@cache
def chebyshev_transform(count: int) -> Array:
    """Matrix (count, count) from values at the Gauss–Legendre nodes to Chebyshev coefficients."""
    points, _ = gauss_legendre(count)
    return np.asarray(np.linalg.inv(chebyshev.chebvander(points, count - 1)), dtype=np.float64)
