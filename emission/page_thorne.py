"""Flux of a steady thin disk around a hole without spin that radiates what its gas loses.

Page & Thorne 1974, ApJ 191, 499, eq. 15n (number from memory): conservation of energy and angular momentum,
without torque at the innermost stable orbit r = 6, fixes the flux that leaves each face per unit proper area
and time. Many copies print √3/3 before the logarithm; √3/2 is right, for only then is the whole luminosity
1 − √(8/9) of Ṁ. G = c = M = 1; flux in units of Ṁ/M².
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import ClassVar

import numpy as np
from numpy.typing import ArrayLike

from emission.contract import Array
from raytrace.contract import Spacetime

ISCO = 6.0
# Computed independently in arbitrary precision: where the flux is largest, and that flux.
PEAK_RADIUS = 9.550927962
PEAK_FLUX = 1.367811083e-5


@dataclass(frozen=True, kw_only=True)
class PageThorne:
    """Bolometric brightness in proportion to the Page & Thorne flux, 1 at its peak (r = 9.55), from r = 6
    outward.

    Radiation is isotropic at the surface, so that brightness is flux over π at every radius alike. Inside
    the innermost stable orbit there is no torque and no light. Meaningful for gas on circular orbits.

    Parameters
    ----------
    outer : float
        Outer edge [M], beyond 6.

    Raises
    ------
    ValueError
        If the outer edge does not lie outside 6.
    """

    outer: float
    bolometric: ClassVar[bool] = True

    def __post_init__(self) -> None:
        if not ISCO < self.outer < math.inf:
            raise ValueError(
                f"a disk that ends at {self.outer:g} M has no stable orbits; its outer edge must lie "
                f"outside {ISCO:g} M"
            )

    @property
    def edges(self) -> tuple[float, ...]:
        """Bounds of the support [M]."""
        return (ISCO, self.outer)

    def brightness(self, radius: ArrayLike, *, spacetime: Spacetime | None = None) -> Array:
        """Bolometric brightness at radii [M] relative to its peak; 0 outside the support.

        Raises
        ------
        ValueError
            If a spacetime is given whose innermost stable orbit is not at 6: the formula holds without spin
            or charge.
        """
        if spacetime is not None and not math.isclose(spacetime.isco, ISCO):
            raise ValueError(
                f"the page-thorne profile holds for a hole whose innermost stable orbit is at {ISCO:g} M; "
                f"in {spacetime.name} it is at {spacetime.isco:g} M"
            )
        r = np.asarray(radius, dtype=np.float64)
        return np.where(r <= self.outer, flux(r) / PEAK_FLUX, 0.0)[()]


def flux(radius: ArrayLike) -> Array:
    """Flux from one face of the disk [Ṁ/M²] at radii [M]; 0 at and inside r = 6.

    Source: Page & Thorne 1974, eq. 15n reduced to a = 0:
    F = (3/8π) r^(−5/2) (r − 3)^(−1) [√r − √6 + (√3/2) ln((√r + √3)(√6 − √3)/((√r − √3)(√6 + √3)))].
    """
    r = np.maximum(np.asarray(radius, dtype=np.float64), ISCO)
    root, edge, photon = np.sqrt(r), math.sqrt(ISCO), math.sqrt(3.0)
    ratio = (root + photon) * (edge - photon) / ((root - photon) * (edge + photon))
    bracket = root - edge + 0.5 * photon * np.log(ratio)
    # Near r = 6 the bracket is the difference of equal terms and may round to a negative number.
    return (3.0 / (8.0 * math.pi) * np.maximum(bracket, 0.0) / (r**2.5 * (r - 3.0)))[()]
