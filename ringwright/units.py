"""Quantities as people write them: a number and a unit, parsed by astropy, with two units of our own.

`M` is the length GM/c² of the hole at hand, `lambda` (λ) the observing wavelength that baselines are counted in. A
bare number where a unit is due is refused with the fix, and so are names that astropy reads as something else
than was meant: `rg` (rontograms) and `mpc` (milliparsecs). The solar mass parameter is the IAU 2015 nominal
value (resolution B3).
"""

from __future__ import annotations

import datetime
import re
from difflib import get_close_matches
from functools import lru_cache

import numpy as np
from astropy import units as u
from numpy.typing import NDArray

GM_SUN = 1.3271244e20 * u.m**3 / u.s**2
SPEED_OF_LIGHT = 299_792_458.0 * u.m / u.s  # exact in the SI
THETA_G_OF_SUN = float((GM_SUN / SPEED_OF_LIGHT**2 / u.Mpc).to_value("")) * u.rad.to(
    "uas"
)  # µas for 1 M☉ at 1 Mpc

# Not a plain number, so that a baseline without a unit is seen; `GLAMBDA` is for arrays of them in notebooks.
LAMBDA = u.def_unit("lambda", doc="one observing wavelength, as a length of baselines")
GLAMBDA = u.def_unit("Glambda", 1e9 * LAMBDA, format={"unicode": "Gλ", "latex": r"\mathrm{G}\lambda"})
_WAVELENGTHS = {"lambda": LAMBDA, "klambda": 1e3 * LAMBDA, "Mlambda": 1e6 * LAMBDA, "Glambda": GLAMBDA}

# What each kind of quantity is kept in, and how an example of it is written.
KINDS: dict[str, tuple[str, str]] = {
    "angle": ("rad", "30 deg"),
    "sky angle": ("uas", "42 uas"),
    "length": ("M", "6 M"),
    "mass": ("solMass", "6.5e9 solMass"),
    "distance": ("Mpc", "16.8 Mpc"),
    "frequency": ("Hz", "230 GHz"),
    "flux density": ("Jy", "0.6 Jy"),
    "baseline": ("lambda", "8 Glambda"),
}
_SPELLINGS = {
    **dict.fromkeys(("µas", "μas", "muas", "microarcsec"), "uas"),
    **dict.fromkeys(("M☉", "M_☉", "M_sun", "Msun"), "solMass"),
    **dict.fromkeys(("°", "degree", "degrees"), "deg"),
    **{f"{prefix}λ": f"{prefix}lambda" for prefix in ("", "k", "M", "G")},
}
# Offered where a name is close to one of them; any other name that astropy can convert is accepted too.
_OFFERED: dict[str, tuple[str, ...]] = {
    "angle": ("deg", "rad", "arcmin", "arcsec"),
    "sky angle": ("uas", "µas", "mas", "arcsec"),
    "length": ("M",),
    "mass": ("solMass", "Msun", "kg"),
    "distance": ("Mpc", "kpc", "pc"),
    "frequency": ("GHz", "MHz", "Hz"),
    "flux density": ("Jy", "mJy"),
    "baseline": ("Glambda", "Mlambda", "klambda", "lambda"),
}
_GRAVITATIONAL_RADII = ("rg", "r_g", "Rg", "R_g", "GM/c^2", "GM/c²", "GM/c**2")
_PARTS = re.compile(
    r"([+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?|[+-]?(?:nan|inf))(?![\d.,])\s*(.*)", re.ASCII | re.DOTALL
)
LONGEST_SHOWN = 60


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
    number, name = _split(text, example)
    value = float(number)
    if not np.isfinite(value):
        raise ValueError(f'{shown(text)} is not finite; write it like "{example}"')
    _refuse_lookalikes(number, name, kind)
    if unit == "M" or name == "M":
        if unit != name:
            raise ValueError(f'{shown(text)} is not {_a(kind)}; write it like "{example}"')
        return value
    return _converted(number, name, kind)


def unit_size(text: str, kind: str) -> float:
    """How large the unit of a quantity is, in the unit that its kind is kept in; errors are those of `parse`."""
    return parse(f"1 {_split(text, KINDS[kind][1])[1]}", kind)


def parse_given(value: object, kind: str) -> float:
    """The same for a value out of a file, which may be no text at all."""
    if isinstance(value, str):
        return parse(value, kind)
    example = KINDS[kind][1]
    if isinstance(value, int | float) and not isinstance(value, bool):
        raise ValueError(f'{shown(value)} has no unit; write it as text with one, like "{example}"')
    raise ValueError(f'{shown(value)} is not {_a(kind)}; write it as text, like "{example}"')


