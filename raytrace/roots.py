"""Roots of many functions at once: Chandrupatla's bracketing method (1997, Adv. Eng. Softw. 28, 145), element by element.

Inverse quadratic interpolation where it is safe, bisection elsewhere; a bracket never gets lost, even at a jump. It stands here because
importing a general optimisation library costs more than a whole image needs. No units.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray

from raytrace.contract import Array

MOST_STEPS = 120
# Relative width at which a bracket is a root: a few units in the last place.
TOLERANCE = 4.0 * np.finfo(np.float64).eps


def bracketed_roots(function: Callable[[Array, NDArray[np.int64]], Array], low: Array, high: Array) -> Array:
    """Roots within brackets.

    Parameters
    ----------
    function : callable
        Takes places (m,) and the indices (m,) of the elements that they belong to; returns values (m,).
    low, high : arrays (n,)
        Ends of the brackets, where the function has opposite signs.

    Returns
    -------
    array (n,)
        NaN where a bracket holds no change of sign.
    """
    everything = np.arange(low.size)
    root = np.full(low.size, np.nan)
    a, b = high.astype(np.float64), low.astype(np.float64)
    fa, fb = function(a, everything), function(b, everything)
    keep = np.sign(fa) * np.sign(fb) <= 0.0
    index, a, b, fa, fb = everything[keep], a[keep], b[keep], fa[keep], fb[keep]
    c, fc, share = a, fa, np.full(index.size, 0.5)
    for _ in range(MOST_STEPS):
        near = np.abs(fa) < np.abs(fb)
        best, value = np.where(near, a, b), np.where(near, fa, fb)
        least = TOLERANCE * np.abs(best) / np.maximum(np.abs(b - a), np.finfo(np.float64).tiny)
        done = (least > 0.5) | (value == 0.0)
        root[index[done]] = best[done]
        if done.all():
            return root
        going = ~done
        index, share, least = index[going], share[going], least[going]
        a, b, c, fa, fb, fc = (each[going] for each in (a, b, c, fa, fb, fc))
        share = np.clip(share, least, 1.0 - least)
        place = a + share * (b - a)
        found = function(place, index)
        same = np.sign(found) == np.sign(fa)
        c, fc = np.where(same, a, b), np.where(same, fa, fb)
        b, fb = np.where(same, b, a), np.where(same, fb, fa)
        a, fa = place, found
        share = _next_share(a, b, c, fa, fb, fc)
    root[index] = a
    return root


def _next_share(a: Array, b: Array, c: Array, fa: Array, fb: Array, fc: Array) -> Array:
    """Where in the bracket to look next: inverse quadratic interpolation inside its safe region, else the middle."""
    with np.errstate(divide="ignore", invalid="ignore"):
        xi, phi = (a - b) / (c - b), (fa - fb) / (fc - fb)
        safe = (phi * phi < xi) & ((1.0 - phi) ** 2 < 1.0 - xi)
        share = fa / (fb - fa) * fc / (fb - fc) + (c - a) / (b - a) * fa / (fc - fa) * fb / (fc - fb)
    return np.where(safe & np.isfinite(share), share, 0.5)
