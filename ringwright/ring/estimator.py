"""The ring estimator on plain arrays: diameter, width, orientation, asymmetry, central brightness.

Definitions after EHT Collaboration 2019 (paper IV, ApJL 875 L4, section 9, as remembered), with every length
relative to the diameter d, so that a reading in units of θ_g depends on resolution/θ_g alone; the published
lengths are an option. Image (ny, nx) with row 0 south and column 0 east; lengths in any one unit; angles in
radians, east of north.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from ringwright.errors import InputError
from ringwright.kernels import rings
from ringwright.ring.outcomes import RingOutcome
from ringwright.ring.smoothing import FWHM_PER_SIGMA, OVERSAMPLING, Spectrum, Spline, prepare

Array = NDArray[np.float64]

RAYS = 180
SAMPLES_PER_FWHM = 4.0  # along a ray; see CONTENDER in the kernels
PIXELS_PER_FWHM = 3.0  # least that an image must have
SAME_LENGTH = 1e-9  # relative; two lengths closer than this are meant to be the same
CENTRE_REACH = 0.25  # [d] how far the centre may lie from the flux centroid
WIDTH_SHARE = 1.0 / 3.0  # share of the rays that may be unresolved before the width is a limit
DYNAMIC_RANGE = 30.0
# A ring this much smaller than the resolution cannot be told from a blob whose brightest point is off its
# centroid.
SMALLEST_RING = 0.25  # [FWHM]
# First guesses of the diameter: from the flux centroid, which may lie on a bright knot and see peaks nearby only; then
# larger ones, until one leads to a ring.
FIRST_QUANTILE = 0.9
NEAR_GUESS = 0.1  # a guess this near needs no second search: where peaks jump, searching again would drift
GUESSES = 5
NEXT_GUESS = 1.6
# The limits of the search follow the diameter found; it settles in two rounds where there is a ring.
ROUNDS = 3
SETTLED = 1e-6
# Below this a first moment is the sampling error of the spline, and its argument means nothing.
LEAST_ASYMMETRY = 1e-4


@dataclass(frozen=True)
class Lengths:
    """Where the estimator looks: in units of the diameter (`relative`), or in the unit of the image."""

    start: float  # peaks are searched from here
    stop: float  # to here, where the floor is read as well
    disk: float  # radius of the central disk
    relative: bool = True

    def at(self, diameter: float) -> tuple[float, float, float]:
        """The three lengths for a ring of that diameter."""
        scale = diameter if self.relative else 1.0
        return self.start * scale, self.stop * scale, self.disk * scale


RELATIVE = Lengths(0.1, 1.2, 0.125)
# EHT paper IV, section 9, from memory: search from 5 to 50 µas, floor at 50 µas, central disk of 5 µas.
PUBLISHED_UAS = Lengths(5.0, 50.0, 5.0, relative=False)


@dataclass(frozen=True)
class Reading:
    """What the estimator reads: lengths in the unit of the pixel, `orientation` in radians, pure numbers.

    `east`, `north` is the centre from the middle of the image; `scatter` is twice the standard deviation of
    the peak radius around the ring, no uncertainty; `unresolved` is the share of directions without a width.
    """

    outcome: RingOutcome
    east: float = math.nan
    north: float = math.nan
    diameter: float = math.nan
    scatter: float = math.nan
    width: float = math.nan
    orientation: float = math.nan
    asymmetry: float = math.nan
    central_brightness: float = math.nan
    unresolved: float = math.nan


@dataclass(frozen=True)
class _Peaks:
    """Peaks around one centre; lengths in samples of the spline's grid."""

    row: float
    col: float
    radius: Array
    height: Array
    limits: int

    @property
    def diameter(self) -> float:
        return 2.0 * float(self.radius.mean())

    @property
    def spread(self) -> float:
        """σ(r_pk)/⟨r_pk⟩."""
        return float(self.radius.std() / self.radius.mean())


def read_ring(
    image: Array,
    pixel: float,
    resolution: float,
    *,
    beam: float = 0.0,
    averaged: bool = True,
    centre: tuple[float, float] | None = None,
    lengths: Lengths = RELATIVE,
    dynamic_range: float = DYNAMIC_RANGE,
) -> Reading:
    """Bring an image to a resolution and read the ring on it.

    Parameters
    ----------
    image : array (ny, nx)
        Finite brightness or flux per pixel in any unit; row 0 south, column 0 east.
    pixel, resolution, beam : float
        In one unit of length; `resolution` and `beam` (what the image is smoothed to already) are FWHM.
    averaged : bool
        Whether a pixel is the mean over its area; False for samples of a smooth image.
    centre : (east, north), optional
        From the middle of the image; found by the estimator when not given.

    Raises
    ------
    InputError
        For a resolution that is not positive or finer than the beam that the image has.
    """
    check_image(image, pixel, resolution, beam)
    if pixel * PIXELS_PER_FWHM > resolution * (1.0 + SAME_LENGTH):
        return Reading(RingOutcome.TOO_COARSE)
    spectrum = prepare(image, pixel, widest=math.sqrt(max(resolution**2 - beam**2, 0.0)), averaged=averaged)
    return read_blurred(
        spectrum, resolution, beam=beam, centre=centre, lengths=lengths, dynamic_range=dynamic_range
    )


