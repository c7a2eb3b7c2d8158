"""`compare`: from an observation and scans to θ_g, mass, budget and cautions.

The method is that of docs/comparing.md: a posterior summed over scenes on a grid in ln θ_g, once without and
once with the prior on the scale, distance summed out for the mass. Angles in µas, distances in Mpc, masses in
solar masses.
"""

from __future__ import annotations

import math
from os import PathLike
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from ringwright.comparing import cautions, notes
from ringwright.comparing.budget import Budget, budget
from ringwright.comparing.distributions import LogDensity
from ringwright.comparing.inputs import Observed
from ringwright.comparing.likelihood import Grid, Posterior, merge, run, support
from ringwright.comparing.priors import FlatPrior, MassPrior, Replaced, ScalePrior, scale_prior, scene_weights
from ringwright.comparing.results import (
    Answer,
    Caution,
    Comparison,
    Curves,
    Estimate,
    FamilyAnswer,
    MassScale,
    SceneCount,
)
from ringwright.errors import InputError
from ringwright.scanning.table import ScanParameter, ScanTable
from ringwright.units import THETA_G_OF_SUN

if TYPE_CHECKING:
    from ringwright.observation import Observation

Array = NDArray[np.float64]

# Diameter of the critical curve of a black hole without spin [θ_g]: 2√27 (Hilbert 1917).
SCHWARZSCHILD_CURVE = 2.0 * math.sqrt(27.0)
NOTHING_FITS = "nothing in this scan looks like the observation"
NO_DISTANCE = "the observation gives no distance"
NO_OVERLAP = "the prior on the scale and the ring exclude each other"


def compare(
    observation: Observation | str | PathLike[str], *scans: ScanTable | str | PathLike[str]
) -> Comparison:
    """What a ring diameter says about θ_g = GM/(c²D) and the mass.

    Parameters
    ----------
    observation : path or Observation
        The measured diameter with its resolution, distance and priors.
    *scans : paths or ScanTables
        One scan for each emitter family; with several the result is pooled, every family at equal prior
        weight.

    Returns
    -------
    Comparison
        "Nothing fits" is an answer: its estimates have no value and carry the reason.

    Raises
    ------
    InputError
        For files that cannot be read, priors that exclude every scene or say the same thing twice, a scan
        given twice, and no scan at all.
    """
    from ringwright.comparing.loading import read_observation, read_scans

    if not scans:
        raise InputError(
            "a comparison needs at least one scan: give the product of `ringwright scan` after the "
            "observation"
        )
    tables = read_scans(scans)
    return compare_numbers(read_observation(observation, tables), tables)


def compare_numbers(observed: Observed, tables: tuple[ScanTable, ...], refine: int = 1) -> Comparison:
    """`compare` on plain numbers; `refine` multiplies the cells of every grid of θ_g."""
    weights, replaced = zip(*(scene_weights(observed, table) for table in tables), strict=True)
    scale = scale_prior(observed)
    ring = _posteriors(observed, tables, weights, None, refine)
    combined = None if scale is None else _posteriors(observed, tables, weights, scale, refine)
    families = tuple(
        _family(observed, table, weight, new, r, c, scale)
        for table, weight, new, r, c in zip(
            tables, weights, replaced, ring, combined or [None] * len(tables), strict=True
        )
    )
    whole = families[0] if len(families) == 1 else _pooled(observed, families, ring, combined, scale)
    return Comparison(
        **{name: getattr(whole, name) for name in Answer.__dataclass_fields__},
        observation=observed,
        families=families,
        prior=notes.priors(observed, tables, replaced),
        held_fixed=notes.held_fixed(tables),
        missing_physics=notes.MISSING_PHYSICS,
        notes=notes.standing(len(tables) > 1, scale is not None, bool(observed.resolution)),
        warnings=_warnings(observed, families, ring, combined),
    )


