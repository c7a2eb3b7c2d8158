"""The visibility of a scene's light straight from the screen: no pixel, no grid, any baseline.

V(u, v) = ∬ I exp[−2πi(ux + vy)] dx dy with x to the east and y to the north. Panel by panel the radial integral is
closed (`ringwright.kernels.fourier`) and the angular one a sum over equally spaced angles, as many as the phase
turns; where many baselines share a direction, samples of a panel's series along it and a fast transform in one
dimension do the same sooner. Rays are not traced again, however long the baseline. Wavenumbers are 2π u GM/(c²D) [rad per M]; results are
in the brightness's unit times M².
"""

from __future__ import annotations

import itertools
import math
from collections.abc import Sequence
from dataclasses import replace
from functools import partial
from typing import NamedTuple

import numpy as np
from numpy.polynomial import legendre
from numpy.typing import NDArray

from raytrace.contract import Array
from raytrace.kernels import threads
from raytrace.panels import gauss_legendre
from raytrace.series import BandSeries, equally_spaced, legendre_transform, trigonometric_weights
from ringwright.errors import InputError
from ringwright.kernels.fourier import add_panel
from ringwright.sampling import SampledLight, needed_terms

Complex = NDArray[np.complex128]
Panels = NDArray[np.int64]
# A sum over N equally spaced angles is exact for phases that turn less than N times; beyond κb their spectrum, that
# of J_m(κb), falls off within a few (κb)^⅓.
FALL_OFF = 10.0
FEWEST = 24
# In every direction with enough baselines a panel is summed as samples along that direction: Gauss–Legendre rules
# of so many nodes on pieces across which the phase turns by at most so many radians either way (error below 1e-13).
PIECE_NODES = 48
PIECE_PHASE = 40.0
# A sample costs about as much as half a baseline's closed form at one angle.
SAMPLES_PER_BASELINE = 2.0
# Samples held at a time, and the error of the fast transform relative to the light: its finest.
SAMPLES_AT_A_TIME = 1 << 20
TRANSFORM_ACCURACY = 1e-13
# Baselines integrated together have lengths within this factor and share one number of angles.
BLOCK_RATIO = 1.25
# Gauss–Legendre nodes on a piece of an arc between crossings, and the radians of phase that one such piece may hold.
ARC_NODES = 24
ARC_PHASE = 14.0
# Share of the flux to which sums and transforms are exact.
ROUNDING = 1e-12
# Legendre terms below this share of the error that the light has anyway are left out.
NEGLIGIBLE = 0.01


class Part(NamedTuple):
    """A part of a panel that is seen: edges (angles,) [M], Legendre coefficients (terms, angles) between them, and a
    rule for the sum over angles.
    """

    low: Array
    high: Array
    coefficients: Array
    angle: Array
    weight: Array


def visibility(light: SampledLight, *, wavenumber: Array, turn: Array) -> Complex:
    """Visibility of one order of one emitter.

    Parameters
    ----------
    light : SampledLight
    wavenumber : array (n,)
        2π u GM/(c²D) [rad per M], from 0.
    turn : array (n,)
        Position angle of the scene's +β less that of the baseline [rad].

    Returns
    -------
    complex array (n,)
        In the brightness's unit times M²; at 0 the flux.

    Raises
    ------
    InputError
        If the light has no edge and fills the field.
    """
    if light.boundless:
        raise InputError(
            "light from infinity fills whatever field is drawn and has no visibility of its own; leave the backdrop out"
        )
    found = np.zeros(wavenumber.size, dtype=np.complex128)
    panels = light.series.coefficients.shape[0]
    corners = [light.corners((panel, panel + 1)) for panel in range(panels)]
    alone = np.ones((panels, *wavenumber.shape), dtype=bool)
    tasks = []
    for direction in np.unique(turn):
        same = np.flatnonzero(turn == direction)
        for panel in _worth_sampling(light, wavenumber[same]):
            tasks.append((same, panel, direction))
            alone[panel, same] = False
    parts: list[Complex] = [found] * len(tasks)

    def work(first: int, last: int) -> None:
        for k in range(first, last):
            same, panel, direction = tasks[k]
            parts[k] = _along(light, panel, corners[panel], wavenumber[same], direction)

    threads.in_blocks(work, len(tasks), least=1)
    for (same, _, _), part in zip(tasks, parts, strict=True):
        found[same] += part
    return found + _in_closed_form(light, corners, alone, wavenumber, turn)


