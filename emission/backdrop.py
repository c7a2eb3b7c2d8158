"""A uniform bright sky at infinity, against which the hole itself is dark.

Its image is the shadow proper: a ray that escapes has brightness 1, a captured one 0, and in Schwarzschild
the dark disk has the radius √27 (Hilbert 1917; Darwin 1959, Proc. R. Soc. A 249, 180). Brightness is
relative; M = 1.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import ClassVar

import numpy as np

from emission.contract import Array
from raytrace.contract import Hit, RayStatus, Spacetime


@dataclass(frozen=True)
class Backdrop:
    """Light of brightness 1 from every direction at infinity; nothing in between hides it."""

    edges: ClassVar[tuple[float, ...]] = ()
    bolometric: ClassVar[bool] = False
    opaque: ClassVar[bool] = False
    scale_free: ClassVar[bool] = True

    def intensity(
        self, hit: Hit, *, spacetime: Spacetime, frequency: float | None, time: float | None
    ) -> Array:
        """Brightness 1 in order 0 of every ray that comes from infinity, 0 elsewhere; shape (1, orders, n).

        There is no redshift between infinity and the observer, and frequency and time have no effect. A ray
        crosses the plane any number of times on its way; all its light is counted once, in order 0.
        """
        image = np.zeros((1, *hit.status.shape))
        image[0, 0] = hit.fate == RayStatus.ESCAPED
        return image
