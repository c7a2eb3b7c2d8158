"""Rendering: a scene becomes an image whose every pixel holds the light that falls into its area.

The light of each order is sampled where the screen puts its nodes and shared among pixels by
`ringwright.light`, so that the flux per order does not depend on the pixel size, however thin the ring.
Maps on request are traced at pixel centres. Units leave here: lengths in M become µas where θ_g is known,
brightness becomes Jy per pixel where a total flux is.
"""

from __future__ import annotations

import math
from pathlib import Path

import numpy as np

import emission as em
import raytrace as rt
from raytrace.contract import Array, RayStatus
from ringwright import products
from ringwright.errors import InputError
from ringwright.image import Image
from ringwright.light import LitBand, light_up
from ringwright.sampling import accuracy_note, check_accuracy, flux_scale
from ringwright.scenes import Scene, load_scene

# Interpolation error allowed, relative to the brightest point of each order.
ACCURACY = 1e-5
# Rays exchanged at a time between tracing and shading.
TILE = 65_536
# Shares that are worth a sentence: light outside the field, and a ring thinner than so many pixels.
NOTABLE_LOSS = 1e-3
NOTABLE_THIN = 1.0
# Bytes per pixel at the peak: the stack, its total, one copy on the way to the file.
BYTES_PER_PIXEL = 8 * 3
MEMORY_SHARE = 0.8


def render(scene: Scene | str | Path, *, maps: bool = False, accuracy: float = ACCURACY) -> Image:
    """Render a scene.

    Parameters
    ----------
    scene : Scene or path of a scene file
    maps : bool
        Also trace crossing radius, redshift factor and delay at the pixel centres.
    accuracy : float
        Interpolation error allowed, relative to the brightest point of each order.

    Returns
    -------
    Image

    Raises
    ------
    InputError
        If the scene has no light at all or does not fit in memory, or the accuracy is not one.
    SceneError
        If the scene file cannot be used.
    """
    if not isinstance(scene, Scene):
        scene = load_scene(scene)
    check_accuracy(accuracy)
    _check_memory(scene, maps)
    bands = light_up(scene, accuracy=accuracy)
    stack = np.zeros((scene.orders, scene.pixels, scene.pixels))
    flux = np.zeros(scene.orders)
    for lit in bands:
        before = float(stack[lit.order].sum())
        lit.add_to(stack[lit.order], scene.field_m / scene.pixels, scene.position_angle)
        flux[lit.order] += lit.flux if math.isfinite(lit.flux) else float(stack[lit.order].sum()) - before
    np.maximum(stack, 0.0, out=stack)
    scale = flux_scale(scene, float(flux.sum()))
    stack *= scale
    in_field = stack.sum(axis=(1, 2))
    width = _widths(bands, scene.orders)
    return Image(
        name=scene.name,
        intensity=stack,
        pixel_m=scene.field_m / scene.pixels,
        theta_g_uas=None if scene.theta_g is None else float(scene.theta_g.to_value("uas")),
        frequency_hz=None if scene.frequency is None else float(scene.frequency.to_value("Hz")),
        position_angle=scene.position_angle,
        in_jansky=scene.total_flux is not None,
        flux=flux * scale,
        flux_in_field=in_field,
        band_width=width,
        maps=_maps(scene) if maps else {},
        accuracy=accuracy,
        interpolation_error=_errors(bands, scene.orders),
        notes=_notes(scene, bands, flux * scale, in_field, width, accuracy),
        position=_position(scene),
        provenance=products.provenance(scene.text, scene.resolved()),
    )


def _position(scene: Scene) -> tuple[float, float] | None:
    if scene.position is None:
        return None
    ra, dec = scene.position
    return float(ra.to_value("deg")), float(dec.to_value("deg"))


def _widths(bands: tuple[LitBand, ...], orders: int) -> Array:
    width = np.full(orders, np.inf)
    for lit in bands:
        width[lit.order] = min(width[lit.order], lit.width)
    return np.where(np.isfinite(width), width, 0.0)


def _errors(bands: tuple[LitBand, ...], orders: int) -> Array:
    """Estimated interpolation error of each order relative to its brightest point."""
    return np.array([max((lit.error for lit in bands if lit.order == n), default=0.0) for n in range(orders)])


def _notes(
    scene: Scene, bands: tuple[LitBand, ...], flux: Array, in_field: Array, width: Array, accuracy: float
) -> tuple[str, ...]:
    pixel = scene.field_m / scene.pixels
    found = []
    for order in range(scene.orders):
        if flux[order] <= 0.0:
            continue
        lost = 1.0 - in_field[order] / flux[order]
        if lost > NOTABLE_LOSS:
            found.append(
                f"{100.0 * lost:.2g} % of the light of order {order} falls outside the field of {scene.field_m:.4g} M"
            )
        if width[order] < NOTABLE_THIN * pixel:
            found.append(
                f"the ring of order {order} is {width[order]:.2g} M wide, {width[order] / pixel:.2g} of a pixel: "
                "its flux is right, its profile is not resolved"
            )
    return (*found, *accuracy_note((lit.error for lit in bands), accuracy))


def _maps(scene: Scene) -> dict[str, Array]:
    """Crossing radius, redshift factor (of the first disk) and delay at pixel centres, in tiles."""
    side = scene.pixels
    shape = (scene.orders, side * side)
    maps = {name: np.full(shape, np.nan) for name in ("crossing_radius", "redshift_factor", "delay")}
    offsets = (np.arange(side) - 0.5 * (side - 1)) * (scene.field_m / side)
    cosine, sine = math.cos(scene.position_angle), math.sin(scene.position_angle)
    flow = next((emitter.flow for _, emitter in scene.emitters if hasattr(emitter, "flow")), None)
    for start in range(0, side * side, TILE):
        tile = slice(start, min(start + TILE, side * side))
        index = np.arange(tile.start, tile.stop)
        x, y = offsets[index % side], offsets[index // side]
        hit = rt.trace(
            cosine * x + sine * y,
            -sine * x + cosine * y,
            inclination=scene.inclination,
            orders=scene.orders,
            spacetime=scene.spacetime,
        )
        maps["crossing_radius"][:, tile] = hit.radius
        maps["delay"][:, tile] = hit.delay
        if flow is not None:
            factor = em.redshift(flow, hit, spacetime=scene.spacetime)
            maps["redshift_factor"][:, tile] = np.where(hit.status == RayStatus.CROSSED, factor, np.nan)
    return {name: data.reshape(scene.orders, side, side) for name, data in maps.items()}


def _check_memory(scene: Scene, maps: bool) -> None:
    from ringwright.machine import memory_limit

    planes = scene.orders * (2 if maps else 1) + (3 * scene.orders if maps else 0) + 1
    needed = BYTES_PER_PIXEL * scene.pixels**2 * planes
    limit = MEMORY_SHARE * memory_limit()
    if needed > limit:
        fitting = int(scene.pixels * math.sqrt(limit / needed))
        raise InputError(
            f"rendering {scene.pixels}² pixels needs about {needed / 2**30:.1f} GiB and {limit / 2**30:.1f} GiB may be "
            f"used here; ask for at most {fitting} pixels, fewer orders, or no maps"
        )