def interpolation_error(
    light: SampledLight, *, wavenumber: Array, turn: Array, whole: Complex | None = None
) -> Array:
    """Estimated error of `visibility`: what the tails of the light's series contribute and may leave out, and
    rounding; shape (n,). `whole` is the visibility itself where it is known already.
    """
    without = replace(light, series=light.series.without_tails())
    if whole is None:
        whole = visibility(light, wavenumber=wavenumber, turn=turn)
    contributed = np.abs(whole - visibility(without, wavenumber=wavenumber, turn=turn))
    longest_first = np.argsort(-wavenumber, kind="stable")
    found = np.empty_like(contributed)
    # Tails vanish by chance on single baselines, and on the shortest by symmetry: a baseline is trusted no further
    # than those beyond it.
    found[longest_first] = np.maximum.accumulate(contributed[longest_first])
    return light.series.caution * found + ROUNDING * light.series.flux()


def _worth_sampling(light: SampledLight, wavenumber: Array) -> Panels:
    """Panels that need fewer samples across than these baselines make worthwhile."""
    half = 0.5 * np.max(light.series.band.widths, axis=1)
    across = PIECE_NODES * np.ceil(float(np.max(wavenumber)) * half / PIECE_PHASE)
    return np.flatnonzero(across < SAMPLES_PER_BASELINE * wavenumber.size)


