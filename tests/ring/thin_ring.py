"""The exact blurred thin ring that ring readings are held against.

I ∝ exp(−(r² + R²)/2σ²) I0(rR/σ²) (exact; checked independently in arbitrary precision); for a ring
whose brightness goes as 1 + A cos(θ − η) the same with A cos(θ − η) I1 added (convolution of a plane ring
with a Gaussian, Jacobi–Anger).
"""

from __future__ import annotations

import math

import numpy as np
from scipy.optimize import brentq, minimize_scalar
from scipy.special import ive

FWHM_PER_SIGMA = math.sqrt(8.0 * math.log(2.0))


def profile(r, radius, fwhm, mode=0):
    sigma = fwhm / FWHM_PER_SIGMA
    return np.exp(-((r - radius) ** 2) / (2.0 * sigma**2)) * ive(mode, r * radius / sigma**2)


def blurred_ring(n, pixel, diameter, fwhm, east=0.0, north=0.0, asymmetry=0.0, orientation=0.0):
    """Samples at pixel centres of the blurred ring; row 0 south, column 0 east."""
    e = (0.5 * (n - 1) - np.arange(n))[None, :] * pixel - east
    v = (np.arange(n) - 0.5 * (n - 1))[:, None] * pixel - north
    r, angle = np.hypot(e, v), np.arctan2(e, v)
    flat = profile(r, 0.5 * diameter, fwhm)
    return flat + asymmetry * np.cos(angle - orientation) * profile(r, 0.5 * diameter, fwhm, mode=1)


def averaged_ring(n, pixel, *args, parts=6, **options):
    """The same, averaged over the area of each pixel as a rendered image is."""
    fine = blurred_ring(n * parts, pixel / parts, *args, **options)
    return fine.reshape(n, parts, n, parts).mean(axis=(1, 3))


def exact_readings(fwhm, floor=True):
    """(diameter, width) of a ring of true diameter 1; width above the floor at 1.2 diameters, or above 0."""
    options = {"xatol": 1e-12}
    best = minimize_scalar(
        lambda r: -profile(r, 0.5, fwhm), None, (0.05, 0.6), method="bounded", options=options
    )
    peak, outer = best.x, 2.4 * best.x
    level = 0.5 * (profile(peak, 0.5, fwhm) + floor * profile(outer, 0.5, fwhm))

    def above(r):
        return profile(r, 0.5, fwhm) - level

    inner = brentq(above, 0.0, peak) if above(0.0) < 0.0 else math.nan
    return 2.0 * peak, brentq(above, peak, 2.0 * outer) - inner
