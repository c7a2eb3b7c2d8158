"""Fourier integrals over a panel of light: the radial part in closed form, the angular part by equally spaced angles.

Across a panel brightness times distance is a Legendre series, and ∫ P_l(x) e^{−iωx} dx = 2 (−i)^l j_l(ω) over
(−1, 1) (NIST DLMF 10.54.2 with 18.17.19), so that however many wavelengths a panel spans, it costs one spherical
Bessel recurrence per angle. Lengths in M, wavenumbers in radians per M.
"""

import math

import numpy as np

from raytrace.kernels.compiling import kernel

# Below this j_l is its power series to two terms, and terms beyond the fifth are below 1e-16.
NEARLY_NONE = 1e-3
# The downward recurrence starts this many orders above the highest one wanted: errors fall below 1e-16.
HEADROOM = 26
TINY = 1e-300


@kernel()
def _power_series(omega, row, count):
    """Σ s_l j_l(ω) over even and over odd l for small ω."""
    square = omega * omega
    even, odd = row[0] * (1.0 - square / 6.0 * (1.0 - square / 20.0)), 0.0
    power = 1.0
    for order in range(1, min(count, 5)):
        power *= omega / (2.0 * order + 1.0)
        value = power * (1.0 - square / (4.0 * order + 6.0))
        if order % 2 == 0:
            even += row[order] * value
        else:
            odd += row[order] * value
    return even, odd


@kernel()
def _upward(omega, row, count):
    """The same sums by the upward recurrence, stable where ω exceeds every order."""
    sine, cosine = math.sin(omega), math.cos(omega)
    inverse = 1.0 / omega
    before = sine * inverse
    here = (before - cosine) * inverse
    even, odd = row[0] * before, 0.0
    for order in range(1, count):
        if order % 2 == 0:
            even += row[order] * here
        else:
            odd += row[order] * here
        before, here = here, (2.0 * order + 1.0) * inverse * here - before
    return even, odd


@kernel()
def _downward(omega, row, count):
    """The same sums by Miller's downward recurrence, scaled to the larger of j_0 and j_1."""
    inverse = 1.0 / omega
    above, here = 0.0, TINY
    even, odd = 0.0, 0.0
    for order in range(count + HEADROOM, -1, -1):
        if order < count:
            if order % 2 == 0:
                even += row[order] * here
            else:
                odd += row[order] * here
        if order > 0:
            above, here = here, (2.0 * order + 1.0) * inverse * here - above
    zeroth = math.sin(omega) * inverse
    first = (zeroth - math.cos(omega)) * inverse
    scale = zeroth / here if abs(zeroth) > abs(first) else first / above
    return even * scale, odd * scale


@kernel()
def bessel_sums(omega, row, count):
    """Σ s_l j_l(ω) over even l and over odd l, for ω ≥ 0.

    Parameters
    ----------
    omega : float
    row : array (≥ count,)
        s_l: Legendre coefficients times (−1)^⌊l/2⌋.
    count : int
        How many orders.
    """
    if omega < NEARLY_NONE:
        return _power_series(omega, row, count)
    if omega > count:
        return _upward(omega, row, count)
    return _downward(omega, row, count)


@kernel()
def add_panel(first, last, real, imaginary, wavenumber, turn, middle, half, coefficients, angle, weight):
    """Add ∬ I e^{−iκ b sin(φ + turn)} b db dφ over one panel to the baselines from one up to another.

    Parameters
    ----------
    first, last : int
    real, imaginary : arrays (n,)
        Added to in place.
    wavenumber, turn : arrays (n,)
        2π times the baseline in wavelengths times GM/(c²D) [rad per M]; position angle of +β less that of the
        baseline [rad].
    middle, half : arrays (n_angles,)
        Middle and half width of the panel [M].
    coefficients : array (n_angles, terms)
        Legendre coefficients of brightness times distance, times (−1)^⌊l/2⌋.
    angle, weight : arrays (n_angles,)
        Screen angles and the rule for a sum over them [rad].
    """
    angles, count = coefficients.shape
    sines = np.sin(angle)
    cosines = np.cos(angle)
    spread = 2.0 * weight * half
    for i in range(first, last):
        across, up = wavenumber[i] * math.cos(turn[i]), wavenumber[i] * math.sin(turn[i])
        sum_real = 0.0
        sum_imaginary = 0.0
        for j in range(angles):
            along = across * sines[j] + up * cosines[j]
            omega = along * half[j]
            even, odd = bessel_sums(abs(omega), coefficients[j], count)
            if omega < 0.0:
                odd = -odd
            phase = along * middle[j]
            cosine, sine = math.cos(phase), math.sin(phase)
            sum_real += spread[j] * (even * cosine - odd * sine)
            sum_imaginary -= spread[j] * (even * sine + odd * cosine)
        real[i] += sum_real
        imaginary[i] += sum_imaginary
