"""Files that survive: products are written beside their target and renamed, and carry what made them.

A reader sees the old file or the new one, never half of one. A file that is not our product of the same
name is never replaced unless the caller says so, and `differences` tells whether that product was made of the
same input. The same input gives the same bytes: no time, host or process number is stored.
"""

from __future__ import annotations

import json
import os
import tempfile
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from hashlib import sha256
from importlib.metadata import PackageNotFoundError, version
from pathlib import Path
from typing import Any

import h5py
import numpy as np

from ringwright import __version__
from ringwright.errors import InputError
from ringwright.kinds import article, mistaken

FORMAT_VERSION = 1
# Chunks and compression of image data: small enough to read a cut-out, strong enough to catch a flipped bit.
CHUNK = 128
COMPRESSION = {"compression": "gzip", "compression_opts": 2, "shuffle": True, "fletcher32": True}
OUTPUTS = Path("outputs")
# Pictures and FITS files say in their first bytes who wrote them and for what name.
MARK = b"ringwright"
HEAD_BYTES = 8192
MAKERS = {"scan": "`ringwright scan SCAN_FILE`", "image": "`ringwright render SCENE_FILE`"}
# What made a product, as people call it; two products that agree in all of it are the same.
MADE_OF = {
    "source_text": "its file",
    "resolved": "the scene that it starts from",
    "tables": "a table of brightness that it reads",
    "versions": "the versions of ringwright and its libraries",
}


def default_output(name: str, suffix: str) -> Path:
    """Where a product goes when nobody said: outputs/<name><suffix> under the current folder."""
    return OUTPUTS / f"{name}{suffix}"


def check_target(path: str | Path, kind: str, name: str, *, replace: bool) -> Path:
    """Refuse a target that holds something else than our product of the same kind and name.

    Raises
    ------
    InputError
        If the file exists, is not that product, and `replace` is not set; or if the target is a folder.
    """
    target = Path(path)
    if target.is_dir():
        raise InputError(f"{target} is a folder; give the name of a file")
    if not target.exists() or replace:
        return target
    try:
        with h5py.File(target, "r", locking="best-effort") as file:
            found = (str(file.attrs.get("product", "")), str(file.attrs.get("name", "")))
    except OSError:
        found = ("", "")
    if found != (kind, name):
        what = f"{article(found[0])} product of '{found[1]}'" if found[0] else "not a product of ringwright"
        raise InputError(
            f"{target} exists and is {what}, so it is kept; name another file with --out, or say --replace"
        )
    return target


def differences(path: str | Path, provenance: dict[str, Any]) -> list[str]:
    """In words, what made the product at a path that is not what `provenance` says; [] for the same."""
    with h5py.File(path, "r", locking="best-effort") as file:
        return [
            words for key, words in MADE_OF.items() if str(file.attrs.get(key, "")) != provenance.get(key, "")
        ]


def check_companion(path: str | Path, name: str, *, replace: bool) -> None:
    """Refuse a picture or FITS file that we did not write for the same name.

    Raises
    ------
    InputError
        If the file exists, does not carry our mark and the name in its head, and `replace` is not set.
    """
    target = Path(path)
    if replace or not target.exists():
        return
    head = b""
    if target.is_file():
        with target.open("rb") as file:
            head = file.read(HEAD_BYTES)
    if not (MARK in head and name.encode() in head):
        raise InputError(
            f"{target} exists and was not written by ringwright for '{name}', so it is kept; name another file with "
            "--out, or say --replace"
        )


@contextmanager
def written_whole(target: str | Path) -> Iterator[Path]:
    """A temporary file beside the target that takes its place when the block ends well, and vanishes
    otherwise.
    """
    target = Path(target)
    try:
        target.parent.mkdir(parents=True, exist_ok=True)
        handle, name = tempfile.mkstemp(prefix=f".{target.name}.", suffix=target.suffix, dir=target.parent)
    except OSError as problem:
        raise InputError(f"cannot write {target}: {problem.strerror or problem}") from problem
    os.close(handle)
    temporary = Path(name)
    try:
        yield temporary
        with temporary.open("rb") as file:
            os.fsync(file.fileno())
        temporary.chmod(0o666 & ~_umask())
        temporary.replace(target)
    finally:
        temporary.unlink(missing_ok=True)


