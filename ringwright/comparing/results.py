"""What a comparison answers: small frozen objects whose fields are astropy quantities and the JSON's keys.

An estimate is a median with equal-tailed 68 % and 95 % intervals; one that does not exist has no value and
says why. θ_g in µas, mass in solar masses, the conversion factor k = d/θ_g and the deviation δ without a
unit.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any

import numpy as np
from astropy import units as u
from numpy.typing import NDArray

from ringwright.comparing.budget import Budget
from ringwright.comparing.distributions import QUANTILES, LogDensity
from ringwright.comparing.inputs import Observed
from ringwright.comparing.likelihood import Posterior
from ringwright.comparing.priors import Replaced
from ringwright.scanning.table import ScanTable

Array = NDArray[np.float64]


@dataclass(frozen=True)
class Estimate:
    """A median with its intervals; all None, with a reason, where there is no answer."""

    unit: str
    value: u.Quantity | None = None
    low68: u.Quantity | None = None
    high68: u.Quantity | None = None
    low95: u.Quantity | None = None
    high95: u.Quantity | None = None
    reason: str = ""

    @classmethod
    def of(cls, density: LogDensity, unit: str, scale: float = 1.0, offset: float = 0.0) -> Estimate:
        """Of scale × quantity + offset."""
        return cls.of_quantiles(density.quantiles(), unit, scale, offset)

    @classmethod
    def of_quantiles(
        cls, values: dict[str, float], unit: str, scale: float = 1.0, offset: float = 0.0
    ) -> Estimate:
        """From the values of QUANTILES."""
        return cls(
            unit, **{name: (scale * number + offset) * u.Unit(unit) for name, number in values.items()}
        )

    @property
    def number(self) -> float:
        """The median as a plain number in `unit`."""
        return float("nan") if self.value is None else float(self.value.value)

    @property
    def plus(self) -> float:
        """From the median up to the end of the 68 % interval, in `unit`."""
        return float("nan") if self.high68 is None else float(self.high68.value) - self.number

    @property
    def minus(self) -> float:
        """From the median down to the end of the 68 % interval, in `unit`."""
        return float("nan") if self.low68 is None else self.number - float(self.low68.value)

    def to_json(self) -> dict[str, Any]:
        """`value`, `unit` and the intervals; `value` null and the `reason` where there is none."""
        if self.value is None:
            return {"value": None, "unit": self.unit, "reason": self.reason}
        return {"value": self.number, "unit": self.unit} | {
            name: float(getattr(self, name).value) for name in QUANTILES if name != "value"
        }


@dataclass(frozen=True)
class MassScale:
    """Angular gravitational radius and mass."""

    theta_g: Estimate
    mass: Estimate

    def to_json(self) -> dict[str, Any]:
        """As nested plain numbers."""
        return {"theta_g": self.theta_g.to_json(), "mass": self.mass.to_json()}


@dataclass(frozen=True)
class SceneCount:
    """Scenes compared, scenes that the posterior rests on, and the prior weight that fits no ring."""

    total: int
    effective: float
    excluded: float

    def to_json(self) -> dict[str, Any]:
        """As plain numbers."""
        return {"total": self.total, "effective": self.effective, "excluded": self.excluded}


@dataclass(frozen=True)
class Caution:
    """Something a reader must know before quoting the result, and what to do about it."""

    code: str
    text: str
    remedy: str

    def to_json(self) -> dict[str, str]:
        """As plain strings."""
        return {"code": self.code, "text": self.text, "remedy": self.remedy}


@dataclass(frozen=True)
class Curves:
    """Distributions behind an answer, for figures; None where there is no answer."""

    theta_g: LogDensity | None = None
    theta_g_combined: LogDensity | None = None
    theta_g_prior: LogDensity | None = None
    mass: LogDensity | None = None
    mass_combined: LogDensity | None = None
    mass_prior: LogDensity | None = None
    factor: LogDensity | None = None
    over_prior: LogDensity | None = None  # θ_g of the ring alone over that of the prior


@dataclass(frozen=True)
class Answer:
    """What one family of scenes, or several pooled, say. `combined` and `deviation` are None without a
    prior on the scale.
    """

    ring_only: MassScale
    combined: MassScale | None
    conversion_factor: Estimate
    critical_curve_diameter: Estimate
    deviation: Estimate | None
    budget: Budget | None
    scenes: SceneCount
    curves: Curves = field(repr=False)

    def to_json(self) -> dict[str, Any]:
        """Everything but the curves."""
        return {
            "ring_only": self.ring_only.to_json(),
            "combined": None if self.combined is None else self.combined.to_json(),
            "conversion_factor": self.conversion_factor.to_json(),
            "critical_curve_diameter": self.critical_curve_diameter.to_json(),
            "deviation": None if self.deviation is None else self._deviation(),
            "budget": None if self.budget is None else self.budget.to_json(),
            "scenes": self.scenes.to_json(),
        }

    def _deviation(self) -> dict[str, Any]:
        assert self.deviation is not None
        below = self.probability_below_prior
        return self.deviation.to_json() | ({} if below is None else {"probability_below_prior": below})

    @property
    def probability_below_prior(self) -> float | None:
        """Probability that θ_g of the ring alone is smaller than that of the prior: a tail where they
        disagree.
        """
        ratio = self.curves.over_prior
        return None if ratio is None else ratio.probability_below(1.0)


@dataclass(frozen=True)
class FamilyAnswer(Answer):
    """The answer of one scan, with what its figures need."""

    family: str
    table: ScanTable = field(repr=False)
    posterior: Posterior | None = field(repr=False)
    replaced: tuple[Replaced, ...] = ()

    def to_json(self) -> dict[str, Any]:
        """Everything but the curves and the scan itself."""
        replaced = [{"key": item.key, "scan": item.old, "used": item.new} for item in self.replaced]
        return {
            "family": self.family,
            "scan": self.table.name,
            "replaced_priors": replaced,
            **super().to_json(),
        }


@dataclass(frozen=True)
class Comparison(Answer):
    """What `rw.compare` returns: the answer, pooled over families where there are several, and everything
    to quote with it.

    Attributes
    ----------
    observation : Observed
        What was compared, in plain numbers.
    families : tuple of FamilyAnswer
        One for each scan, in the order given.
    prior : dict of str
        Every prior in words.
    held_fixed : dict of str
        Scene keys that no scan varied, with their values.
    missing_physics : tuple of str
        What the scans leave out.
    notes : tuple of str
        Cautions that go with every answer.
    warnings : tuple of Caution
        Cautions that this answer gave rise to.
    """

    observation: Observed
    families: tuple[FamilyAnswer, ...]
    prior: dict[str, str]
    held_fixed: dict[str, str]
    missing_physics: tuple[str, ...]
    notes: tuple[str, ...]
    warnings: tuple[Caution, ...]

    def to_json(self) -> dict[str, Any]:
        """One object of plain numbers and strings."""
        return {
            "observation": self.observation.to_json(),
            **super().to_json(),
            "families": [item.to_json() for item in self.families],
            "prior": self.prior,
            "held_fixed": self.held_fixed,
            "missing_physics": list(self.missing_physics),
            "notes": list(self.notes),
            "warnings": [item.to_json() for item in self.warnings],
        }

    def __str__(self) -> str:
        from ringwright.comparing.wording import summary

        return summary(self)
