"""An image prepared for blurring: transformed once, then blurred on as coarse a grid as each beam needs.

Gaussian beams multiply in the Fourier plane, and a blurred image is band-limited, so its spectrum can be cut
to a grid of a fixed number of samples per FWHM; the same pass turns samples into coefficients of cubic
B-splines (Unser 1999, IEEE Signal Processing Magazine 16, 22). Lengths are in the unit of the pixel that is
given; brightness is in the unit of the image.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy import fft

Array = NDArray[np.float64]

FWHM_PER_SIGMA = math.sqrt(8.0 * math.log(2.0))
# A Gaussian is below 3e-6 of its peak at 2.1 FWHM: with that much dark margin nothing wraps round visibly.
MARGIN = 2.1
# Samples per FWHM of the blurred grid: the spline's error is then 1e-4 of the brightness and 1e-4 FWHM in a
# peak.
OVERSAMPLING = 6.0


@dataclass(frozen=True)
class Spline:
    """A blurred image as B-spline coefficients; `row`, `col`: the middle of the image on their grid."""

    coefficients: Array
    pixel: float
    row: float
    col: float


@dataclass(frozen=True)
class Spectrum:
    """The Fourier transform of a padded image and what must be remembered of the image itself."""

    transform: NDArray[np.complex128]
    size: int  # padded side, odd: no Nyquist row to treat apart
    shape: tuple[int, int]
    pixel: float
    averaged: bool  # pixels hold averages over their area, not samples
    total: float
    centroid: tuple[float, float]  # (east, north) of the middle of the image

    def blurred(self, sigma: float, pixel: float) -> Spline:
        """Convolve with a Gaussian of standard deviation `sigma` and sample about every `pixel`."""
        size = odd_length(self.size * self.pixel / pixel)
        north, east = fft.fftfreq(size), fft.rfftfreq(size)
        response_north = self._response(north * size / self.size, sigma) / _spline_response(north)
        response_east = self._response(east * size / self.size, sigma) / _spline_response(east)
        spectrum = resized(self.transform, self.size, size) * response_north[:, None] * response_east[None, :]
        coefficients = fft.irfft2(spectrum, s=(size, size), overwrite_x=True) * (size / self.size) ** 2
        pixel = self.pixel * self.size / size
        middle = 0.5 * self.pixel / pixel
        return Spline(coefficients, pixel, (self.shape[0] - 1) * middle, (self.shape[1] - 1) * middle)

    def smoothed(self, sigma: float) -> Array:
        """The same, on the pixels of the image itself: for looking at, shape (ny, nx)."""
        north, east = fft.fftfreq(self.size), fft.rfftfreq(self.size)
        beam = self._response(north, sigma)[:, None] * self._response(east, sigma)[None, :]
        whole = fft.irfft2(self.transform * beam, s=(self.size, self.size))
        return np.ascontiguousarray(whole[: self.shape[0], : self.shape[1]])

    def _response(self, frequency: Array, sigma: float) -> Array:
        """Per axis, at frequencies in cycles per pixel: the Gaussian over the pixel's own average."""
        gaussian = np.exp(-2.0 * (np.pi * sigma / self.pixel * frequency) ** 2)
        box = np.where(np.abs(frequency) <= 0.5, np.sinc(frequency), 1.0) if self.averaged else 1.0
        return np.asarray(gaussian / box)


def odd_length(least: float) -> int:
    """The next odd length that transforms fast."""
    length = fft.next_fast_len(max(9, math.ceil(least)))
    while length % 2 == 0:
        length = fft.next_fast_len(length + 1)
    return int(length)


def prepare(image: Array, pixel: float, *, widest: float, averaged: bool) -> Spectrum:
    """Transform an image that will be blurred by at most `widest` (FWHM).

    Parameters
    ----------
    image : array (ny, nx)
        Finite brightness; row 0 south, column 0 east.
    pixel, widest : float
        In the same unit of length.
    averaged : bool
        True where a pixel holds the mean over its area (flux per pixel): that mean is undone, exactly, as the
        image is blurred. False where it holds a sample of a smooth image (flux per beam).
    """
    ny, nx = image.shape
    size = odd_length(max(ny, nx) + MARGIN * widest / pixel)
    bright = np.maximum(image, 0.0)
    total = float(bright.sum())
    east = 0.5 * (nx - 1) - np.arange(nx)
    north = np.arange(ny) - 0.5 * (ny - 1)
    centroid = (0.0, 0.0)
    if total > 0.0:
        centroid = (
            float(bright.sum(axis=0) @ east) / total * pixel,
            float(bright.sum(axis=1) @ north) / total * pixel,
        )
    transform = fft.rfft2(image, s=(size, size))
    return Spectrum(transform, size, (ny, nx), pixel, averaged, total, centroid)


def resized(transform: NDArray[np.complex128], old: int, new: int) -> NDArray[np.complex128]:
    """Cut or extend the transform of an odd-sized real image to another odd size."""
    half = (min(old, new) - 1) // 2
    out = np.zeros((new, new // 2 + 1), dtype=np.complex128)
    out[: half + 1, : half + 1] = transform[: half + 1, : half + 1]
    out[new - half :, : half + 1] = transform[old - half :, : half + 1]
    return out


def _spline_response(frequency: Array) -> Array:
    """Transform of the sampled cubic B-spline, at frequencies in cycles per sample."""
    return np.asarray((2.0 + np.cos(2.0 * np.pi * frequency)) / 3.0)
