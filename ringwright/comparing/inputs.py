"""What a comparison is given, as plain numbers: the observed diameter, its resolution, and the priors.

Angles in µas, distances in Mpc, masses in solar masses; every published number is a two-piece normal. What
cannot be used together is refused here, with what to do about it.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import NDArray

from ringwright.comparing.distributions import TwoPiece
from ringwright.errors import InputError

Array = NDArray[np.float64]

# The prior on θ_g reaches from d̂/30 to d̂/4: no scene of a ring reads a conversion factor outside 4 to 30.
LARGEST_FACTOR, SMALLEST_FACTOR = 30.0, 4.0
# Below this relative error a grid in ln θ_g would need millions of cells, and readings are not that accurate.
LEAST_RELATIVE_ERROR = 1e-5
# Gauss–Legendre nodes over an interval of resolutions: exact for a reading that is a polynomial of degree
# 15 in it.
RESOLUTION_NODES = 8


@dataclass(frozen=True)
class Observed:
    """An observation in plain numbers.

    Attributes
    ----------
    diameter : TwoPiece
        [µas]
    resolution : tuple
        () for a diameter already corrected for resolution, (FWHM,) or (least, most) [µas].
    distance, mass, theta_g : TwoPiece or None
        [Mpc], [solMass], [µas]; at most two of them, mass only with a distance.
    flat : bool
        Prior flat in θ_g instead of ln θ_g.
    scene_priors : dict
        Priors on scene parameters by key, in the unit of the scan's numbers (M, rad or none).
    unlike_units, of_example : tuple of str
        What in the file looks like a slip (see `Observation`).
    """

    name: str
    diameter: TwoPiece
    resolution: tuple[float, ...]
    estimator: str = "peak-ring"
    distance: TwoPiece | None = None
    mass: TwoPiece | None = None
    theta_g: TwoPiece | None = None
    flat: bool = False
    scene_priors: dict[str, TwoPiece] = field(default_factory=dict)
    unlike_units: tuple[str, ...] = ()
    of_example: tuple[str, ...] = ()

    def __post_init__(self) -> None:
        self._check_priors()
        for name, number in (("diameter", self.diameter), ("prior on the mass", self.mass)):
            _check_error(name, number)
        _check_error("prior on theta_g", self.theta_g)
        if not (self.diameter.mode > 0.0 and all(r > 0.0 for r in self.resolution)):
            raise InputError("the diameter of a ring and its resolution are positive angles")
        if len(self.resolution) == 2 and not self.resolution[0] < self.resolution[1]:
            raise InputError(
                f"the interval of resolutions runs from {self.resolution[0]:g} to {self.resolution[1]:g} "
                "µas; "
                "write the smaller one first"
            )

    def _check_priors(self) -> None:
        if self.mass is not None and self.theta_g is not None:
            raise InputError(
                "there is a prior on the mass and one on theta_g: with a distance these are the same "
                "statement twice; "
                "keep one of them"
            )
        if self.mass is not None and self.distance is None:
            raise InputError(
                "a prior on the mass needs a distance: without one it says nothing about an angle on the "
                "sky; "
                "add [distance], or give the prior as theta_g"
            )

    def to_json(self) -> dict[str, Any]:
        """Name, diameter with its resolution (µas; empty if corrected) and estimator; priors are told in
        words.
        """
        return {
            "name": self.name,
            "diameter": {
                "value": self.diameter.mode,
                "unit": "uas",
                "plus": self.diameter.plus,
                "minus": self.diameter.minus,
            },
            "resolution": {"value": list(self.resolution), "unit": "uas"},
            "estimator": self.estimator,
        }

    @property
    def factors(self) -> tuple[float, float]:
        """Least and greatest θ_g of the prior [µas]."""
        return self.diameter.mode / LARGEST_FACTOR, self.diameter.mode / SMALLEST_FACTOR

    def resolution_nodes(self) -> tuple[Array, Array]:
        """Resolutions [µas] and weights that marginalise them; empty for `none`."""
        if len(self.resolution) < 2:
            return np.array(self.resolution), np.ones(len(self.resolution))
        low, high = self.resolution
        x, weight = np.polynomial.legendre.leggauss(RESOLUTION_NODES)
        return low + (high - low) * 0.5 * (x + 1.0), 0.5 * weight


def _check_error(name: str, number: TwoPiece | None) -> None:
    if number is None:
        return
    if not (math.isfinite(number.mode) and number.mode > 0.0):
        raise InputError(f"the {name} must be positive, not {number.mode:g}")
    if not number.relative >= LEAST_RELATIVE_ERROR:
        raise InputError(
            f"the error of the {name} is below a hundred-thousandth of it ({number.relative:.1g}); "
            "the readings of a scan are good to some 0.3 %: state an error above 0.001 %"
        )
