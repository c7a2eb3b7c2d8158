"""`profile`: what the photon rings of a scene are, order by order, on the screen and on baselines.

It samples the light once (`ringwright.sampling`) and asks its series for everything else: cuts, the table of rings,
visibilities. Lengths in M and µas, angles in radians inside and degrees in files, baselines in wavelengths, fluxes in Jy
where the scene has a flux density and else in shares of the light.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

import numpy as np

from raytrace.contract import Array
from ringwright import products
from ringwright.errors import InputError
from ringwright.profiling.cuts import Cut, radial_cut
from ringwright.profiling.fringes import Fringes, View, fringes, nulls, trusted_baseline
from ringwright.profiling.rings import RingTable, order_fluxes, ring_table
from ringwright.profiling.sight import Carrier, FirstSight, carriers, first_sight
from ringwright.profiling.spacing import Spacing, ring_diameters
from ringwright.sampling import SampledLight, accuracy_note, check_accuracy, flux_scale, sample_light
from ringwright.scenes import Scene, load_scene
from ringwright.units import parse

# Orders 0 to 4: the last is narrower than the direct image by a factor of a hundred thousand.
ORDERS = 5
ANGLES = 64
ACCURACY = 1e-7
LONGEST = "1000 Glambda"
SENSITIVITY = "1 mJy"
# Orders whose fringes are asked for a diameter.
FRINGED = (1, 2)
# Share of the envelope that the numerical error may have before a baseline counts as beyond the accuracy.
TRUSTED_SHARE = 0.01
MOST_ORDERS, MOST_ANGLES = 8, 4096


@dataclass(frozen=True)
class Profile:
    """What `profile` found.

    Attributes
    ----------
    name : str
    theta_g : float or None
        GM/(c²D) [rad].
    frequency : float or None
        [Hz]
    unit : str
        "Jy", or "" for shares of the light.
    total_flux : float
        In that unit.
    accuracy : float
        Asked for.
    reached : array (orders,)
        Estimated interpolation error of each order's brightness relative to its brightest point.
    cuts : tuple of Cut
        One per position angle and its opposite.
    cut_angle : array
        Their position angles [rad].
    rings : RingTable
    fringes : Fringes or None
        None where θ_g is unknown.
    nulls : tuple of (array, array)
        Per direction: the first nulls of the total [wavelengths], and the amplitude there over the envelope.
    spacings : tuple of Spacing
        Diameters by fringe spacing for orders 1 and 2.
    carriers : tuple of Carrier
    first_sight : FirstSight or None
    trusted : float
        Longest baseline at which the numerical error is below a hundredth of the envelope [wavelengths].
    notes : tuple of str
    provenance : dict
    """

    name: str
    theta_g: float | None
    frequency: float | None
    unit: str
    total_flux: float
    accuracy: float
    reached: Array
    cuts: tuple[Cut, ...]
    cut_angle: Array
    rings: RingTable
    fringes: Fringes | None
    nulls: tuple[tuple[Array, Array], ...]
    spacings: tuple[Spacing, ...]
    carriers: tuple[Carrier, ...]
    first_sight: FirstSight | None
    trusted: float
    notes: tuple[str, ...]
    provenance: dict[str, Any] = field(repr=False)

    @property
    def theta_g_uas(self) -> float:
        """The same in µas; NaN where it is not known."""
        return math.nan if self.theta_g is None else math.degrees(self.theta_g) * 3.6e9

    def save(self, path: str | Path | None = None, *, replace: bool = False) -> Path:
        """Write the HDF5 product; returns its path. `docs/products.md` describes it."""
        from ringwright.profiling.product import save

        return save(self, path, replace=replace)

    def summary(self) -> dict[str, Any]:
        """What a program wants to know, as one JSON object."""
        from ringwright.profiling.product import summary

        return summary(self)


def profile(
    scene: Scene | str | Path,
    *,
    orders: int = ORDERS,
    position_angles: Sequence[str] = (),
    angles: int = ANGLES,
    longest: str = LONGEST,
    sensitivity: str = SENSITIVITY,
    emitting_radius: str | None = None,
    accuracy: float = ACCURACY,
) -> Profile:
    """Resolve the photon rings of a scene.

    Parameters
    ----------
    scene : Scene or path of a scene file
    orders : int
        How many, from n = 0; instead of the scene's own number.
    position_angles : sequence of str
        Directions of the cuts and of the baselines, such as "30 deg", east of north; along the projected axis of the
        disk and across it unless given.
    angles : int
        Equally spaced position angles of the table of rings.
    longest : str
        Longest baseline, such as "1000 Glambda".
    sensitivity : str
        Flux density below which order 1 is not seen, such as "1 mJy".
    emitting_radius : str, optional
        Circle whose images tell rotation and delay, such as "6 M"; the one that holds half of order 0's light unless
        given.
    accuracy : float
        Largest interpolation error of brightness allowed, relative to the brightest point of each order.

    Returns
    -------
    Profile

    Raises
    ------
    InputError
        If the scene has no light with edges, or an argument makes no sense.
    SceneError
        If the scene file cannot be used.
    """
    scene = scene if isinstance(scene, Scene) else load_scene(scene)
    scene = _with_orders(scene, orders, angles, accuracy)
    directions = _directions(scene, position_angles)
    light = sample_light(scene, accuracy=accuracy)
    flux = order_fluxes(light, scene.orders)
    scale = flux_scale(scene, float(flux.sum()))
    radius = _emitting_radius(scene, emitting_radius)
    rings = ring_table(scene, light, count=angles, emitting_radius=radius, scale=scale, flux=flux)
    cut_angle = np.concatenate([directions, directions + math.pi])
    unit = "" if scene.total_flux is None else "Jy"
    notes = [*rings.notes, *accuracy_note((part.error for part in light), accuracy)]
    view = _view(scene, scale)
    seen: dict[str, Any] = {
        "fringes": None,
        "nulls": (),
        "spacings": (),
        "carriers": (),
        "first_sight": None,
        "trusted": math.nan,
    }
    if view is None:
        notes.append(
            "no baselines: they need theta_g, or mass and distance, in [hole]; lengths are in M without it"
        )
    else:
        reach = _quantity(longest, "baseline", "the longest baseline")
        limit = _sensitivity(sensitivity, unit)
        seen = _seen(scene, light, view, rings, reach, limit, directions, unit)
        notes += _trust_note(seen["trusted"], reach)
        notes += [each.note for each in seen["spacings"] if each.note]
    return Profile(
        name=scene.name,
        theta_g=None if view is None else view.theta_g,
        frequency=None if scene.frequency is None else float(scene.frequency.to_value("Hz")),
        unit=unit,
        total_flux=scale * float(flux.sum()),
        accuracy=accuracy,
        reached=np.array([max(part.error for part in light if part.order == n) for n in range(orders)]),
        cuts=tuple(radial_cut(light, angle=_screen_angle(scene, pa), orders=orders) for pa in cut_angle),
        cut_angle=cut_angle,
        rings=rings,
        notes=tuple(notes),
        provenance=products.provenance(scene.text, scene.resolved()),
        **seen,
    )


def _with_orders(scene: Scene, orders: int, angles: int, accuracy: float) -> Scene:
    for name, value, most in (("orders", orders, MOST_ORDERS), ("angles", angles, MOST_ANGLES)):
        if int(value) != value or not 1 <= value <= most:
            raise InputError(f"{name} = {value} is not a whole number from 1 to {most}")
    check_accuracy(accuracy)
    for _, emitter in scene.emitters:
        if not emitter.edges:
            raise InputError(
                f"'{scene.name}' has an emitter without edges (a backdrop): it fills whatever field is drawn, so that it has "
                "neither rings nor visibilities of its own; leave it out for a profile"
            )
    return scene.replace("view.orders", int(orders))


def _directions(scene: Scene, given: Sequence[str]) -> Array:
    if not given:
        return np.array([scene.position_angle, scene.position_angle + 0.5 * math.pi])
    return np.array([_quantity(each, "angle", "a position angle") for each in given])


def _quantity(text: str, kind: str, what: str) -> float:
    try:
        return parse(str(text), kind)
    except ValueError as problem:
        raise InputError(f"{what}: {problem}") from None


def _emitting_radius(scene: Scene, given: str | None) -> float | None:
    if given is None:
        return None
    radius = _quantity(given, "length", "the emitting radius")
    if not radius > scene.spacetime.horizon:
        raise InputError(
            f"an emitting radius of {radius:g} M is not outside the horizon at {scene.spacetime.horizon:g} M, from where no "
            "light comes"
        )
    return radius


def _sensitivity(text: str, unit: str) -> float:
    """In the scene's unit; for a scene without a flux density nothing is too faint."""
    value = _quantity(text, "flux density", "the sensitivity")
    if value < 0.0:
        raise InputError(f"the sensitivity {text} is negative; give a flux density from 0 upward")
    return value if unit else 0.0