def _posteriors(
    observed: Observed,
    tables: tuple[ScanTable, ...],
    weights: tuple[Array, ...],
    scale: ScalePrior | None,
    refine: int,
) -> list[Posterior | None]:
    """One posterior per scan on a common grid; None where no scene fits."""
    low, high = support(observed, tables)
    sigma = observed.diameter.relative
    if scale is not None:
        low, high = max(low, scale.span()[0]), min(high, scale.span()[1])
        sigma = min(sigma, scale.width)
    if not low < high:
        return [None] * len(tables)
    grid = Grid.over(low, high, sigma, refine)
    prior = scale or FlatPrior(observed.flat)
    found = [run(observed, table, weight, grid, prior) for table, weight in zip(tables, weights, strict=True)]
    return [item if item.total > 0.0 and _excluded(item) < 1.0 else None for item in found]


def _excluded(posterior: Posterior) -> float:
    """Prior weight of the scenes on which no ring of the observed diameter is read at any θ_g."""
    return min(
        float(posterior.weight[posterior.nearest > cautions.FIT].sum()) / float(posterior.weight.sum()), 1.0
    )


def _family(
    observed: Observed,
    table: ScanTable,
    weight: Array,
    replaced: tuple[Replaced, ...],
    ring: Posterior | None,
    combined: Posterior | None,
    scale: ScalePrior | None,
) -> FamilyAnswer:
    answer = _answer(
        observed, ring, combined, scale, table.parameters, table.status.size, _critical_factor(table)
    )
    shared = {name: getattr(answer, name) for name in Answer.__dataclass_fields__}
    return FamilyAnswer(**shared, family=table.family, table=table, posterior=ring, replaced=replaced)


def _pooled(
    observed: Observed,
    families: tuple[FamilyAnswer, ...],
    ring: list[Posterior | None],
    combined: list[Posterior | None] | None,
    scale: ScalePrior | None,
) -> Answer:
    """All families as one scan in which `family` is a parameter of its own."""
    fitting = [item for item in ring if item is not None]
    index = np.concatenate([np.full(p.weight.size, float(i)) for i, p in enumerate(fitting)] or [np.zeros(0)])
    names = tuple(item.family for item in families if item.posterior is not None)
    which = ScanParameter("family", "list", "", math.nan, math.nan, names, index)
    both = [item for item in combined or [] if item is not None]
    answer = _answer(
        observed,
        merge(fitting) if fitting else None,
        merge(both) if both else None,
        scale,
        (which,),
        sum(item.scenes.total for item in families),
        _critical_factor(families[0].table),
    )
    excluded = sum(item.scenes.excluded for item in families) / len(families)
    shared = {name: getattr(answer, name) for name in Answer.__dataclass_fields__}
    return Answer(**{**shared, "scenes": SceneCount(answer.scenes.total, answer.scenes.effective, excluded)})


def _answer(
    observed: Observed,
    ring: Posterior | None,
    combined: Posterior | None,
    scale: ScalePrior | None,
    parameters: tuple[ScanParameter, ...],
    scenes: int,
    critical: float,
) -> Answer:
    if ring is None:
        return _none(scale, scenes)
    curves = _curves(observed, ring, combined, scale)
    assert curves.theta_g is not None
    return Answer(
        ring_only=_scale(curves.theta_g, curves.mass, NO_DISTANCE),
        combined=None
        if scale is None
        else _scale(curves.theta_g_combined, curves.mass_combined, _why(combined)),
        conversion_factor=Estimate.of(ring.factor_density(), ""),
        critical_curve_diameter=Estimate.of(curves.theta_g, "uas", critical),
        deviation=_deviation(curves, critical),
        budget=_budget(observed, ring, parameters),
        scenes=SceneCount(scenes, cautions.effective_scenes(ring.shares()), _excluded(ring)),
        curves=curves,
    )


def _none(scale: ScalePrior | None, scenes: int) -> Answer:
    """Nothing fits."""
    nothing = MassScale(Estimate("uas", reason=NOTHING_FITS), Estimate("solMass", reason=NOTHING_FITS))
    plain = Estimate("", reason=NOTHING_FITS)
    return Answer(
        ring_only=nothing,
        combined=None if scale is None else nothing,
        conversion_factor=plain,
        critical_curve_diameter=Estimate("uas", reason=NOTHING_FITS),
        deviation=None if scale is None else plain,
        budget=None,
        scenes=SceneCount(scenes, 0.0, 1.0),
        curves=Curves(),
    )


