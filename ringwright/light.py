"""The light of a scene on the screen, before any pixel: every emitter's every order as a band of smooth panels.

Each band is sampled where `raytrace.screens` puts its nodes, shaded there, and kept as Chebyshev series
across its panels at equally spaced screen angles; angles and nodes are doubled until the tail of the series
is below the accuracy asked for. Lengths in M, brightness in the emitters' own unit; fluxes are ∫ I dα dβ in
that unit times M².
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from functools import cache
from typing import TYPE_CHECKING

import numpy as np
from numpy.polynomial import chebyshev
from numpy.typing import NDArray

import emission as em
import raytrace as rt
from raytrace.contract import Array, Hit, Spacetime
from raytrace.screens import (
    FEWEST_ANGLES,
    NODES,
    Band,
    band,
    gauss_legendre,
    panel_radii,
    refined,
    tails,
)
from ringwright.kernels.pixels import gather_light

if TYPE_CHECKING:
    from ringwright.scenes import Scene

# Angles per sampled angle, and the fewest, of the table that is interpolated by cubics: error below 1e-7.
FINER_ANGLES = 4
FEWEST_FINE_ANGLES = 512
# Side in pixels of the throw-away image on which light that lower orders hide in part is added up.
COVER_PIXELS = 64
# Terms below this share of the accuracy asked for, relative to the largest, are dropped.
NEGLIGIBLE = 0.03
# A backdrop reaches this much beyond the corner of the field.
BEYOND_CORNER = 1.05


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
    """Sample and shade every order of every emitter of a scene.

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
    bands: list[LitBand] = []
    for strength, emitter in scene.emitters:
        if emitter.edges:
            bands += _lit_orders(scene, strength, emitter, accuracy)
        else:
            bands.append(_lit_sky(scene, strength, emitter))
    return tuple(bands)


def _lit_orders(
    scene: Scene, strength: float, emitter: em.contract.Emitter, accuracy: float
) -> list[LitBand]:
    radii = panel_radii(emitter.edges, scene.spacetime)
    lit: list[LitBand] = []
    fronts: list[Array] = []
    for order in range(scene.orders):
        sampled, brightness, error = _sampled(scene, emitter, radii, order, accuracy)
        angles = max(FEWEST_FINE_ANGLES, FINER_ANGLES * len(sampled.angles))
        edges = _around(sampled.edges, angles)
        blockers = [_around(front, angles) for front in fronts] if emitter.opaque else []
        series = np.einsum("mq,pqj->pmj", chebyshev_transform(len(sampled.nodes)), strength * brightness)
        band_ = LitBand(
            order,
            edges,
            np.ascontiguousarray(np.moveaxis(_around(series, angles), 1, 2)),
            _needed_terms(series, NEGLIGIBLE * accuracy),
            np.array(blockers).reshape(-1, 2, edges.shape[1]),
            strength * float(np.sum(sampled.weight * brightness)),
            error,
        )
        lit.append(band_ if not blockers else _with_hidden_light_removed(band_))
        fronts.append(sampled.edges[[0, -1]])
    return lit


def _sampled(
    scene: Scene, emitter: em.contract.Emitter, radii: Array, order: int, accuracy: float
) -> tuple[Band, Array, float]:
    """Double angles or nodes until the tails of the brightness are below the accuracy or a limit is
    reached.
    """
    sampled = band(
        radii, order=order, inclination=scene.inclination, angles=FEWEST_ANGLES, spacetime=scene.spacetime
    )
    while True:
        brightness = _shaded(scene, emitter, sampled)
        across, around = tails(sampled, brightness)
        finer = refined(sampled, across, around, accuracy, scene.inclination, scene.spacetime)
        if finer is None:
            return sampled, brightness, max(across, around)
        sampled = finer


def _shaded(scene: Scene, emitter: em.contract.Emitter, sampled: Band) -> Array:
    hit = rt.trace(
        sampled.alpha.ravel(),
        sampled.beta.ravel(),
        inclination=scene.inclination,
        orders=sampled.order + 1,
        spacetime=scene.spacetime,
        azimuth=False,
        delay=False,
    )
    return shaded(scene, emitter, hit.only(sampled.order)).reshape(sampled.shape)


def shaded(scene: Scene, emitter: em.contract.Emitter, hit: Hit) -> Array:
    """Total intensity of an emitter at crossings that are known: array of the shape of one Stokes plane."""
    frequency = None if scene.frequency is None else float(scene.frequency.to_value("Hz"))
    return em.shade(emitter, hit, spacetime=scene.spacetime, frequency=frequency)[0]


def _lit_sky(scene: Scene, strength: float, emitter: em.contract.Emitter) -> LitBand:
    """Light from infinity: everything outside the critical curve, to beyond the corner of the field."""
    angles = (np.arange(FEWEST_ANGLES, dtype=np.float64) + 0.5) * (2.0 * math.pi / FEWEST_ANGLES)
    inner = _critical(scene.spacetime, scene.inclination, angles)
    outer = np.full_like(inner, BEYOND_CORNER * max(scene.field_m, 4.0 * float(np.max(inner))))
    points, weights = gauss_legendre(NODES)
    sky = Band(0, np.array([0.0, 1.0]), angles, np.stack([inner, outer]), points, weights)
    brightness = strength * _shaded(scene, emitter, sky)
    series = np.einsum("mq,pqj->pmj", chebyshev_transform(NODES), brightness)
    coefficients = np.ascontiguousarray(np.moveaxis(_around(series, FEWEST_FINE_ANGLES), 1, 2))
    edges = _around(sky.edges, FEWEST_FINE_ANGLES)
    return LitBand(0, edges, coefficients, np.array([1]), np.empty((0, 2, edges.shape[1])), math.nan, 0.0)


def _critical(spacetime: Spacetime, inclination: float, angles: Array) -> Array:
    return np.asarray(rt.critical_curve(spacetime=spacetime, inclination=inclination, angle=angles))


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


def _around(rows: Array, count: int) -> Array:
    """Trigonometric interpolation of the last axis, half a step off angle 0, to `count` angles from 0,
    padded.
    """
    sampled = rows.shape[-1]
    spectrum = np.fft.rfft(rows, axis=-1)
    shift = np.exp(-1j * np.arange(spectrum.shape[-1]) * math.pi / sampled)
    if sampled % 2 == 0:
        spectrum[..., -1] *= 0.5
    rows = np.fft.irfft(spectrum * shift, n=count, axis=-1) * (count / sampled)
    return np.concatenate([rows[..., -1:], rows, rows[..., :2]], axis=-1)


@cache
def chebyshev_transform(count: int) -> Array:
    """Matrix (count, count) from values at the Gauss–Legendre nodes to Chebyshev coefficients."""
    points, _ = gauss_legendre(count)
    return np.asarray(np.linalg.inv(chebyshev.chebvander(points, count - 1)), dtype=np.float64)


def _limits(edges: Array) -> Array:
    """Least and greatest along the last axis."""
    return np.stack([edges.min(axis=-1), edges.max(axis=-1)], axis=-1)