def parse_array(given: object, kind: str) -> NDArray[np.float64]:
    """The same for what a notebook gives: a Quantity of any shape, a text, or a sequence of either.

    Raises
    ------
    ValueError
        If a unit is missing or is of another kind.
    """
    if isinstance(given, u.Quantity):
        unit, example = KINDS[kind]
        try:
            return np.asarray(given.to_value(_unit(unit)), dtype=np.float64)
        except u.UnitConversionError:
            raise ValueError(
                f"{str(given)[:LONGEST_SHOWN]} is not {_a(kind)}; give one like {example}"
            ) from None
    if isinstance(given, np.ndarray | np.generic):
        given = given.tolist()
    if isinstance(given, list | tuple):
        return np.array([parse_array(each, kind) for each in given])
    return np.asarray(parse_given(given, kind))


def plain_number(value: object) -> float:
    """A number without a unit, out of a file.

    Raises
    ------
    ValueError
        If it is no number, or not a finite one.
    """
    if isinstance(value, bool) or not isinstance(value, int | float):
        raise ValueError(f"{shown(value)} is not a number")
    try:
        number = float(value)
    except OverflowError:
        raise ValueError(f"{shown(value)} is too large for a number") from None
    if not np.isfinite(number):
        raise ValueError(f"{shown(value)} is not finite")
    return number


def shown(value: object) -> str:
    """A value as it stands in a file, cut where it is long."""
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, datetime.date | datetime.time):
        return value.isoformat()
    try:
        text = repr(value)
    except (ValueError, RecursionError):  # Python writes no integer of more than 4300 digits
        return "a value too long to show"
    return text if len(text) <= LONGEST_SHOWN else f"{text[:LONGEST_SHOWN]}…"


def _split(text: str, example: str) -> tuple[str, str]:
    """Number and unit of a quantity; the space between them may be missing."""
    parts = _PARTS.fullmatch(text.strip().replace("\N{MINUS SIGN}", "-"))
    if parts is None:
        raise ValueError(f'{shown(text)} is not a number and a unit; write it like "{example}"')
    number, name = parts[1], parts[2]
    if not name:
        raise ValueError(f'{shown(text)} has no unit; write it like "{example}"')
    if not (name[0].isalpha() or name[0] == "°"):
        raise ValueError(f'{shown(text)} is not a number and a unit; write it like "{example}"')
    return number, _SPELLINGS.get(name, name)


def _refuse_lookalikes(number: str, name: str, kind: str) -> None:
    if name in _GRAVITATIONAL_RADII:
        raise ValueError(f"'{number} {name}': gravitational radii are written M here, like \"{number} M\"")
    if kind == "distance" and name == "mpc":
        raise ValueError(f"'{number} mpc' reads as milliparsecs; megaparsecs are written \"{number} Mpc\"")


def _unit(name: str) -> str | u.UnitBase:
    return _WAVELENGTHS.get(name, name)


def _converted(number: str, name: str, kind: str) -> float:
    unit, example = KINDS[kind]
    value, given = float(number), f"{number} {name}"
    try:
        quantity = u.Quantity(value, _unit(name))
    except (ValueError, TypeError):
        close = get_close_matches(name.lower(), [one.lower() for one in _OFFERED[kind]], n=1)
        offered = [one for one in _OFFERED[kind] if one.lower() in close]
        hint = f"did you mean '{offered[0]}'? Write" if offered else "write"
        raise ValueError(f'{shown(name)} is not a unit; {hint} {_a(kind)} like "{example}"') from None
    if kind == "frequency" and value > 0.0 and quantity.unit.is_equivalent(u.m):
        frequency = (SPEED_OF_LIGHT / quantity).to_value("GHz")
        raise ValueError(f'{shown(given)} is a wavelength; write the frequency, "{frequency:.4g} GHz"')
    try:
        with np.errstate(over="ignore"):
            converted = float(quantity.to_value(_unit(unit)))
    except u.UnitConversionError:
        raise ValueError(f'{shown(given)} is not {_a(kind)}; write it like "{example}"') from None
    if not np.isfinite(converted):
        raise ValueError(f'{shown(given)} is not finite in {unit}; write it like "{example}"')
    return converted


def theta_g(mass: float, distance: float) -> float:
    """Angular gravitational radius GM/(c²D) [µas] of a mass [M☉] at a distance [Mpc]."""
    return THETA_G_OF_SUN * mass / distance


def mass_from(theta: float, distance: float) -> float:
    """Mass [M☉] of an angular gravitational radius [µas] at a distance [Mpc]."""
    return theta * distance / THETA_G_OF_SUN


def _a(kind: str) -> str:
    return f"{'an' if kind[0] in 'aeiou' else 'a'} {kind}"