def write_product(
    target: str | Path, kind: str, name: str, fill: Callable[[h5py.File], None], provenance: dict[str, Any]
) -> None:
    """Write one HDF5 product: identity and provenance first, then what `fill` puts into it."""
    with written_whole(target) as temporary, h5py.File(temporary, "w") as file:
        file.attrs["product"] = kind
        file.attrs["name"] = name
        file.attrs["format_version"] = FORMAT_VERSION
        for key, value in provenance.items():
            file.attrs[key] = value if isinstance(value, str | int | float) else json.dumps(value)
        fill(file)


@contextmanager
def open_product(path: str | Path, kind: str) -> Iterator[h5py.File]:
    """Open one of our products for reading.

    Raises
    ------
    InputError
        If the file is absent, not HDF5, of another kind or of a later format.
    """
    path = Path(path)
    if not path.is_file():
        maker = MAKERS.get(kind, "")
        raise InputError(
            f"there is no file {path}" + (f"; {maker} writes {article(kind)} product" if maker else "")
        )
    try:
        file = h5py.File(path, "r", locking="best-effort")
    except OSError as problem:
        unreadable = f"{path} is not a readable HDF5 file (truncated, or something else)"
        raise InputError(mistaken(path, f"{kind} product") or unreadable) from problem
    with file:
        found = str(file.attrs.get("product", ""))
        if found != kind:
            what = f"{article(found)} product" if found else "not a product of ringwright"
            raise InputError(f"{path} is {what}; {article(kind)} product is needed here")
        if int(file.attrs.get("format_version", 0)) > FORMAT_VERSION:
            raise InputError(
                f"{path} has format version {file.attrs['format_version']} and this ringwright reads up to "
                f"{FORMAT_VERSION}; use the version that wrote it or a later one"
            )
        try:
            yield file
        except (KeyError, OSError) as problem:
            raise InputError(f"{path} is damaged or incomplete: {problem}") from problem


def provenance(text: str, resolved: dict[str, Any], **extra: Any) -> dict[str, Any]:
    """What made a product: the input text with its checksum, every resolved parameter, the versions."""
    return {
        "source_text": text,
        "source_sha256": sha256(text.encode()).hexdigest(),
        "resolved": json.dumps(resolved, sort_keys=True),
        "versions": json.dumps(_versions(), sort_keys=True),
        **extra,
    }


def image_dataset(group: h5py.Group, name: str, data: np.ndarray, units: str, long_name: str) -> h5py.Dataset:
    """Store an image stack as chunked, compressed, checksummed float32."""
    chunks = (1,) * (data.ndim - 2) + (min(CHUNK, data.shape[-2]), min(CHUNK, data.shape[-1]))
    dataset = group.create_dataset(name, data=data.astype(np.float32), chunks=chunks, **COMPRESSION)
    dataset.attrs["units"] = units
    dataset.attrs["long_name"] = long_name
    return dataset


def scale(file: h5py.File, name: str, values: np.ndarray, units: str, long_name: str) -> None:
    """Store a coordinate as a dimension scale whose name equals the dimension's."""
    dataset = file.create_dataset(name, data=values)
    dataset.make_scale(name)
    dataset.attrs["units"] = units
    dataset.attrs["long_name"] = long_name


def attach(file: h5py.File, dataset: h5py.Dataset, names: tuple[str, ...]) -> None:
    """Label the dimensions of a dataset and attach their coordinates."""
    for axis, name in enumerate(names):
        dataset.dims[axis].label = name
        dataset.dims[axis].attach_scale(file[name])


def _versions() -> dict[str, str]:
    found = {"ringwright": __version__}
    for package in ("numpy", "numba", "scipy", "h5py", "astropy"):
        try:
            found[package] = version(package)
        except PackageNotFoundError:
            found[package] = "unknown"
    return found


def _umask() -> int:
    mask = os.umask(0)
    os.umask(mask)
    return mask
