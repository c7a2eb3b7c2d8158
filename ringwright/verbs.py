"""What each verb of the command line does: call the front door, print what a person or a program wants to know.

Nothing is computed here. Functions are named as the verbs and return the exit status.
"""

from __future__ import annotations

import argparse
import sys
from pathlib import Path
from typing import Any

from ringwright import products
from ringwright.cli import DONE, SOME_FAILED, print_json
from ringwright.errors import InputError


def render(options: argparse.Namespace) -> int:
    """Render a scene; write the product, a picture, and a FITS image where asked."""
    from ringwright.figures.image import draw_image
    from ringwright.image import KIND
    from ringwright.rendering import render as render_scene
    from ringwright.scenes import load_scene

    scene = load_scene(options.scene)
    target = Path(options.out or products.default_output(scene.name, ".h5"))
    products.check_target(target, KIND, scene.name, replace=options.replace)
    for suffix in (".png", ".fits") if options.fits else (".png",):
        products.check_companion(target.with_suffix(suffix), scene.name, replace=options.replace)
    image = render_scene(scene, maps=options.maps, accuracy=options.accuracy)
    earlier = _earlier(target, image.provenance)
    written = [image.save(target, replace=options.replace), draw_image(image, target.with_suffix(".png"))]
    if options.fits:
        written.append(image.to_fits(target.with_suffix(".fits"), replace=True))
    _print_all("replaced", earlier)
    if options.json:
        print_json({**image.summary(), "files": [str(path) for path in written]})
        return DONE
    unit = "Jy" if image.in_jansky else "of the light"
    for order, (flux, inside) in enumerate(zip(image.flux, image.flux_in_field, strict=True)):
        print(f"order {order}: {flux:.6g} {unit}, {inside:.6g} of it in the field")
    _print_all("note", image.notes)
    _print_all("wrote", written)
    return DONE


def profile(options: argparse.Namespace) -> int:
    """Resolve the photon rings of a scene; write the product and its figures."""
    from ringwright.figures.profile import draw_profile, targets
    from ringwright.profiling.product import KIND
    from ringwright.profiling.profile import profile as profile_scene
    from ringwright.profiling.wording import describe
    from ringwright.scenes import load_scene

    scene = load_scene(options.scene)
    target = Path(options.out or products.default_output(f"{scene.name}-profile", ".h5"))
    products.check_target(target, KIND, scene.name, replace=options.replace)
    for picture in targets(target.with_suffix("")):
        products.check_companion(picture, scene.name, replace=options.replace)
    found = profile_scene(
        scene,
        orders=options.orders,
        position_angles=options.position_angle,
        angles=options.angles,
        longest=options.longest,
        sensitivity=options.sensitivity,
        emitting_radius=options.emitting_radius,
        accuracy=options.accuracy,
    )
    earlier = _earlier(target, found.provenance)
    written = [found.save(target, replace=options.replace), *draw_profile(found, target.with_suffix(""))]
    _print_all("replaced", earlier)
    if options.json:
        print_json({**found.summary(), "files": [str(path) for path in written]})
        return DONE
    print(describe(found))
    _print_all("note", found.notes)
    _print_all("wrote", written)
    return DONE


def measure(options: argparse.Namespace) -> int:
    """Measure the ring on one or many images."""
    from ringwright.ring.measuring import measure as measure_ring
    from ringwright.ring.measuring import ring_table
    from ringwright.ring.wording import describe

    rings = [
        measure_ring(path, resolution=options.resolution, centre=options.centre, lengths=options.lengths)
        for path in options.images
    ]
    table = ring_table(options.images, rings)
    written = []
    if options.out:
        if Path(options.out).exists() and not options.replace:
            raise InputError(f"{options.out} exists and is kept; name another file or say --replace")
        with products.written_whole(options.out) as temporary:
            table.write(temporary, format="ascii.ecsv", overwrite=True)
        written.append(options.out)
    if options.picture:
        written += [
            _ring_picture(path, ring, options.replace)
            for path, ring in zip(options.images, rings, strict=True)
        ]
    if options.json:
        print_json({"rings": [ring.to_json() for ring in rings], "files": [str(path) for path in written]})
        return DONE
    print(describe(rings, table))
    _print_all("wrote", written)
    return DONE