def read_blurred(
    spectrum: Spectrum,
    resolution: float,
    *,
    beam: float = 0.0,
    centre: tuple[float, float] | None = None,
    lengths: Lengths = RELATIVE,
    dynamic_range: float = DYNAMIC_RANGE,
    oversampling: float = OVERSAMPLING,
    rays: int = RAYS,
) -> Reading:
    """`read_ring` for an image that is transformed already, so that many resolutions cost one transform."""
    if not spectrum.total > 0.0:
        return Reading(RingOutcome.EMPTY)
    sigma = math.sqrt(max(resolution**2 - beam**2, 0.0)) / FWHM_PER_SIGMA
    spline = spectrum.blurred(sigma, resolution / oversampling)
    search = _Search(spectrum, spline, resolution / spline.pixel, lengths, rays)
    peaks = search.settle(centre)
    if peaks is None:
        return Reading(RingOutcome.NO_RING)
    return search.judge(peaks, dynamic_range)


def check_image(image: Array, pixel: float, resolution: float, beam: float) -> None:
    """Refuse, with a sentence, what no ring can be read on (an `InputError`)."""
    if image.ndim != 2:
        raise InputError(f"an image has two axes, north and east; this array has {image.ndim}")
    if not (math.isfinite(pixel) and pixel > 0.0):
        raise InputError(f"the size of a pixel must be positive, not {pixel:g}")
    if not (math.isfinite(resolution) and resolution > 0.0):
        raise InputError(f"the resolution must be a positive length (a FWHM), not {resolution:g}")
    if beam > resolution * (1.0 + SAME_LENGTH):
        raise InputError(
            f"the image has a beam of {beam:g} already, coarser than the resolution of {resolution:g} "
            "asked for; ask for the beam of the image or more"
        )
    if not np.isfinite(image).all():
        raise InputError("the image has pixels that are not finite; set blank pixels to zero first")


