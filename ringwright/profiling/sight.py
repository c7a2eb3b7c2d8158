"""Who carries the visibility, from which baseline on, and what array would see the first photon ring.

An order carries the envelope from the baseline beyond which it has more than half of it until a higher one takes over.
A baseline in wavelengths becomes a length at the scene's frequency, and is set beside the Earth's diameter (IAU 2015
nominal equatorial radius, resolution B3). Statements here hold for the emission of the scene: another frequency may
show another source.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from raytrace.contract import Array
from ringwright.profiling.fringes import Fringes, View, first_carried
from ringwright.sampling import SampledLight

SPEED_OF_LIGHT = 299_792_458.0  # m/s, exact
EARTH_DIAMETER = 2.0 * 6.3781e6  # m
# Brightness at the edge of a panel above this share of the brightest is a jump, not the foot of a smooth edge.
JUMP = 1e-6


@dataclass(frozen=True)
class Carrier:
    """From where on an order carries the visibility.

    Attributes
    ----------
    order : int
    baseline : array (p,)
        Beyond which the order has more than half of the envelope [wavelengths]; NaN where never.
    flux : array (p,)
        Envelope of the order there, in the scene's unit.
    reason : str
        Why it never does, for the directions where it does not; empty if it does in all.
    """

    order: int
    baseline: Array
    flux: Array
    reason: str


@dataclass(frozen=True)
class FirstSight:
    """The shortest baseline that would first see order 1.

    Attributes
    ----------
    baseline, position_angle : float
        [wavelengths], direction [rad]; NaN where there is none.
    flux : float
        Envelope of order 1 there, in the scene's unit.
    length : float
        At the scene's frequency [m]; NaN where it has none.
    ground_frequency : float
        Lowest frequency at which one Earth diameter is that long [Hz], were the image the same there.
    sentence : str
        The answer in words.
    """

    baseline: float
    position_angle: float
    flux: float
    length: float
    ground_frequency: float
    sentence: str

    @property
    def earth_diameters(self) -> float:
        """The length in diameters of the Earth."""
        return self.length / EARTH_DIAMETER


def carriers(found: Fringes, view: View, light: Sequence[SampledLight], width: Array) -> tuple[Carrier, ...]:
    """From which baseline on each order carries the envelope, or why it never does.

    Parameters
    ----------
    found, view, light
        As for `fringes`.
    width : array (orders,)
        Typical width of each order, as the root of its second moment [M].
    """
    resolved = math.tau * found.baseline[-1] * view.theta_g * width > 1.0
    answers = []
    for order in range(found.envelope.shape[0]):
        baseline = first_carried(found, order, view)
        rows = zip(baseline, found.envelope[order], strict=True)
        flux = np.array([np.interp(place, found.baseline, row) for place, row in rows])  # NaN stays NaN
        never = np.isnan(baseline).any()
        answers.append(
            Carrier(order, baseline, flux, _reason(found, order, light, resolved) if never else "")
        )
    return tuple(answers)


def _reason(found: Fringes, order: int, light: Sequence[SampledLight], resolved: Array) -> str:
    longest = f"never below {found.baseline[-1] / 1e9:.4g} Gλ"
    if not np.any(found.envelope[order] > 0.0):
        return f"never: order {order} carries no light"
    last = int(np.argmax(found.envelope[:, :, -1].max(axis=1)))
    if last > order:
        return f"{longest}: before it could, order {last} has taken over"
    if not resolved[last]:
        return f"{longest}: order {last}, whose width such baselines do not resolve, still has more"
    if sharp_edges([part for part in light if part.order == last]):
        return f"{longest}, because the emission has sharp edges, whose visibility falls only as u^−3/2"
    return f"{longest}: order {last} still has more"


def sharp_edges(light: Sequence[SampledLight]) -> bool:
    """Whether brightness jumps at an edge of some light."""
    for part in light:
        values = part.series.values
        ends = max(float(np.max(values[0, 0])), float(np.max(values[-1, -1])))
        if ends > JUMP * float(np.max(values)) or part.fronts:
            return True
    return False


def first_sight(
    found: Fringes, view: View, *, sensitivity: float, frequency: float | None, unit: str
) -> FirstSight:
    """The shortest baseline on which order 1 has more than half of the envelope and is above a sensitivity.

    Parameters
    ----------
    found : Fringes
    view : View
    sensitivity : float
        In the scene's unit.
    frequency : float or None
        [Hz]
    unit : str
        Name of the scene's unit.
    """
    baseline = first_carried(found, 1, view, above=sensitivity)
    if np.isnan(baseline).all():
        none = math.nan
        return FirstSight(none, none, none, none, none, _not_seen(found, view, sensitivity, unit))
    row = int(np.nanargmin(baseline))
    place = float(baseline[row])
    flux = float(np.interp(place, found.baseline, found.envelope[1, row]))
    length = math.nan if frequency is None else place * SPEED_OF_LIGHT / frequency
    needed = place * SPEED_OF_LIGHT / EARTH_DIAMETER
    angle = float(found.position_angle[row])
    sentence = _seen(place, angle, flux, length, needed, frequency, unit)
    return FirstSight(place, angle, flux, length, needed, sentence)


def _not_seen(found: Fringes, view: View, sensitivity: float, unit: str) -> str:
    alone = first_carried(found, 1, view)
    limit = f"{found.baseline[-1] / 1e9:.4g} Gλ"
    if np.isnan(alone).all():
        return f"no baseline below {limit} has order 1 as more than half of the envelope"
    row = int(np.nanargmin(alone))
    flux = float(np.interp(alone[row], found.baseline, found.envelope[1, row]))
    return (
        f"order 1 has more than half of the envelope from {alone[row] / 1e9:.3g} Gλ on, but only {_amount(flux, unit)} "
        f"is left there, below the sensitivity of {_amount(sensitivity, unit)}"
    )


def _seen(
    place: float,
    angle: float,
    flux: float,
    length: float,
    needed: float,
    frequency: float | None,
    unit: str,
) -> str:
    first = (
        f"order 1 is first seen at {place / 1e9:.3g} Gλ (position angle {math.degrees(angle) % 180.0:.0f}°), where "
        f"{_amount(flux, unit)} of it is left"
    )
    if frequency is None:
        return f"{first}; one Earth diameter is that long at {needed / 1e9:.0f} GHz"
    ratio = length / EARTH_DIAMETER
    where = "on the ground" if ratio <= 1.0 else "beyond the ground"
    other = (
        ""
        if ratio <= 1.0
        else f"; on the ground it would take {needed / 1e9:.0f} GHz, if the source looked the same there"
    )
    return f"{first}: {length / 1e3:,.0f} km at {frequency / 1e9:.4g} GHz, {ratio:.2g} Earth diameters, {where}{other}"


def _amount(value: float, unit: str) -> str:
    return f"{value * 1e3:.3g} mJy" if unit == "Jy" else f"{value:.2g} of the light"
