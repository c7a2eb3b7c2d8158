"""Brightness of a disk against radius in two analytic forms: a power law between edges and a Gaussian ring.

Brightness is relative: 1 at the sharp inner edge of a power law and at the crest of a ring, so that strengths
of several emitters compare. Common practice, no source; radii in M = 1.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import ClassVar

import numpy as np
from numpy.typing import ArrayLike

from emission.contract import Array
from raytrace.contract import Spacetime

# No light leaves the horizon of a hole without spin, r = 2.
SMALLEST_EDGE = 2.0
# The Gaussian ring ends where it has fallen to this: far below what any image resolves or any dynamic range
# shows.
GAUSSIAN_FLOOR = 1e-12
# Largest rise of a power law from edge to edge, in powers of ten: leaves room in float32 for what
# multiplies it.
LARGEST_RISE = 30.0


@dataclass(frozen=True, kw_only=True)
class PowerLaw:
    """Brightness (r/inner)^−slope between two edges, sharp or smoothed.

    Parameters
    ----------
    inner, outer : float
        Edges of the support [M]; the inner one may be 2, the horizon.
    slope : float
        Positive where brightness falls outward.
    edge_width : float
        [M]. If not 0, brightness rises from 0 over this width outward from `inner` and falls to 0 over this
        width inward from `outer`, by the fifth-degree step 6x⁵ − 15x⁴ + 10x³, whose first two derivatives
        are continuous. The support stays `inner` to `outer`; half the brightness is reached half a width
        inside it.

    Raises
    ------
    ValueError
        If the edges do not ascend from 2, the widths do not fit between them, or the brightness would rise
        too far.
    """

    inner: float
    outer: float
    slope: float
    edge_width: float = 0.0
    bolometric: ClassVar[bool] = False

    def __post_init__(self) -> None:
        check_edges(self.inner, self.outer)
        if not 0.0 <= 2.0 * self.edge_width <= self.outer - self.inner:
            raise ValueError(
                f"an edge width of {self.edge_width:g} M does not fit twice between {self.inner:g} and "
                f"{self.outer:g} M; give 0 for sharp edges or a smaller width"
            )
        if not math.isfinite(self.slope) or -self.slope * math.log10(self.outer / self.inner) > LARGEST_RISE:
            raise ValueError(
                f"a slope of {self.slope:g} between {self.inner:g} and {self.outer:g} M makes the outer "
                f"edge brighter than the inner one by more than 10^{LARGEST_RISE:g}; a positive slope "
                "falls outward"
            )

    @property
    def edges(self) -> tuple[float, ...]:
        """Where the support ends and, with smoothed edges, where the smoothing does [M]."""
        if self.edge_width == 0.0:
            return (self.inner, self.outer)
        ramps = (self.inner + self.edge_width, self.outer - self.edge_width)
        return tuple(sorted({self.inner, *ramps, self.outer}))

    def brightness(self, radius: ArrayLike, *, spacetime: Spacetime | None = None) -> Array:
        """Relative brightness at radii [M]; 1 at a sharp inner edge, 0 outside the support."""
        r = np.asarray(radius, dtype=np.float64)
        within = (r >= self.inner) & (r <= self.outer)
        # Outside the support the power itself might overflow; its value there is not used.
        scaled = np.clip(r, self.inner, self.outer) / self.inner
        value = np.where(within, scaled ** (-self.slope), 0.0)
        if self.edge_width > 0.0:
            value *= _step((r - self.inner) / self.edge_width) * _step((self.outer - r) / self.edge_width)
        return value[()]


@dataclass(frozen=True, kw_only=True)
class GaussianRing:
    """Brightness of Gaussian cross-section, 1 at its crest.

    The support ends where the brightness is 1e-12 of the crest (3.16 widths away) and at the horizon.

    Parameters
    ----------
    radius : float
        Radius of the crest [M], at or outside 2.
    width : float
        FWHM [M].

    Raises
    ------
    ValueError
        If the crest lies inside the horizon or the width is not positive.
    """

    radius: float
    width: float
    bolometric: ClassVar[bool] = False

    def __post_init__(self) -> None:
        if not SMALLEST_EDGE <= self.radius < math.inf:
            raise ValueError(
                f"a ring of radius {self.radius:g} M lies inside the horizon; give a finite radius of at "
                f"least {SMALLEST_EDGE:g} M"
            )
        if not 0.0 < self.width < math.inf:
            raise ValueError(
                f"the width {self.width:g} M of a ring is a FWHM and must be positive and finite"
            )

    @property
    def edges(self) -> tuple[float, ...]:
        """Bounds of the support [M]."""
        reach = self.width * math.sqrt(-math.log(GAUSSIAN_FLOOR) / (4.0 * math.log(2.0)))
        return (max(SMALLEST_EDGE, self.radius - reach), self.radius + reach)

    def brightness(self, radius: ArrayLike, *, spacetime: Spacetime | None = None) -> Array:
        """Relative brightness at radii [M]; 0 outside the support."""
        r = np.asarray(radius, dtype=np.float64)
        inner, outer = self.edges
        value = np.exp(-4.0 * math.log(2.0) * ((r - self.radius) / self.width) ** 2)
        return np.where((r >= inner) & (r <= outer), value, 0.0)[()]


def check_edges(inner: float, outer: float) -> None:
    """Refuse edges that do not ascend from the horizon.

    Raises
    ------
    ValueError
        With the sentence for a user.
    """
    if not SMALLEST_EDGE <= inner < math.inf:
        raise ValueError(
            f"an inner edge at {inner:g} M lies inside the horizon; give at least {SMALLEST_EDGE:g} M, from "
            "where no light comes"
        )
    if not inner < outer < math.inf:
        raise ValueError(f"an outer edge at {outer:g} M does not lie outside the inner one at {inner:g} M")


def _step(x: Array) -> Array:
    """Smooth step from 0 at x = 0 to 1 at x = 1; monotone, first and second derivatives continuous."""
    y = np.clip(x, 0.0, 1.0)
    return y * y * y * (10.0 + y * (6.0 * y - 15.0))