def _screen_angle(scene: Scene, position_angle: float) -> float:
    """Screen angle from +α of a position angle: +β lies at the scene's own."""
    return position_angle - scene.position_angle + 0.5 * math.pi


def _view(scene: Scene, scale: float) -> View | None:
    if scene.theta_g is None:
        return None
    theta_g = float(scene.theta_g.to_value("rad"))
    angle = math.tau / ANGLES * np.arange(ANGLES, dtype=np.float64)
    critical = scene.spacetime.critical_radius(scene.inclination, angle)
    diameter = 2.0 * math.sqrt(float(np.mean(critical**2))) * theta_g
    return View(theta_g, scene.position_angle, scale, 1.0 / diameter)


def _seen(
    scene: Scene,
    light: Sequence[SampledLight],
    view: View,
    rings: RingTable,
    longest: float,
    sensitivity: float,
    directions: Array,
    unit: str,
) -> dict[str, Any]:
    """Everything about baselines."""
    if not longest > view.fringe:
        raise InputError(
            f"the longest baseline, {longest / 1e9:.3g} Gλ, does not reach the first fringe of the shadow's edge at "
            f"{view.fringe / 1e9:.3g} Gλ; ask for more"
        )
    found = fringes(light, view, orders=scene.orders, longest=longest, position_angle=directions)
    frequency = None if scene.frequency is None else float(scene.frequency.to_value("Hz"))
    width = rings.typical_width
    fringed = [order for order in FRINGED if order < scene.orders and rings.flux[order] > 0.0]
    return {
        "fringes": found,
        "nulls": tuple(nulls(light, view, found, row) for row in range(directions.size)),
        "spacings": tuple(
            ring_diameters(
                light,
                view,
                order=order,
                width=float(width[order]),
                longest=longest,
                position_angle=rings.position_angle,
            )
            for order in fringed
        ),
        "carriers": carriers(found, view, light, width),
        "first_sight": first_sight(found, view, sensitivity=sensitivity, frequency=frequency, unit=unit)
        if scene.orders > 1
        else None,
        "trusted": trusted_baseline(found, TRUSTED_SHARE),
    }


def _trust_note(trusted: float, longest: float) -> list[str]:
    if trusted >= longest:
        return []
    return [
        f"beyond {trusted / 1e9:.3g} Gλ the numerical error exceeds {TRUSTED_SHARE:.0%} of the envelope: ask for a finer "
        "accuracy, or read no further"
    ]
