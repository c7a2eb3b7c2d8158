"""How numbers of a comparison are written: as many digits as the error allows, powers of ten raised.

Common practice: the largest error keeps two significant digits and everything beside it the same decimals.
Strings only; units are the caller's.
"""

from __future__ import annotations

import math

from ringwright.comparing.distributions import TwoPiece
from ringwright.comparing.results import Estimate

SUPERSCRIPTS = str.maketrans("-0123456789", "⁻⁰¹²³⁴⁵⁶⁷⁸⁹")
SIGNIFICANT = 2
NEAR = 0.1  # [Mpc] below which distances are written in kpc


def decimals(error: float) -> int:
    """Decimals that show two significant digits of an error."""
    if not (math.isfinite(error) and error > 0.0):
        return 2
    return max(0, SIGNIFICANT - 1 - math.floor(math.log10(error)))


def power(value: float) -> int:
    """Power of ten that leaves one digit before the point."""
    return math.floor(math.log10(abs(value)))


def ten_to(exponent: int) -> str:
    """10 with a superscript."""
    return "10" + str(exponent).translate(SUPERSCRIPTS)


def number(value: float, places: int) -> str:
    """A number with so many decimals and a true minus sign."""
    return f"{value:.{places}f}".replace("-", "−")


def asymmetric(estimate: Estimate, scale: float = 1.0) -> str:
    """Median with the distances to the ends of the 68 % interval, such as "3.82 +0.35 −0.31"."""
    plus, minus = estimate.plus / scale, estimate.minus / scale
    places = decimals(max(plus, minus))
    return f"{number(estimate.number / scale, places)} +{plus:.{places}f} −{minus:.{places}f}"


def between(estimate: Estimate, scale: float = 1.0) -> str:
    """The 95 % interval, such as "3.2 to 4.6"."""
    assert estimate.low95 is not None
    assert estimate.high95 is not None
    low, high = float(estimate.low95.value) / scale, float(estimate.high95.value) / scale
    places = decimals(max(estimate.plus, estimate.minus) / scale)
    return f"{number(low, places)} to {number(high, places)}"


def mass(estimate: Estimate) -> str:
    """A mass with its 68 % interval, such as "(6.50 +0.64 −0.61) × 10⁹ M☉"."""
    exponent = power(estimate.number)
    return f"({asymmetric(estimate, 10.0**exponent)}) × {ten_to(exponent)} M☉"


def published(given: TwoPiece, unit: str = "") -> str:
    """A number that was given, such as "16.8 +0.8 −0.7 Mpc"; masses (`M☉`) with a power of ten."""
    if unit == "M☉":
        exponent = power(given.mode)
        return f"({published(_scaled(given, 10.0**-exponent))}) × {ten_to(exponent)} M☉"
    if unit == "Mpc" and given.mode < NEAR:
        return published(_scaled(given, 1e3), "kpc")
    if given.exact:
        return f"{given.mode:.4g} {unit}".strip() + ", held exact"
    if given.plus == given.minus:
        return f"{given.mode:.4g} ± {given.plus:.3g} {unit}".strip()
    return f"{given.mode:.4g} +{given.plus:.3g} −{given.minus:.3g} {unit}".strip()


def _scaled(given: TwoPiece, factor: float) -> TwoPiece:
    return TwoPiece(factor * given.mode, factor * given.plus, factor * given.minus)