class _Search:
    """One blurred image under measurement; everything inside is in samples of the spline's grid."""

    def __init__(self, spectrum: Spectrum, spline: Spline, fwhm: float, lengths: Lengths, rays: int) -> None:
        self.spline = spline
        self.fwhm = fwhm
        self.step = fwhm / SAMPLES_PER_FWHM
        scale = 1.0 if lengths.relative else 1.0 / spline.pixel
        self.lengths = replace(
            lengths, start=lengths.start * scale, stop=lengths.stop * scale, disk=lengths.disk * scale
        )
        self.about = self.at(*spectrum.centroid)
        self.field = tuple(side * spectrum.pixel / spline.pixel for side in spectrum.shape)
        angle = 2.0 * np.pi * np.arange(rays) / rays
        self.turn = np.ascontiguousarray([np.cos(angle), -np.sin(angle)])

    def at(self, east: float, north: float) -> tuple[float, float]:
        pixel = self.spline.pixel
        return self.spline.row + north / pixel, self.spline.col - east / pixel

    def samples(self, start: float, stop: float) -> Array:
        return np.empty(max(5, math.ceil((stop - start) / self.step) + 1))

    def peaks(self, row: float, col: float, start: float, stop: float) -> _Peaks:
        radius, height = np.empty((2, self.turn.shape[1]))
        limits = rings.peaks_around(
            self.spline.coefficients,
            row,
            col,
            self.turn,
            start,
            stop,
            self.samples(start, stop),
            radius,
            height,
        )
        return _Peaks(row, col, radius, height, int(limits))

    def first_diameter(self, row: float, col: float) -> float:
        """A first guess from one point out to the end of the field; the least that counts where there is none."""
        found = self.peaks(row, col, 0.0, max(self.field)).radius
        least = SMALLEST_RING * self.fwhm
        found = found[found > 0.5 * least]
        few = found.size < self.turn.shape[1] // 4
        return least if few else 2.0 * float(np.quantile(found, FIRST_QUANTILE))

    def settle(self, centre: tuple[float, float] | None) -> _Peaks | None:
        """Steps 2 and 3: centre and peaks of a ring, or None where no first guess leads to one."""
        guess = self.first_diameter(*(self.at(*centre) if centre else self.about))
        for _ in range(GUESSES):
            peaks = self.settle_from(guess, centre)
            if peaks is not None:
                return peaks
            guess *= NEXT_GUESS
            if guess > max(self.field):
                break
        return None

    def settle_from(self, diameter: float, centre: tuple[float, float] | None) -> _Peaks | None:
        """The roundest ring whose limits of the search agree with its own diameter, from one first guess."""
        best = None
        for _ in range(ROUNDS):
            start, stop, _disk = self.lengths.at(diameter)
            row, col = self.at(*centre) if centre else self.find_centre(diameter, start, stop)
            peaks = self.peaks(row, col, start, stop)
            if peaks.limits > rings.HOPELESS * peaks.radius.size:
                break
            found = self.peaks(row, col, *self.lengths.at(peaks.diameter)[:2])
            agrees = abs(found.diameter / peaks.diameter - 1.0) <= SETTLED
            if agrees and self.is_ring(found) and (best is None or found.spread < best.spread):
                best = found
            if agrees and (centre is not None or self.well_placed(found, diameter)):
                break
            diameter = peaks.diameter
        return best

    def well_placed(self, peaks: _Peaks, guess: float) -> bool:
        """Whether a centre searched for with a guessed diameter is the one that the diameter found would give."""
        away = math.hypot(peaks.row - self.about[0], peaks.col - self.about[1])
        fair = peaks.spread**2 <= rings.FAIR_CIRCLE
        near = abs(guess / peaks.diameter - 1.0) <= NEAR_GUESS
        return (fair or near) and away <= CENTRE_REACH * peaks.diameter * (1.0 + NEAR_GUESS)

    def is_ring(self, peaks: _Peaks) -> bool:
        """Whether peaks surround a darker middle, in (nearly) all directions, in a ring that can be told from a blob."""
        disk = self.lengths.at(peaks.diameter)[2]
        middle = rings.disk_mean(self.spline.coefficients, peaks.row, peaks.col, self.turn, disk)
        return bool(
            peaks.limits <= rings.LIMIT_SHARE * peaks.radius.size
            and peaks.height.min() > middle
            and peaks.diameter > SMALLEST_RING * self.fwhm
        )

    def find_centre(self, diameter: float, start: float, stop: float) -> tuple[float, float]:
        radius, height = np.empty((2, self.turn.shape[1]))
        return rings.find_centre(
            self.spline.coefficients,
            *self.about,
            CENTRE_REACH * diameter,
            self.turn,
            start,
            stop,
            self.samples(start, stop),
            radius,
            height,
        )

    def judge(self, peaks: _Peaks, dynamic_range: float) -> Reading:
        """Step 7 first, then the readings of steps 4 to 6 where there is something to read."""
        outcome = self.outcome(peaks, dynamic_range)
        if not outcome.has_diameter:
            return Reading(outcome)
        reading = self.readings(peaks, outcome)
        if outcome is RingOutcome.RING and reading.unresolved > WIDTH_SHARE:
            return replace(reading, outcome=RingOutcome.WIDTH_LIMIT)
        return reading

    def outcome(self, peaks: _Peaks, dynamic_range: float) -> RingOutcome:
        if self.leaves_field(peaks):
            return RingOutcome.OFF_FIELD
        closed = peaks.height.min() * dynamic_range >= peaks.height.max()
        return RingOutcome.RING if closed else RingOutcome.OPEN

    def leaves_field(self, peaks: _Peaks) -> bool:
        reach = 0.5 * peaks.diameter + self.fwhm
        north = 0.5 * self.field[0] - abs(peaks.row - self.spline.row)
        east = 0.5 * self.field[1] - abs(peaks.col - self.spline.col)
        return reach > min(north, east) * (1.0 + SAME_LENGTH)

    def readings(self, peaks: _Peaks, outcome: RingOutcome) -> Reading:
        coefficients, turn, diameter = self.spline.coefficients, self.turn, peaks.diameter
        row, col, pixel = peaks.row, peaks.col, self.spline.pixel
        _start, outer, disk = self.lengths.at(diameter)
        width, unresolved = rings.mean_width(
            coefficients, row, col, turn, peaks.radius, peaks.height, outer, self.step
        )
        across = self.fwhm if math.isnan(width) else width
        band = max(0.5 * (diameter - across), 0.0), 0.5 * (diameter + across)
        asymmetry, orientation = rings.asymmetry(coefficients, row, col, turn, *band)
        middle = rings.disk_mean(coefficients, row, col, turn, disk)
        around = rings.ring_moments(coefficients, row, col, turn, 0.5 * diameter)[0]
        return Reading(
            outcome=outcome,
            east=(self.spline.col - col) * pixel,
            north=(row - self.spline.row) * pixel,
            diameter=diameter * pixel,
            scatter=2.0 * float(peaks.radius.std()) * pixel,
            width=width * pixel,
            orientation=orientation if asymmetry > LEAST_ASYMMETRY else math.nan,
            asymmetry=asymmetry,
            central_brightness=middle / around,
            unresolved=unresolved / peaks.radius.size,
        )
