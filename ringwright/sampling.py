"""The light of a scene on the screen, sampled where it has structure: every emitter's every order as one band.

Each band is sampled where `raytrace.panels` puts its nodes and shaded there; angles and nodes are doubled until
the tail of the brightness's own series is below the accuracy asked for. Lengths in M, brightness in the
emitters' own unit times their strength; fluxes are ∫ I dα dβ in that unit times M².
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from functools import partial
from itertools import combinations, product
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

import emission as em
import raytrace as rt
from raytrace.contract import Array, Hit
from raytrace.panels import NODES, Band, gauss_legendre, panel_radii
from raytrace.roots import bracketed_roots
from raytrace.screens import FEWEST_ANGLES, resolved
from raytrace.series import BandSeries, equally_spaced, trigonometric_weights
from ringwright.errors import InputError

if TYPE_CHECKING:
    from ringwright.scenes import Scene

# Angles on which crossings of two edges are looked for, per sampled angle: edges that cross twice in between are missed.
SEARCHED = 16
# Accuracies that can be asked for: rounding is near the one, nothing is left of a picture at the other.
FINEST, COARSEST = 1e-12, 0.1
# Estimated errors add up several tails, each below what was asked for; a word is due beyond this multiple of it.
SLACK = 3.0
# A backdrop reaches this much beyond the corner of the field.
BEYOND_CORNER = 1.05


@dataclass(frozen=True)
class SampledLight:
    """One order of one emitter.

    Attributes
    ----------
    order : int
    series : BandSeries
        Brightness, before anything opaque in front hides it.
    fronts : tuple of arrays (2, n)
        Inner and outer edge of each opaque crossing in front, at equally spaced screen angles, half a step
        off 0 [M].
    error : float
        Estimated error of the interpolated brightness relative to its largest value, and of the flux relative
        to the flux.
    boundless : bool
        Whether this is light from infinity, which ends only where the field does.
    """

    order: int
    series: BandSeries
    fronts: tuple[Array, ...]
    error: float
    boundless: bool = False

    def corners(self, edges: Sequence[int] = (0, -1)) -> Array:
        """Screen angles, ascending, at which edges of opaque crossings in front cross each other or some of the
        band's panel edges [rad].
        """
        if not self.fronts:
            return np.empty(0)
        band = self.series.band
        count = SEARCHED * max(len(band.angles), *(front.shape[1] for front in self.fronts))
        curves = [_Curve(row, count) for front in self.fronts for row in front]
        own = [_Curve(band.edges[edge], count) for edge in edges]
        pairs = [*combinations(curves, 2), *product(curves, own)]
        return np.unique(np.concatenate([_crossings(one, other) for one, other in pairs]))


class _Curve:
    """An edge known at equally spaced angles, half a step off 0: on a fine grid, and anywhere."""

    def __init__(self, row: Array, count: int) -> None:
        self.row = row
        fine = equally_spaced(row, count)
        self.grid: Array = np.append(fine, fine[0])

    def __call__(self, angle: Array) -> Array:
        return np.asarray(self.row @ trigonometric_weights(self.row.size, angle), dtype=np.float64)


def _crossings(one: _Curve, other: _Curve) -> Array:
    """Angles at which two edges cross, found where their order changes on the grid."""
    beyond = one.grid > other.grid
    at = np.flatnonzero(beyond[1:] != beyond[:-1])
    if not at.size:
        return np.empty(0)
    step = math.tau / (len(one.grid) - 1)
    low = step * at.astype(np.float64)
    return bracketed_roots(lambda angle, _: one(angle) - other(angle), low, low + step)


def check_accuracy(accuracy: float) -> float:
    """An accuracy that can be asked for, or a sentence.

    Raises
    ------
    InputError
        If it is not a number from 1e-12 to 0.1.
    """
    if not FINEST <= accuracy <= COARSEST:
        raise InputError(
            f"an accuracy of {accuracy:g} is not a relative error from {FINEST:g} to {COARSEST:g}; 1e-5 suits pictures, 1e-7 "
            "photon rings"
        )
    return float(accuracy)


def accuracy_note(errors: Iterable[float], accuracy: float) -> tuple[str, ...]:
    """A sentence where brightness could not be interpolated to what was asked for; nothing where it could."""
    worst = max(errors, default=0.0)
    if worst <= SLACK * accuracy:
        return ()
    return (f"brightness is interpolated to {worst:.1g} of its maximum, not to the {accuracy:.1g} asked for",)


def seen_flux(light: SampledLight) -> float:
    """∫ I dα dβ of what nothing opaque hides [the brightness's unit times M²]."""
    if not light.fronts:
        return light.series.flux()
    from ringwright.lightwaves import visibility  # which stands on this module, and few scenes need

    at_zero = np.zeros(1)
    return float(visibility(light, wavenumber=at_zero, turn=at_zero)[0].real)


def flux_scale(scene: Scene, total: float) -> float:
    """What takes light in the emitters' own unit to the scene's: Jy, or shares of the light.

    Raises
    ------
    InputError
        If there is no light at all.
    """
    if not total > 0.0:
        raise InputError(
            f"no light of '{scene.name}' reaches the observer: every emitter is dark; raise a strength or widen a disk"
        )
    return (1.0 if scene.total_flux is None else float(scene.total_flux.to_value("Jy"))) / total


def needed_terms(series: Array, share: float) -> NDArray[np.int64]:
    """How many terms each panel of a series (panels, m, n_angles) needs so that what is dropped is below a share of
    the largest term of all.
    """
    size = np.max(np.abs(series), axis=2)
    needed = size > share * float(np.max(size))
    return np.where(needed.any(axis=1), size.shape[1] - np.argmax(needed[:, ::-1], axis=1), 1).astype(
        np.int64
    )


def sample_light(scene: Scene, *, accuracy: float) -> tuple[SampledLight, ...]:
    """Sample and shade every order of every emitter of a scene.

    Parameters
    ----------
    scene : Scene
    accuracy : float
        Largest interpolation error allowed, relative to the brightest point of each order.

    Returns
    -------
    tuple of SampledLight
        Emitter by emitter, order by order; its `error` says what was reached.
    """
    found: list[SampledLight] = []
    for strength, emitter in scene.emitters:
        if emitter.edges:
            found += _orders(scene, strength, emitter, accuracy)
        else:
            found.append(_sky(scene, strength, emitter))
    return tuple(found)


def _orders(
    scene: Scene, strength: float, emitter: em.contract.Emitter, accuracy: float
) -> list[SampledLight]:
    radii = panel_radii(emitter.edges, scene.spacetime)
    found: list[SampledLight] = []
    fronts: list[Array] = []
    for order in range(scene.orders):
        series = resolved(
            radii,
            lambda sampled: strength * _brightness(scene, emitter, sampled),
            order=order,
            inclination=scene.inclination,
            tolerance=accuracy,
            spacetime=scene.spacetime,
        )
        found.append(SampledLight(order, series, tuple(fronts) if emitter.opaque else (), series.error()))
        fronts.append(series.band.edges[[0, -1]])
    return found


def _brightness(scene: Scene, emitter: em.contract.Emitter, sampled: Band) -> Array:
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


def _sky(scene: Scene, strength: float, emitter: em.contract.Emitter) -> SampledLight:
    """Light from infinity: everything outside the critical curve, to beyond the corner of the field."""
    angles = (np.arange(FEWEST_ANGLES, dtype=np.float64) + 0.5) * (2.0 * math.pi / FEWEST_ANGLES)
    curve = partial(scene.spacetime.critical_radius, scene.inclination)
    critical = curve(angles)
    outer = BEYOND_CORNER * max(scene.field_m, 4.0 * float(np.max(critical)))
    offsets = np.stack([np.zeros_like(critical), outer - critical])
    sky = Band(0, np.array([0.0, 1.0]), angles, offsets, curve, *gauss_legendre(NODES))
    series = BandSeries.of(sky, strength * _brightness(scene, emitter, sky))
    return SampledLight(0, series, (), 0.0, boundless=True)
