"""Quantities as people write them in files: a number and a unit, parsed by astropy, with one unit of our own.

`M` is the length GM/c² of the hole at hand. A bare number where a unit is due is refused with the fix, and so is `rg`, which
parses as rontograms. The solar mass parameter is the IAU 2015 nominal value (resolution B3).
"""

from __future__ import annotations

from functools import lru_cache

import numpy as np
from astropy import units as u
from astropy.constants import c

GM_SUN = 1.3271244e20 * u.m**3 / u.s**2
THETA_G_OF_SUN = float((GM_SUN / c**2 / u.Mpc).to_value("")) * u.rad.to("uas")  # µas for 1 M☉ at 1 Mpc

# What each kind of quantity is kept in, and how an example of it is written.
KINDS: dict[str, tuple[str, str]] = {
    "angle": ("rad", "30 deg"),
    "sky angle": ("uas", "42 uas"),
    "length": ("M", "6 M"),
    "mass": ("solMass", "6.5e9 solMass"),
    "distance": ("Mpc", "16.8 Mpc"),
    "frequency": ("Hz", "230 GHz"),
    "flux density": ("Jy", "0.6 Jy"),
}
_SPELLINGS = {"µas": "uas", "μas": "uas", "M☉": "solMass", "M_sun": "solMass", "Msun": "solMass"}


@lru_cache(maxsize=4096)
def parse(text: str, kind: str) -> float:
    """A quantity as a plain number in the unit that its kind is kept in.

    Parameters
    ----------
    text : str
        Number and unit, such as "2.6 M" or "42 uas".
    kind : str
        A key of `KINDS`.

    Raises
    ------
    ValueError
        With what was given, what is accepted and how to write it.
    """
    unit, example = KINDS[kind]
    number, _, name = text.strip().partition(" ")
    name = _SPELLINGS.get(name.strip(), name.strip())
    try:
        value = float(number)
    except ValueError:
        raise ValueError(f"'{text}' is not a number and a unit; write it like \"{example}\"") from None
    if not np.isfinite(value):
        raise ValueError(f"'{text}' is not finite; write it like \"{example}\"")
    if not name:
        raise ValueError(f"'{text}' has no unit; write it like \"{example}\"")
    if name == "rg":
        raise ValueError(f"'{text}': gravitational radii are written M here, like \"{number} M\"")
    if unit == "M" or name == "M":
        if unit != name:
            raise ValueError(f"'{text}' is not {_a(kind)}; write it like \"{example}\"")
        return value
    try:
        return float(u.Quantity(value, name).to_value(unit))
    except u.UnitConversionError:
        raise ValueError(f"'{text}' is not {_a(kind)}; write it like \"{example}\"") from None
    except (ValueError, TypeError):
        raise ValueError(f"'{name}' is not a unit; write {_a(kind)} like \"{example}\"") from None


def parse_given(value: object, kind: str) -> float:
    """The same for a value out of a file, which may be no text at all."""
    if isinstance(value, str):
        return parse(value, kind)
    example = KINDS[kind][1]
    if isinstance(value, int | float) and not isinstance(value, bool):
        raise ValueError(f'{value!r} has no unit; write it as text with one, like "{example}"')
    raise ValueError(f'{value!r} is not {_a(kind)}; write it as text, like "{example}"')


def theta_g(mass: float, distance: float) -> float:
    """Angular gravitational radius GM/(c²D) [µas] of a mass [M☉] at a distance [Mpc]."""
    return THETA_G_OF_SUN * mass / distance


def mass_from(theta: float, distance: float) -> float:
    """Mass [M☉] of an angular gravitational radius [µas] at a distance [Mpc]."""
    return theta * distance / THETA_G_OF_SUN


def _a(kind: str) -> str:
    return f"{'an' if kind[0] in 'aeiou' else 'a'} {kind}"