def _along(light: SampledLight, panel: int, corners: Array, wavenumber: Array, direction: float) -> Complex:
    """What a panel contributes to baselines of one direction: its samples, projected on that direction."""
    import finufft

    longest = float(np.max(wavenumber))
    angles = _angles(longest * _reach(light.series)[panel], len(light.series.band.angles))
    found = np.zeros(wavenumber.size, dtype=np.complex128)
    for part in _visible(light, panel, angles, corners):
        pieces = max(1, math.ceil(0.5 * longest * float(np.max(part.high - part.low)) / PIECE_PHASE))
        x, weights = _composite(PIECE_NODES, pieces, -1.0, 1.0)
        rows = legendre.legvander(x, part.coefficients.shape[0] - 1)
        chunk = max(1, SAMPLES_AT_A_TIME // x.size)
        for start in range(0, part.low.size, chunk):
            low, high, coefficients, angle, weight = (each[..., start : start + chunk] for each in part)
            half = 0.5 * (high - low)
            b = 0.5 * (low + high) + half * x[:, None]
            flux = (rows @ coefficients) * b * half * weights[:, None] * weight
            place = b * np.sin(angle + direction)
            found += finufft.nufft1d3(
                place.ravel(),
                flux.ravel().astype(np.complex128),
                wavenumber,
                isign=-1,
                eps=TRANSFORM_ACCURACY,
                nthreads=1,
            )
    return found


def _composite(nodes: int, pieces: int, start: float, stop: float) -> tuple[Array, Array]:
    """Points and weights of Gauss–Legendre rules on equal pieces of an interval."""
    points, weights = gauss_legendre(nodes)
    half = 0.5 * (stop - start) / pieces
    middles = start + half * (2.0 * np.arange(pieces) + 1.0)
    return (middles[:, None] + half * points).ravel(), np.tile(half * weights, pieces)


def _in_closed_form(
    light: SampledLight,
    corners: Sequence[Array],
    chosen: NDArray[np.bool_],
    wavenumber: Array,
    turn: Array,
) -> Complex:
    """What each panel contributes to the baselines chosen for it (panels, n), one by one."""
    found = np.zeros((2, wavenumber.size))
    reach = _reach(light.series)
    for panel in range(chosen.shape[0]):
        index = np.flatnonzero(chosen[panel])
        index = index[np.argsort(wavenumber[index], kind="stable")]
        for block in _blocks(wavenumber[index]):
            some = index[block]
            angles = _angles(float(wavenumber[some[-1]]) * reach[panel], len(light.series.band.angles))
            for part in _visible(light, panel, angles, corners[panel]):
                middle, half = 0.5 * (part.low + part.high), 0.5 * (part.high - part.low)
                rows = np.ascontiguousarray(_times_distance(part.coefficients, middle, half).T)
                added = np.zeros((2, some.size))
                panel_of = (wavenumber[some], turn[some], middle, half, rows, part.angle, part.weight)
                threads.in_blocks(partial(_add, added, panel_of), some.size, least=1)
                found[:, some] += added
    return found[0] + 1j * found[1]


def _add(added: Array, panel: tuple[Array, ...], first: int, last: int) -> None:
    add_panel(first, last, *added, *panel)


def _blocks(ascending: Array) -> list[slice]:
    """Runs of baselines that share one number of angles."""
    blocks, start = [], 0
    while start < ascending.size:
        limit = max(BLOCK_RATIO * float(ascending[start]), 1.0)
        stop = max(int(np.searchsorted(ascending, limit, side="right")), start + 1)
        blocks.append(slice(start, stop))
        start = stop
    return blocks


def _angles(phase: float, sampled: int) -> int:
    """How many angles a phase of so many radians, on top of the light's own structure, asks for."""
    return math.ceil(phase + FALL_OFF * phase ** (1.0 / 3.0)) + sampled + FEWEST


def _reach(series: BandSeries) -> Array:
    """Fastest turn of a phase around each panel per wavenumber, max √(b² + b'²) [M], shape (panels,)."""
    edges = series.band.edges
    spectrum = np.fft.rfft(edges, axis=-1)
    slope = np.fft.irfft(1j * np.arange(spectrum.shape[-1]) * spectrum, n=edges.shape[-1], axis=-1)
    fastest = np.max(np.hypot(edges, slope), axis=-1)
    return np.maximum(fastest[:-1], fastest[1:])


def _times_distance(coefficients: Array, middle: Array, half: Array) -> Array:
    """Legendre coefficients of brightness × (middle + half x), signed (−1)^⌊l/2⌋, one more than before.

    By x P_l = [(l + 1) P_{l+1} + l P_{l−1}] / (2l + 1) (NIST DLMF 18.9.1).
    """
    count, angles = coefficients.shape
    degree = np.arange(count)[:, None]
    product = np.zeros((count + 1, angles))
    product[:count] = coefficients * middle
    product[1:] += coefficients * half * (degree + 1) / (2 * degree + 1)
    product[: count - 1] += (coefficients * half * degree / (2 * degree + 1))[1:]
    signs = np.where(np.arange(count + 1) // 2 % 2 == 0, 1.0, -1.0)
    return product * signs[:, None]


def _visible(light: SampledLight, panel: int, angles: int, corners: Array) -> list[Part]:
    """The parts of a panel that nothing opaque hides, at so many angles or, cut by something in front at some corners,
    more.
    """
    if not corners.size:
        angle = math.tau / angles * np.arange(angles, dtype=np.float64)
        weight = np.full(angles, math.tau / angles)
        return _left_open(light, _whole(light, panel, angle, weight))
    ends = np.append(corners, corners[0] + math.tau)
    arcs = [_arc(start, stop, angles) for start, stop in itertools.pairwise(ends)]
    return [part for arc in arcs for part in _left_open(light, _whole(light, panel, *arc))]


def _whole(light: SampledLight, panel: int, angle: Array, weight: Array) -> Part:
    """A whole panel at some angles."""
    series = light.series
    terms = needed_terms(series.coefficients, NEGLIGIBLE * light.error)[panel]
    rows = np.concatenate([series.band.offsets[panel : panel + 2], series.coefficients[panel, :terms]])
    found = _at(rows, angle)
    low, high = series.band.curve(angle) + found[:2]
    return Part(low, high, found[2:], angle, weight)


def _at(rows: Array, angle: Array) -> Array:
    """Trigonometric interpolation of rows, by the fast transform where the angles are equally spaced from 0."""
    step = math.tau / angle.size
    if angle.size >= rows.shape[-1] and angle[0] == 0.0 and angle[-1] == step * (angle.size - 1):
        return equally_spaced(rows, angle.size)
    return rows @ trigonometric_weights(rows.shape[-1], angle)


def _arc(start: float, stop: float, angles: int) -> tuple[Array, Array]:
    """Angles and weights of a composite Gauss–Legendre rule on an arc, as dense as so many angles a turn."""
    pieces = math.ceil((stop - start) * angles / (math.tau * ARC_PHASE))
    return _composite(ARC_NODES, pieces, start, stop)


def _left_open(light: SampledLight, whole: Part) -> list[Part]:
    """What opaque crossings in front leave of a panel; on each arc they lie to its edges in one way."""
    if not light.fronts:
        return [whole]
    parts = [(whole.low, whole.high)]
    for front in light.fronts:
        inner, outer = _at(front, whole.angle)
        parts = [
            piece
            for low, high in parts
            for piece in ((low, np.clip(inner, low, high)), (np.clip(outer, low, high), high))
        ]
    return [
        Part(low, high, _on_part(whole, low, high), whole.angle, whole.weight)
        for low, high in parts
        if np.any(high > low)
    ]


def _on_part(whole: Part, low: Array, high: Array) -> Array:
    """Legendre coefficients of a panel's series on a part of it, angle by angle."""
    nodes = whole.coefficients.shape[0]
    points, _ = gauss_legendre(nodes)
    b = 0.5 * (low + high) + 0.5 * (high - low) * points[:, None]
    x = (2.0 * b - whole.low - whole.high) / (whole.high - whole.low)
    values = np.asarray(legendre.legval(x, whole.coefficients[:, None, :], tensor=False), dtype=np.float64)
    return legendre_transform(nodes) @ values
