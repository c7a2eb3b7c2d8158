"""From what a user hands over to what a comparison works on: observations to plain numbers, scan products
to tables.

This is the only place of the comparison where astropy units are taken off. Angles become µas, distances
Mpc, masses solar masses, scene parameters the unit of the scan (M, rad or none).
"""

from __future__ import annotations
