"""`summary`: a comparison in plain words, with one line fit for a paper.

Medians and equal-tailed 68 % intervals, 95 % beside them; the parts of the budget as standard deviations
around the median mass. What could mislead stands in the same text.
"""

from __future__ import annotations

import math
import textwrap

from ringwright.comparing import formats
from ringwright.comparing.budget import Budget
from ringwright.comparing.inputs import Observed
from ringwright.comparing.results import Answer, Comparison, Estimate, FamilyAnswer
from ringwright.comparing.words import plain, value

WIDTH = 110  # characters of a line of running text


def summary(comparison: Comparison) -> str:
    """What the command line prints."""
    several = len(comparison.families) > 1
    parts = [given(comparison)]
    for family in comparison.families:
        parts.append(
            _section(f"Emitter family: {family.family} (scan {family.table.name})", family, comparison)
        )
    if several:
        parts.append(_section("All families, each at equal prior weight", comparison, comparison))
    parts += [
        _warnings(comparison),
        _list("Priors", _priors(comparison)),
        _list("Held fixed, and missing", _fixed(comparison)),
        _list("Cautions", comparison.notes),
    ]
    return "\n\n".join(part for part in parts if part)


def paper_line(answer: Answer, comparison: Comparison) -> str:
    """The one line fit for a paper."""
    theta, mass, budget = answer.ring_only.theta_g, answer.ring_only.mass, answer.budget
    prior = comparison.prior["theta_g, ring only"].split(" from ")[0]
    family = answer.family if isinstance(answer, FamilyAnswer) else "all families"
    tail = f"68 %, ring only, prior: {prior}; emission: {family}"
    line = f"θ_g = {formats.asymmetric(theta)} µas"
    if mass.value is None or budget is None:
        return f"{line}, {tail}"
    return f"{line}; M = {formats.mass(mass)} ({_mass_parts(mass, budget)}), {tail}"


def _mass_parts(mass: Estimate, budget: Budget) -> str:
    """What the error of a mass is made of: standard deviations, in its own power of ten."""
    middle = mass.number / 10.0 ** formats.power(mass.number)
    parts = {
        "measurement": middle * math.sqrt(budget.measurement),
        "emission": middle * math.sqrt(budget.emission),
        "distance": middle * math.sqrt(budget.distance or 0.0),
    }
    places = formats.decimals(max(parts.values()))
    return ", ".join(f"± {part:.{places}f} {name}" for name, part in parts.items())


def given(comparison: Comparison) -> str:
    """What was observed, and what is known besides."""
    observed = comparison.observation
    lines = [
        f"Observation {observed.name}: ring diameter {formats.published(observed.diameter, 'µas')}, "
        f"{resolution(observed)}."
    ]
    if observed.distance is not None:
        lines.append(f"Distance {formats.published(observed.distance, 'Mpc')}.")
    if observed.mass is not None:
        lines.append(f"Prior on the mass {formats.published(observed.mass, 'M☉')}.")
    if observed.theta_g is not None:
        lines.append(f"Prior on θ_g {formats.published(observed.theta_g, 'µas')}.")
    return "\n".join(lines)


def resolution(observed: Observed) -> str:
    """How the diameter was read."""
    if not observed.resolution:
        return "already corrected for resolution"
    if len(observed.resolution) == 1:
        return f"as measured at a resolution of {observed.resolution[0]:.3g} µas (FWHM)"
    low, high = observed.resolution
    return f"as measured at a resolution between {low:.3g} and {high:.3g} µas (FWHM, marginalised)"


def _section(title: str, answer: Answer, comparison: Comparison) -> str:
    scenes = answer.scenes
    count = (
        f"{scenes.total} scenes, {scenes.effective:.0f} effective; {100 * scenes.excluded:.1f} % of "
        "the prior weight shows no ring of this diameter."
    )
    theta = answer.ring_only.theta_g
    if theta.value is None:
        return "\n".join([title, f"  No answer: {theta.reason}.", f"  {count}"])
    lines = [
        f"  {paper_line(answer, comparison)}",
        f"  Conversion factor k = d/θ_g = {formats.asymmetric(answer.conversion_factor)} "
        f"(95 %: {formats.between(answer.conversion_factor)})",
        f"  θ_g, ring only: 95 % from {formats.between(theta)} µas; critical curve "
        f"{formats.asymmetric(answer.critical_curve_diameter)} µas across",
    ]
    mass = answer.ring_only.mass
    if mass.value is not None:
        exponent = formats.power(mass.number)
        lines.append(
            f"  Mass, ring only: 95 % from {formats.between(mass, 10.0**exponent)} × {formats.ten_to(exponent)} M☉"
        )
    return "\n".join([title, *lines, *_combined(answer), *_budget(answer.budget), f"  {count}"])


