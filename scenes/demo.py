"""The whole job on an invented nucleus: from a scene to an image, from an observed ring to a mass, in plain words.

`make demo` runs it. Everything it makes goes to outputs/. The nucleus is invented, and its true mass is known, so that
the answer can be held against it: 9.2 × 10⁹ M☉ at 21.0 ± 1.5 Mpc, θ_g = 4.32 µas.
"""

from __future__ import annotations

import sys
import time
from collections.abc import Callable
from pathlib import Path

import ringwright as rw
from ringwright.comparing import Comparison
from ringwright.comparing.report import write_report
from ringwright.figures.comparison import draw_comparison
from ringwright.figures.image import draw_image
from ringwright.figures.ring import picture
from ringwright.progress import reporting

SCENES = Path(__file__).parent
OUTPUTS = SCENES.parent / "outputs"
TRUE_MASS = 9.2e9
SCANS = ("first-scan", "stable-orbit-scan")
DYNAMICAL = {"stars-observation": "stars (9.6 ± 1.2)", "gas-observation": "gas (6.0 ± 0.9)"}


def main() -> int:
    """Render, measure, scan, compare, say what follows."""
    start = time.monotonic()
    step("1. Render the scene", render)
    step("2. Measure the observed ring", measure)
    step("3. Scan two families of emission, 256 scenes each", scan)
    answers = compare()
    say("4. What follows", conclusions(answers))
    print(
        f"\nDone in {time.monotonic() - start:.0f} s. Pictures, products and full answers are in {OUTPUTS}."
    )
    return 0


def step(title: str, work: Callable[[], str]) -> None:
    """Announce a step, do it, and tell what came of it."""
    say(title, work())


def say(title: str, text: str) -> None:
    """A titled paragraph."""
    print(f"\n{title}\n{text}", flush=True)


def render() -> str:
    """The nucleus as it would look with perfect resolution."""
    image = rw.render(SCENES / "first-light.toml")
    image.save(OUTPUTS / "first-light.h5")
    draw_image(image, OUTPUTS / "first-light.png")
    flux = ", ".join(f"order {order}: {1e3 * jy:.3g} mJy" for order, jy in enumerate(image.flux))
    return f"outputs/first-light.h5 and .png; {flux}."


def measure() -> str:
    """The ring on the image that was observed."""
    image = SCENES / "first-observation.fits"
    ring = rw.measure(image, resolution="20 uas")
    picture(image, ring, OUTPUTS / "first-observation-ring.png")
    return (
        f"outputs/first-observation-ring.png; diameter {ring.diameter.to_value('uas'):.1f} µas at a resolution of 20 µas, "
        f"width {ring.width.to_value('uas'):.1f} µas, brightest toward {ring.orientation.value:.0f}° east of north."
    )


def scan() -> str:
    """What each family of emission would show."""
    made = []
    for name in SCANS:
        with reporting(name) as progress:
            table = rw.scan(
                SCENES / f"{name}.toml", out=OUTPUTS / f"{name}.h5", progress=progress, replace=True
            )
        made.append(f"outputs/{name}.h5: {table.family}, {len(table.status)} scenes")
    return "\n".join(made)


def compare() -> dict[tuple[str, str], Comparison]:
    """Every observation file against each family by itself, and the ring alone against both together."""
    answers = {}
    for name in ("first-observation", *DYNAMICAL):
        observation = SCENES / f"{name}.toml"
        for family in SCANS:
            answers[name, family] = rw.compare(observation, OUTPUTS / f"{family}.h5")
    both = rw.compare(SCENES / "first-observation.toml", *(OUTPUTS / f"{family}.h5" for family in SCANS))
    write_report(both, OUTPUTS / "first-observation")
    draw_comparison(both, OUTPUTS / "first-observation")
    return answers


def conclusions(answers: dict[tuple[str, str], Comparison]) -> str:
    """In plain words; every number is one that was computed."""
    lines = []
    for family in SCANS:
        lines += family_says(answers["first-observation", family])
    lines += [preference(name, answers) for name in DYNAMICAL]
    lines.append(
        "The diameter alone cannot choose between the families: each scene of either fits it at some θ_g. The dynamical "
        "masses can, and they disagree; a prior is not a measurement, and a ring diameter is not a shadow diameter."
    )
    lines.append(truth(answers["first-observation", SCANS[0]]))
    return "\n".join(f"- {line}" for line in lines)


def family_says(answer: Comparison) -> list[str]:
    """θ_g, mass and what the error is made of."""
    family, mass, theta = answer.families[0].family, answer.ring_only.mass, answer.ring_only.theta_g
    budget = answer.budget
    parts = [
        ("measurement", budget.measurement),
        ("emission", budget.emission),
        ("distance", budget.distance or 0.0),
    ]
    shares = ", ".join(f"{name} {100.0 * part / budget.total:.0f} %" for name, part in parts)
    low, high = (edge.to_value("solMass") / 1e9 for edge in (mass.low68, mass.high68))
    return [
        f"With {family}, the ring means θ_g = {theta.number:.2f} µas and M = {mass.number / 1e9:.1f} × 10⁹ M☉ "
        f"(68 %: {low:.1f} to {high:.1f}). Of the variance of ln M: {shares}."
    ]


def preference(name: str, answers: dict[tuple[str, str], Comparison]) -> str:
    """How far the ring's mass lies from a dynamical one, in each family."""
    found = {}
    for family in SCANS:
        deviation = answers[name, family].deviation
        spread = 0.5 * (deviation.high68.value - deviation.low68.value)
        found[answers[name, family].families[0].family] = (deviation.number, deviation.number / spread)
    closest = min(found, key=lambda family: abs(found[family][1]))
    told = "; ".join(
        f"{family}: {100 * d:+.0f} % ({s:+.1f} standard deviations)" for family, (d, s) in found.items()
    )
    return f"Ring against the mass from {DYNAMICAL[name]} × 10⁹ M☉ — {told}. It sits best with {closest}."


def truth(answer: Comparison) -> str:
    """Whether the true mass lies inside the interval of the family that it was made with."""
    mass = answer.ring_only.mass
    low, high = (edge.to_value("solMass") for edge in (mass.low68, mass.high68))
    inside = "lies inside" if low <= TRUE_MASS <= high else "lies outside"
    return (
        f"The nucleus is invented and its true mass is {TRUE_MASS / 1e9:.1f} × 10⁹ M☉: it {inside} the 68 % interval of "
        f"{answer.families[0].family}, {low / 1e9:.1f} to {high / 1e9:.1f}, from which it was made."
    )


if __name__ == "__main__":
    sys.exit(main())
