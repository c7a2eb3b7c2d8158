"""What kind of file somebody handed over where another kind was due, and what that kind is good for.

Scene, scan and observation files are told apart by the tables that only one of them has; products and FITS images by their first
bytes (HDF5 file format 3.0, section II.A; FITS standard 4.0, section 4.4.1). No units.
"""

from __future__ import annotations

import tomllib
from collections.abc import Iterable
from pathlib import Path

HDF5_START = b"\x89HDF\r\n\x1a\n"
FITS_START = b"SIMPLE  ="
LARGEST_TEXT = 2**22  # files of settings are smaller
# Tables that stand in one kind of file only.
TABLES = {"scene": {"view", "emitter"}, "scan": {"sampling", "vary"}, "observation": {"diameter"}}
USES = {
    "scene": "a scene file: `ringwright render {path}` renders it, and a scan file names it as its base scene",
    "scan": "a scan file: run `ringwright scan {path}`, which writes a scan product",
    "observation": "an observation file: `ringwright compare {path} SCAN_PRODUCT` takes it, before the scan products",
    "product": "a product of ringwright or another HDF5 file: images go to `ringwright measure`, and scans to "
    "`ringwright compare`, after the observation file",
    "fits": "a FITS image: `ringwright measure {path}` measures its ring",
}


def kind_of_keys(keys: Iterable[str]) -> str:
    """The kind of file that has these keys at its top; "" where they fit none or several."""
    kinds = [kind for kind, tables in TABLES.items() if tables & set(keys)]
    return kinds[0] if len(kinds) == 1 else ""


def kind_of_bytes(raw: bytes) -> str:
    """The kind of a whole file; "" where it is none of ours."""
    if raw.startswith(HDF5_START):
        return "product"
    if raw.startswith(FITS_START):
        return "fits"
    try:
        return kind_of_keys(tomllib.loads(raw.decode("utf-8-sig")))
    except (ValueError, RecursionError):
        return ""


def mistaken(path: Path, due: str) -> str:
    """A sentence for a file of ours that is not what was due; "" where it is none of ours, or too large for one."""
    found = "" if path.stat().st_size > LARGEST_TEXT else kind_of_bytes(path.read_bytes())
    return f"{path}: this is {use_of(found, path)}. Here {article(due)} is due" if found in TABLES else ""


def use_of(kind: str, path: str | Path) -> str:
    """What a file of this kind is, and what to do with it."""
    return USES[kind].format(path=path)


def article(noun: str) -> str:
    """A noun with the indefinite article that it asks for."""
    return f"an {noun}" if noun[:1] in "aeiou" else f"a {noun}"
