"""From what a user hands over to what a comparison works on: observations to plain numbers, scans to tables.

This is the only place of the comparison where astropy units are taken off. Angles become µas, distances Mpc,
masses solar masses, scene parameters the unit of the scan (M, rad or none).
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from os import PathLike

from ringwright.comparing.distributions import TwoPiece
from ringwright.comparing.inputs import Observed
from ringwright.errors import InputError
from ringwright.observation import Measurement, Observation, load_observation
from ringwright.scanning.table import ScanTable


def read_scans(scans: Sequence[ScanTable | str | PathLike[str]]) -> tuple[ScanTable, ...]:
    """Scan tables, or those in products; families that share a name get that of their scan beside it.

    Raises
    ------
    InputError
        For a scan that is given twice: it would count with twice the prior weight.
    """
    tables = tuple(scan if isinstance(scan, ScanTable) else ScanTable.open(str(scan)) for scan in scans)
    for index, table in enumerate(tables):
        if any(_same(table, other) for other in tables[:index]):
            raise InputError(
                f"the scan {table.path or table.name} is given twice and would count with twice the prior weight; "
                "give each scan once"
            )
    names = [table.family for table in tables]
    return tuple(
        replace(table, family=f"{table.family} ({table.name})") if names.count(table.family) > 1 else table
        for table in tables
    )


def _same(one: ScanTable, other: ScanTable) -> bool:
    return one is other or (bool(one.provenance) and dict(one.provenance) == dict(other.provenance))


def read_observation(
    observation: Observation | str | PathLike[str], tables: Sequence[ScanTable] = ()
) -> Observed:
    """An observation, or the one in a file, as plain numbers in the units of the scans.

    Raises
    ------
    InputError
        For a prior on a scene parameter whose unit is not that of the scan.
    """
    if not isinstance(observation, Observation):
        observation = load_observation(str(observation))
    for key, measurement in observation.scene_priors.items():
        _check_unit(key, measurement, tables)
    return Observed(
        name=observation.name,
        diameter=plain(observation.diameter, "uas"),
        resolution=tuple(float(end.to_value("uas")) for end in observation.resolution),
        estimator=observation.estimator,
        distance=_optional(observation.distance, "Mpc"),
        mass=_optional(observation.mass, "solMass"),
        theta_g=_optional(observation.theta_g, "uas"),
        flat=observation.theta_g_shape == "flat",
        scene_priors={
            key: plain(measurement, "rad" if _is_angle(measurement) else "")
            for key, measurement in observation.scene_priors.items()
        },
        unlike_units=observation.unlike_units,
        of_example=observation.of_example,
    )


def plain(measurement: Measurement, unit: str) -> TwoPiece:
    """A measurement as a two-piece normal in a unit."""
    parts = (measurement.value, measurement.plus, measurement.minus)
    return TwoPiece(*(float(part.to_value(unit)) for part in parts))


def _optional(measurement: Measurement | None, unit: str) -> TwoPiece | None:
    return None if measurement is None else plain(measurement, unit)


def _is_angle(measurement: Measurement) -> bool:
    return str(measurement.value.unit.physical_type) == "angle"


def _check_unit(key: str, measurement: Measurement, tables: Sequence[ScanTable]) -> None:
    for table in tables:
        for parameter in table.parameters:
            if parameter.key == key and (parameter.unit == "rad") != _is_angle(measurement):
                wanted = {"rad": 'an angle, such as "17 deg"', "M": 'a length, such as "3 M"'}
                raise InputError(
                    f"the prior on {key} does not have the unit of the scan {table.name}: "
                    f"give {wanted.get(parameter.unit, 'a plain number')}"
                )
