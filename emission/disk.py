"""A geometrically thin disk in the equatorial plane: a radial brightness carried by moving gas.

The observed specific intensity is I_obs = g^(3+s) I(r) for I_ν ∝ ν^−s in the frame of the gas, and g⁴ I(r)
for a bolometric profile, since I_ν/ν³ is conserved along a ray (Misner, Thorne & Wheeler 1973, §22.6). Radii
in M = 1.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import ClassVar

import numpy as np
from numpy.typing import NDArray

from emission.contract import Array, Flow, Profile
from emission.flows import EQUATOR
from emission.redshifts import momentum_at, redshift_factor
from raytrace.contract import Hit, RayStatus, Spacetime

# Below s = −3 the factor g^(3+s) would grow without bound toward the horizon. No source does that: the
# steepest rising spectra are ν² (Rayleigh–Jeans) and ν^2.5 (self-absorbed synchrotron).
SPECTRAL_INDEX_RANGE = (-3.0, 10.0)
# A real disk is not infinitely thin: paths longer than a thousand thicknesses mean nothing. Keeps grazing
# light finite.
SMALLEST_COSINE = 1e-3
# Crossings shaded at a time: the dozens of temporary arrays then stay in the cache, which halves the time.
BLOCK = 8192


@dataclass(frozen=True, kw_only=True)
class ThinDisk:
    """Equatorial disk without thickness.

    Parameters
    ----------
    profile : Profile
        Brightness in the frame of the gas against radius.
    flow : Flow
        Motion of the gas.
    spectral_index : float
        s in I_ν ∝ ν^−s: positive for a spectrum that falls with frequency. Much of the literature writes
        I_ν ∝ ν^+α; that α is −s. A bolometric profile takes 0 only.
    opaque : bool
        If true, only the lowest order that meets the disk between its outermost edges shines; otherwise all
        orders do.
    slant : bool
        If true, the brightness is divided by |cos| of the angle between light and normal in the frame of the
        gas: the longer path through an optically thin layer. Otherwise the brightness is isotropic there.

    Raises
    ------
    ValueError
        If the spectral index is outside −3 to 10, or not 0 with a bolometric profile.
    """

    profile: Profile
    flow: Flow
    spectral_index: float = 0.0
    opaque: bool = False
    slant: bool = False
    scale_free: ClassVar[bool] = True

    def __post_init__(self) -> None:
        low, high = SPECTRAL_INDEX_RANGE
        if not low <= self.spectral_index <= high:
            raise ValueError(
                f"the spectral index {self.spectral_index:g} is outside {low:g} to {high:g}; it is s in "
                "I ∝ ν^−s, positive for brightness that falls with frequency"
            )
        if self.profile.bolometric and self.spectral_index != 0.0:
            raise ValueError(
                f"a bolometric profile has no spectrum: the spectral index {self.spectral_index:g} cannot "
                "apply; leave it out"
            )

    @property
    def bolometric(self) -> bool:
        """Whether the intensity is summed over all frequencies."""
        return self.profile.bolometric

    @property
    def edges(self) -> tuple[float, ...]:
        """Radii [M] where brightness or its slope jumps, the flow's kinks (in Schwarzschild) among them."""
        inner, outer = self.profile.edges[0], self.profile.edges[-1]
        kinks = (r for r in self.flow.kinks() if inner < r < outer)
        return tuple(sorted({*self.profile.edges, *kinks}))

    def intensity(
        self, hit: Hit, *, spacetime: Spacetime, frequency: float | None, time: float | None
    ) -> Array:
        """Intensity at the observer, relative to the profile's own unit.

        Parameters
        ----------
        hit : Hit
            Crossings with their momentum.
        spacetime : Spacetime
            Where the rays were traced.
        frequency, time : float or None
            Without effect: a power-law spectrum changes with frequency in its normalisation alone, and the
            disk is steady.

        Returns
        -------
        array (1, orders, n)
            0 where the light meets no part of the disk.

        Raises
        ------
        ValueError
            If the rays were traced without their momentum.
        """
        lit = self._lit(hit, spacetime)
        radius, momentum = hit.radius[lit], momentum_at(lit, hit)
        value = np.empty_like(radius)
        for start in range(0, radius.size, BLOCK):
            block = slice(start, start + BLOCK)
            value[block] = self._observed(radius[block], momentum[:, block], spacetime)
        image = np.zeros((1, *hit.radius.shape))
        image[0][lit] = value
        return image

    def _observed(self, radius: Array, momentum: Array, spacetime: Spacetime) -> Array:
        """Intensity at the observer of light that left radii (n,) with momentum (3, n)."""
        g = redshift_factor(self.flow, radius, momentum, spacetime)
        power = 4.0 if self.bolometric else 3.0 + self.spectral_index
        value = self.profile.brightness(radius, spacetime=spacetime) * g**power
        if self.slant:
            value /= np.maximum(_cosine(radius, momentum, g, spacetime), SMALLEST_COSINE)
        return value

    def _lit(self, hit: Hit, spacetime: Spacetime) -> NDArray[np.bool_]:
        """Which crossings meet the disk and are seen."""
        inner, outer = self.profile.edges[0], self.profile.edges[-1]
        met = (hit.status == RayStatus.CROSSED) & (hit.radius >= inner) & (hit.radius <= outer)
        # Light from the horizon itself is redshifted without bound; u^t and p_r are infinite there.
        met &= hit.radius > spacetime.horizon
        if self.opaque:
            met[1:] &= ~np.logical_or.accumulate(met, axis=0)[:-1]
        return met


def _cosine(radius: Array, momentum: Array, g: Array, spacetime: Spacetime) -> Array:
    """|cos| of the angle between light and normal in the frame of the gas: g |p_θ|/√g_θθ.

    The gas moves within the plane, so the normal e_θ/√g_θθ is the same unit vector for it as for an observer
    at rest, and its energy for the photon is 1/g.
    """
    return np.abs(momentum[1]) * g / np.sqrt(spacetime.metric(radius, EQUATOR).theta_theta)