def _combined(answer: Answer) -> list[str]:
    if answer.combined is None:
        return []
    theta, mass = answer.combined.theta_g, answer.combined.mass
    if theta.value is None:
        return [f"  With the prior on the scale: no answer, {theta.reason}."]
    line = f"  With the prior on the scale: θ_g = {formats.asymmetric(theta)} µas"
    if mass.value is not None:
        line += f"; M = {formats.mass(mass)}"
    lines = [line]
    if answer.deviation is not None and answer.probability_below_prior is not None:
        delta = f"{formats.asymmetric(answer.deviation)} (95 %: {formats.between(answer.deviation)})"
        lines.append(
            f"  Ring only against that prior: δ = {delta}; "
            f"the ring asks for less than the prior with probability {answer.probability_below_prior:.3f}"
        )
    return lines


def _budget(budget: Budget | None) -> list[str]:
    if budget is None:
        return []
    lines = [f"  What the error of {budget.quantity.replace('theta_g', 'θ_g')} is made of (ring only):"]
    rows = [("measurement", budget.measurement), ("emission", budget.emission)]
    if budget.distance is not None:
        rows.append(("distance", budget.distance))
    lines += [f"    {name:<12} {_share(value, budget.total)}" for name, value in rows]
    lines += [
        f"      {plain(name):<28} {100 * value / budget.total:5.1f} % of the variance"
        for name, value in _named(budget.parts).items()
    ]
    said = "at least twice" if budget.emission_dominates else f"{budget.ratio:.2f} times"
    lines.append(
        f"    Emission contributes {said} the measurement's standard deviation (ratio {budget.ratio:.2f})."
    )
    return lines


def _named(parts: dict[str, float]) -> dict[str, float]:
    """What is left beside `family` lies within the families."""
    return {
        "within the families" if name == "joint" and "family" in parts else name: parts[name]
        for name in parts
    }


def _share(variance: float, total: float) -> str:
    return (
        f"{100 * math.sqrt(variance):5.1f} % standard deviation, {100 * variance / total:5.1f} % of "
        "the variance"
    )


def _priors(comparison: Comparison) -> tuple[str, ...]:
    """One line for scale and distance, and one for each family."""
    families = {
        item.family: {parameter.key: f"{item.family}: {parameter.key}" for parameter in item.table.parameters}
        for item in comparison.families
    }
    of_families = {name for keys in families.values() for name in keys.values()}
    general = "; ".join(
        f"{name.replace('theta_g', 'θ_g')}: {words}"
        for name, words in comparison.prior.items()
        if name not in of_families
    )
    lines = [
        f"{family}: " + "; ".join(f"{plain(key)} {comparison.prior[name]}" for key, name in keys.items())
        for family, keys in families.items()
    ]
    return (general, *lines)


def _fixed(comparison: Comparison) -> tuple[str, ...]:
    fixed = "; ".join(f"{plain(key)}: {value(text)}" for key, text in comparison.held_fixed.items())
    missing = "; ".join(comparison.missing_physics)
    return (*([f"held fixed: {fixed}"] if fixed else []), f"not in the scan: {missing}")


def _warnings(comparison: Comparison) -> str:
    return _list(
        "Warnings", tuple(f"[{item.code}] {item.text} {item.remedy}" for item in comparison.warnings)
    )


def _list(title: str, items: tuple[str, ...]) -> str:
    lines = [textwrap.fill(item, WIDTH, initial_indent="  - ", subsequent_indent="    ") for item in items]
    return "\n".join([title, *lines]) if lines else ""
