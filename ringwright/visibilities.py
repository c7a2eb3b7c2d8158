"""Complex visibilities of light on the sky, from samples of it or from the pixels of an image.

V(u, v) = ∬ I exp[−2πi(ux + vy)] dx dy with x to the east and y to the north (the convention of OIFITS 2, Duvert,
Young & Hummel 2017, A&A 597, A8), summed over samples directly or with the non-uniform fast Fourier
transforms of Barnett, Magland & af Klinteberg 2019 (SIAM J. Sci. Comput. 41, C479). Offsets in radians from
the phase centre, baselines in wavelengths, visibilities in the unit of the flux.
"""

from __future__ import annotations

import math
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from ringwright.errors import InputError

if TYPE_CHECKING:
    from astropy.units import Quantity

    from ringwright.fits import SkyImage
    from ringwright.image import Image

Array = NDArray[np.float64]
Complex = NDArray[np.complex128]

# Error allowed, relative to the flux: far below the noise of any array, and cheap.
ACCURACY = 1e-9
# Rounding of the transforms comes within a tenth of the finest; beyond the coarsest nothing is saved.
FINEST, COARSEST = 1e-11, 1e-2
# The transforms promise their accuracy as a mean over many points; a single bright point among dark ones was
# seen up to 20 times worse.
SINGLE_POINT = 30.0
# Pairs of sample and baseline that a direct sum takes in well under 0.1 s, not worth loading a library for.
FEW_PAIRS = 300_000
# One cell of the transform's grid costs as much time as about this many pairs of the direct sum.
PAIRS_PER_CELL = 5
# Pairs summed at a time: phases and their sines stay in the cache.
TILE = 32_768
# Points that the transform's spreading kernel needs beyond its grid.
KERNEL_WIDTH = 16
# Bytes at the peak, as measured: per cell of the grid between samples and baselines, and per pixel.
BYTES_PER_CELL = 120
BYTES_PER_PIXEL = 100
MEMORY_SHARE = 0.8
# One thread gives the same last digit every time, and workers of a scan have no more.
THREADS = 1
# A fringe needs two pixels.
PIXELS_PER_FRINGE = 2.0
ROUNDING = 1e-12


def visibility(image: Any, *, baseline: Any, position_angle: Any) -> Quantity:
    """Complex visibility of an image on baselines of given lengths and directions.

    Parameters
    ----------
    image : Image, SkyImage or path
        A rendered image, one read by `read_fits`, or the path of our HDF5 or of any FITS image with a
        celestial WCS.
    baseline : Quantity, str or sequence of them
        Length in observing wavelengths, such as "8 Glambda", or `numpy.linspace(0, 8, 81) * GLAMBDA` with
        `ringwright.units.GLAMBDA`. Of any shape that broadcasts with the other.
    position_angle : Quantity, str or sequence of them
        Direction of the baseline on the sky, east of north, such as "30 deg".

    Returns
    -------
    Quantity
        Complex, in Jy. Where the image has no flux density it is dimensionless: the share of the source's light
        for a rendered image, of the image's own for a FITS image in K or in no unit.

    Raises
    ------
    InputError
        As `of_image`; also for a file that cannot be read and a number without its unit.

    Notes
    -----
    Phases are those about the middle of the image. What `of_image` says of pixels and beams holds here.
    """
    from astropy import units

    from ringwright.ring.measuring import open_image

    opened = open_image(image) if isinstance(image, (str, Path)) else image
    length = _given(baseline, "baseline", "the baseline")
    angle = _given(position_angle, "angle", "the position angle of the baseline")
    length, angle = _together(length, angle, "baselines and position angles")
    values = of_image(opened, u=length * np.sin(angle), v=length * np.cos(angle))
    return units.Quantity(values, "Jy" if _in_jansky(opened) else "")


def of_samples(
    x: ArrayLike, y: ArrayLike, flux: ArrayLike, *, u: ArrayLike, v: ArrayLike, accuracy: float = ACCURACY
) -> Complex:
    """Visibilities of samples of light, V = Σ flux exp[−2πi(ux + vy)].

    Parameters
    ----------
    x, y : array_like (n,)
        Offsets to the east and to the north [rad].
    flux : array_like (n,)
        Brightness times area of each sample, in any unit.
    u, v : array_like
        Baselines toward the east and the north [wavelengths], broadcast together.
    accuracy : float
        Error allowed, relative to Σ|flux|. Few pairs of samples and baselines are summed directly, to
        rounding.

    Returns
    -------
    complex array
        In the unit of `flux`, of the shape that `u` and `v` broadcast to; a scalar for scalars.

    Raises
    ------
    InputError
        If shapes do not fit, a number is not finite, the accuracy is out of range, or memory does not suffice.
    """
    east, north, light = (np.atleast_1d(np.asarray(each, dtype=np.float64)) for each in (x, y, flux))
    if not east.shape == north.shape == light.shape == (light.size,):
        raise InputError(
            f"every sample needs one x, one y and one flux; their shapes are {east.shape}, {north.shape} and "
            f"{light.shape}"
        )
    if not (np.isfinite(east).all() and np.isfinite(north).all() and np.isfinite(light).all()):
        raise InputError("some samples have an x, y or flux that is not finite; leave them out")
    across, up = _baselines(u, v)
    _check_accuracy(accuracy)
    if across.size == 0 or light.size == 0:
        return np.zeros(across.shape, dtype=np.complex128)
    transform = _transformed if _transform_pays(east, north, across, up) else _summed
    return transform(east, north, light, across.ravel(), up.ravel(), accuracy).reshape(across.shape)[()]