def scan(options: argparse.Namespace) -> int:
    """Run a scan."""
    from ringwright.progress import reporting
    from ringwright.scanfile import load_scan
    from ringwright.scanning.finished import finished
    from ringwright.scanning.running import scan as run_scan
    from ringwright.scanning.table import SCENE_FAILED

    plan = load_scan(options.scan)
    _print_all("note", getattr(plan, "notices", ()))
    target = Path(options.out or products.default_output(plan.name, ".h5"))
    table = already = None if options.replace else finished(plan, target)
    if table is None:
        with reporting(plan.name) as progress:
            table = run_scan(
                plan, target, workers=options.workers, replace=options.replace, progress=progress
            )
    else:
        same = "made of the same scan file, base scene and versions; --replace computes it again"
        _print_all("note", [f"{target} is this scan already, {same}"])
    failed = int((table.status == SCENE_FAILED).sum())
    rings = int(((table.outcome == 0).any(axis=1)).sum())
    if options.json:
        summary = {"name": table.name, "family": table.family, "scenes": len(table.status), "failed": failed}
        print_json({**summary, "with_a_ring": rings, "files": [str(target)]})
    else:
        print(
            f"{table.name}: {len(table.status)} scenes, {rings} with a ring at some resolution, {failed} failed"
        )
        _print_all("failed", sorted({reason for reason in table.reason if reason}))
        _print_all("wrote" if already is None else "kept", [target])
    return SOME_FAILED if failed else DONE


def compare(options: argparse.Namespace) -> int:
    """Compare an observation with scans, write the answer and draw the figures."""
    from ringwright.comparing import compare as compare_ring
    from ringwright.comparing import summary
    from ringwright.comparing.report import earlier_answer, report_path, write_report
    from ringwright.figures.comparison import draw_comparison, targets
    from ringwright.observation import load_observation

    observation = load_observation(options.observation)
    stem = Path(options.out) if options.out else products.default_output(observation.name, "")
    for target in (report_path(stem), *targets(stem)):
        products.check_companion(target, observation.name, replace=options.replace)
    answer = compare_ring(observation, *options.scans)
    earlier = earlier_answer(answer, stem)
    written = [write_report(answer, stem), *draw_comparison(answer, stem)]
    _print_all("replaced", [f"an earlier answer, {earlier}"] if earlier else [])
    stale = [path for path in targets(stem) if path not in written and path.exists()]
    _print_all("note", [f"{path} was not drawn again and shows an earlier answer" for path in stale])
    if options.json:
        print_json({**answer.to_json(), "files": [str(path) for path in written]})
        return DONE
    print(summary(answer))
    _print_all("wrote", written)
    return DONE


def new(options: argparse.Namespace) -> int:
    """Write a commented file to start from."""
    from ringwright.scenes import new_file

    _print_all("wrote", [new_file(options.kind, options.file, replace=options.replace)])
    return DONE


def schema(options: argparse.Namespace) -> int:
    """Print the JSON Schema of scene files."""
    from ringwright.scenes import scene_schema

    print_json(scene_schema())
    return DONE


def _earlier(target: Path, provenance: dict[str, Any]) -> list[str]:
    """That a product made of something else stands at the target, which is about to be replaced."""
    try:
        other = products.differences(target, provenance)
    except OSError:  # nothing there, or no product
        return []
    return [f"an earlier {target}, which differed in {', '.join(other)}"] if other else []


def _ring_picture(path: str, ring: Any, replace: bool) -> Path:
    from ringwright.figures.ring import picture

    target = products.default_output(Path(path).stem, "-ring.png")
    products.check_companion(target, ring.name, replace=replace)
    return picture(path, ring, target)


def _print_all(label: str, things: Any) -> None:
    for thing in things:
        print(f"{label}: {thing}", file=sys.stderr)
