"""From what a user hands over to what a comparison works on: observations to plain numbers, scans to tables.

This is the only place of the comparison where astropy units are taken off. Angles become µas, distances Mpc,
masses solar masses, scene parameters the unit of the scan (M, rad or none).
"""

from __future__ import annotations

from os import PathLike

from ringwright.scanning.table import ScanTable


def read_scan(scan: ScanTable | str | PathLike[str]) -> ScanTable:
    """A scan table, or the one in a product."""
    return scan if isinstance(scan, ScanTable) else ScanTable.open(str(scan))