def of_image(
    image: Image | SkyImage,
    *,
    u: ArrayLike,
    v: ArrayLike,
    order: int | None = None,
    accuracy: float = ACCURACY,
) -> Complex:
    """Visibilities of the pixels of an image, each at its centre.

    A pixel holds the light of its area, so the picture is the sky convolved with a square pixel, and its
    visibility that of the sky times sinc(u·dx) sinc(v·dx), a factor 0.64 along an axis where a fringe is two
    pixels. That response is in the picture and is not divided out; so is the beam of an image that has one.

    Parameters
    ----------
    image : Image or SkyImage
        On the sky; row 0 south, column 0 east. The phase centre is the middle of the array.
    u, v : array_like
        Baselines toward the east and the north [wavelengths], broadcast together.
    order : int, optional
        One order of a rendered image; all light where not given.
    accuracy : float
        Error allowed, relative to the sum over |pixels|.

    Returns
    -------
    complex array
        In Jy, or as a share of the light where the image has no flux density; of the shape that `u` and `v`
        broadcast to; a scalar for scalars.

    Raises
    ------
    InputError
        If the image is in units of M or has blank pixels, has no such order, a baseline has fringes finer than
        two pixels or is not finite, the accuracy is out of range, or memory does not suffice.
    """
    light, pixel = _light(image, order), _pixel_radians(image)
    across, up = _baselines(u, v)
    _check_accuracy(accuracy)
    _refuse_aliased(across, up, pixel)
    if across.size == 0:
        return np.zeros(across.shape, dtype=np.complex128)
    return _gridded(light, pixel, across.ravel(), up.ravel(), accuracy).reshape(across.shape)[()]