def _why(combined: Posterior | None) -> str:
    return NO_OVERLAP if combined is None else NO_DISTANCE


def _scale(theta: LogDensity | None, mass: LogDensity | None, why: str) -> MassScale:
    return MassScale(
        Estimate("uas", reason=why) if theta is None else Estimate.of(theta, "uas"),
        Estimate("solMass", reason=why) if mass is None else Estimate.of(mass, "solMass"),
    )


def _curves(
    observed: Observed, ring: Posterior, combined: Posterior | None, scale: ScalePrior | None
) -> Curves:
    theta = ring.density()
    prior = None if scale is None else scale.of_theta_g()
    both = None if combined is None else combined.density()
    mass_both = both and _mass(observed, both)
    if combined is not None and isinstance(scale, MassPrior):
        mass_both = scale.mass_posterior(combined.grid, combined.cells)
    mass_prior = prior and _mass(observed, prior)
    if isinstance(scale, MassPrior):
        mass_prior = LogDensity.of(scale.mass)
    return Curves(
        theta_g=theta,
        theta_g_combined=both,
        theta_g_prior=prior,
        mass=_mass(observed, theta),
        mass_combined=mass_both,
        mass_prior=mass_prior,
        factor=ring.factor_density(),
        over_prior=_over_prior(theta, prior),
    )


def _mass(observed: Observed, theta: LogDensity) -> LogDensity | None:
    """Distribution of the mass for an independent distance."""
    if observed.distance is None:
        return None
    distances, weights = observed.distance.nodes()
    return theta.times(distances / THETA_G_OF_SUN, weights)


def _deviation(curves: Curves, critical: float) -> Estimate | None:
    """δ = d_c/(2√27 θ_g,prior) − 1, the prior taken as an independent measurement."""
    if curves.over_prior is None:
        return None
    return Estimate.of(curves.over_prior, "", critical / SCHWARZSCHILD_CURVE, -1.0)


def _over_prior(theta: LogDensity, prior: LogDensity | None) -> LogDensity | None:
    """θ_g of the ring alone over that of the prior, as two independent measurements."""
    if prior is None:
        return None
    points, weights = prior.nodes()
    return theta.times(1.0 / points, weights)


def _budget(observed: Observed, ring: Posterior, parameters: tuple[ScanParameter, ...]) -> Budget:
    if observed.distance is None:
        return budget(ring, parameters, None)
    points, weights = observed.distance.nodes()
    log = np.log(points)
    return budget(ring, parameters, float(weights @ (log - weights @ log) ** 2))


def _critical_factor(table: ScanTable) -> float:
    """Diameter of the critical curve [θ_g] of the scan's spacetime, 2√(area/π); a circle while none spins."""
    hole = table.base.get("hole", {})
    name = hole.get("spacetime", "schwarzschild") if isinstance(hole, dict) else "schwarzschild"
    if name == "schwarzschild":
        return SCHWARZSCHILD_CURVE
    from raytrace.registry import SPACETIMES

    angle = np.linspace(-np.pi, np.pi, 721)[:-1]
    radius = SPACETIMES[name]().critical_radius(0.5 * math.pi, angle)
    return 2.0 * math.sqrt(float(np.mean(radius**2)))


def _warnings(
    observed: Observed,
    families: tuple[FamilyAnswer, ...],
    ring: list[Posterior | None],
    combined: list[Posterior | None] | None,
) -> tuple[Caution, ...]:
    found = cautions.of_observation(observed)
    for family, alone, both in zip(families, ring, combined or [None] * len(families), strict=True):
        if alone is None or family.budget is None:
            found.append(cautions.no_scene_fits(family.table, observed))
            continue
        found += cautions.of_scan(observed, family.table, family.replaced, alone)
        found += cautions.of_budget(family.budget, family.family)
        found += cautions.range_ends(family.table, alone, "ring-only")
        if both is not None:
            found += cautions.range_ends(family.table, both, "combined")
    return tuple(found)
