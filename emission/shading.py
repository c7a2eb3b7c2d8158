"""The front door of emission: crossings in, intensities at the observer out.

An emitter's answer is checked here once for what its contract promises, so that nothing downstream needs to.
Intensities are relative; G = c = M = 1.
"""

from __future__ import annotations

import math

from emission.contract import Array, Emitter
from raytrace.contract import Hit, Spacetime
from raytrace.registry import or_default


def shade(
    emitter: Emitter,
    hit: Hit,
    *,
    spacetime: Spacetime | None = None,
    frequency: float | None = None,
    time: float | None = None,
) -> Array:
    """Intensity that an emitter sends along every traced ray, order by order.

    Parameters
    ----------
    emitter : Emitter
        What shines.
    hit : Hit
        Crossings, traced with their momentum.
    spacetime : Spacetime, optional
        Schwarzschild unless given; the one the rays were traced in.
    frequency : float, optional
        Observed frequency [Hz]; matters only to emitters that are not scale-free.
    time : float, optional
        Time of observation [M]; matters only to emitters that change.

    Returns
    -------
    array (stokes = 1, orders, n)
        Finite and never negative; 0 where the light meets nothing that shines.

    Raises
    ------
    ValueError
        If the frequency is not positive, the rays lack what the emitter needs, or the emitter breaks its
        contract.
    """
    if frequency is not None and not 0.0 < frequency < math.inf:
        raise ValueError(f"the observed frequency {frequency:g} Hz is not positive and finite")
    image = emitter.intensity(hit, spacetime=or_default(spacetime), frequency=frequency, time=time)
    _check(image, emitter, hit)
    return image


def _check(image: Array, emitter: Emitter, hit: Hit) -> None:
    name = type(emitter).__name__
    expected = (1, *hit.status.shape)
    if image.shape != expected:
        raise ValueError(
            f"{name} returned intensities of shape {image.shape}; one per Stokes parameter, order and ray, "
            f"{expected}, are due"
        )
    # NaN fails both comparisons.
    if image.size and not (image.min() >= 0.0 and image.max() < math.inf):
        raise ValueError(f"{name} returned an intensity that is negative or not finite")