def _summed(x: Array, y: Array, flux: Array, u: Array, v: Array, accuracy: float) -> Complex:
    """The sum itself, exact to rounding whatever accuracy is asked for."""
    values = np.empty(u.size, dtype=np.complex128)
    step = max(1, TILE // x.size)
    for start in range(0, u.size, step):
        some = slice(start, start + step)
        turns = np.multiply.outer(u[some], x) + np.multiply.outer(v[some], y)
        phase = (2.0 * np.pi) * turns
        values.real[some] = np.cos(phase) @ flux
        values.imag[some] = -(np.sin(phase) @ flux)
    return values


def _transformed(x: Array, y: Array, flux: Array, u: Array, v: Array, accuracy: float) -> Complex:
    """From points to points (type 3)."""
    import finufft

    _check_memory(
        BYTES_PER_CELL * _cells(x, y, u, v),
        f"{x.size} samples on {u.size} baselines",
        "ask for a smaller field, or for shorter baselines",
    )
    points = [np.ascontiguousarray(each) for each in (x, y, flux.astype(np.complex128))]
    targets = [np.ascontiguousarray(2.0 * np.pi * each) for each in (u, v)]
    tolerance = accuracy / SINGLE_POINT
    return np.asarray(finufft.nufft2d3(*points, *targets, isign=-1, eps=tolerance, nthreads=THREADS))


def _gridded(light: Array, pixel: float, u: Array, v: Array, accuracy: float) -> Complex:
    """From a grid to points (type 2), which counts rows and columns from the integer middle."""
    import finufft

    _check_memory(
        BYTES_PER_PIXEL * light.size,
        f"an image of {light.shape[1]} by {light.shape[0]} pixels",
        "give one of fewer pixels",
    )
    up, across = (np.ascontiguousarray(2.0 * np.pi * pixel * each) for each in (v, u))
    plane = np.ascontiguousarray(light, dtype=np.complex128)
    tolerance = accuracy / SINGLE_POINT
    values = finufft.nufft2d2(up, -across, plane, isign=-1, eps=tolerance, nthreads=THREADS)
    # The middle of an even number of pixels lies half a pixel before the one that counts as 0.
    north, east = (0.5 if side % 2 == 0 else 0.0 for side in light.shape)
    return np.asarray(values * np.exp(-1j * (north * up - east * across)))


def _transform_pays(x: Array, y: Array, u: Array, v: Array) -> bool:
    pairs = x.size * u.size
    return bool(pairs > max(FEW_PAIRS, PAIRS_PER_CELL * _cells(x, y, u, v)))


def _cells(x: Array, y: Array, u: Array, v: Array) -> float:
    """Cells of the grid between samples and baselines, oversampled by two: the space-bandwidth product."""
    east, north = 2.0 * np.ptp(x) * np.ptp(u), 2.0 * np.ptp(y) * np.ptp(v)
    return float((east + KERNEL_WIDTH) * (north + KERNEL_WIDTH))


def _baselines(u: ArrayLike, v: ArrayLike) -> tuple[Array, Array]:
    across, up = _together(u, v, "u and v")
    if not (np.isfinite(across).all() and np.isfinite(up).all()):
        raise InputError("some baselines are not finite; leave them out")
    return across, up


def _together(first: ArrayLike, second: ArrayLike, what: str) -> tuple[Array, Array]:
    one, other = np.asarray(first, dtype=np.float64), np.asarray(second, dtype=np.float64)
    try:
        shape = np.broadcast_shapes(one.shape, other.shape)
    except ValueError as error:
        raise InputError(f"{what} of shapes {one.shape} and {other.shape} do not go together") from error
    return np.broadcast_to(one, shape), np.broadcast_to(other, shape)


def _check_accuracy(accuracy: float) -> None:
    if not FINEST <= accuracy <= COARSEST:
        raise InputError(
            f"the accuracy of visibilities is relative to the flux, between {FINEST:g} and {COARSEST:g}, not {accuracy:g}"
        )


def _refuse_aliased(u: Array, v: Array, pixel: float) -> None:
    longest = 1.0 / (PIXELS_PER_FRINGE * pixel)
    asked = max(np.abs(u).max(initial=0.0), np.abs(v).max(initial=0.0))
    if asked > longest * (1.0 + ROUNDING):
        raise InputError(
            f"a baseline reaches {asked / 1e9:.4g} Gλ to the east or north, and pixels of "
            f"{math.degrees(pixel) * 3.6e9:.4g} µas carry baselines up to {longest / 1e9:.4g} Gλ, where a fringe is two "
            "pixels: render with smaller pixels, or use `ringwright profile`, which takes the light from the screen "
            "itself"
        )


def _check_memory(needed: float, what: str, remedy: str) -> None:
    from ringwright.machine import memory_limit

    limit = MEMORY_SHARE * memory_limit()
    if needed > limit:
        raise InputError(
            f"the visibilities of {what} need about {needed / 2**30:.1f} GiB and {limit / 2**30:.1f} GiB may be used "
            f"here; {remedy}"
        )


def _light(image: Image | SkyImage, order: int | None) -> Array:
    """Light in each pixel, shape (y, x): Jy, or a share."""
    from ringwright.image import Image

    if isinstance(image, Image):
        light = _of_order(image, order)
        blank = int(np.count_nonzero(~np.isfinite(light)))
    else:
        if order is not None:
            raise InputError(f"'{image.name}' was not rendered here, so its light is not known by order")
        light, blank = image.data, image.blank
    if blank:
        raise InputError(
            f"{blank} of {light.size} pixels of '{image.name}' are blank, and a visibility needs the light of all; "
            "set those that are dark to 0, or cut out a field without them"
        )
    return light if isinstance(image, Image) else light * _scale(image)


def _of_order(image: Image, order: int | None) -> Array:
    if order is None:
        return image.total
    if not 0 <= order < len(image.intensity):
        raise InputError(
            f"'{image.name}' has the orders 0 to {len(image.intensity) - 1}, and no order {order}"
        )
    return np.asarray(image.intensity[order])


def _pixel_radians(image: Image | SkyImage) -> float:
    if image.pixel.unit.physical_type != "angle":
        raise InputError(
            f"'{image.name}' is in units of M, and a baseline needs the angle that M is on the sky: "
            "give the scene theta_g, or mass and distance"
        )
    return float(image.pixel.to_value("rad"))


def _in_jansky(image: Image | SkyImage) -> bool:
    from ringwright.image import Image

    return image.in_jansky if isinstance(image, Image) else image.jansky is not None


def _scale(image: SkyImage) -> float:
    """What takes the numbers of a FITS image to Jy per pixel, or to shares of their sum."""
    if image.jansky is not None:
        return image.jansky
    total = float(image.data.sum())
    if not total > 0.0:
        raise InputError(
            f"the pixels of '{image.name}' add up to {total:g}, so there is no light to share out"
        )
    return 1.0 / total


def _given(value: Any, kind: str, what: str) -> Array:
    from ringwright.units import parse_array

    try:
        return parse_array(value, kind)
    except ValueError as error:
        raise InputError(f"{what}: {error}") from error
