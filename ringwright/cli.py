"""The command line: one verb per job, results on standard output, log and progress on standard error.

Exit status: 0 done, 1 failure, 2 bad input or usage, 3 finished with failed scenes, 130 interrupted, 141 when nobody reads
the results any more. Each verb's work is imported when it is asked for, so that `--help` costs next to nothing.
"""

from __future__ import annotations

import argparse
import json
import os
import sys
from collections.abc import Sequence
from difflib import get_close_matches
from importlib import import_module

from ringwright import __version__
from ringwright.errors import InputError

DONE, FAILURE, BAD_INPUT, SOME_FAILED, INTERRUPTED, UNREAD = 0, 1, 2, 3, 130, 141
# A scan is written when it is whole; everything else that is interrupted is made again in seconds.
LOST = {"scan": "the scenes done so far are not kept, and "}


def main(arguments: Sequence[str] | None = None) -> int:
    """Run one verb and return the exit status."""
    options = _options(arguments)
    try:
        verb = getattr(import_module("ringwright.verbs"), options.verb)
        status = int(verb(options))
        sys.stdout.flush()
        return status
    except InputError as problem:
        print(f"ringwright {options.verb}: {problem}", file=sys.stderr)
        return BAD_INPUT
    except KeyboardInterrupt:
        lost = LOST.get(options.verb, "")
        print(f"ringwright {options.verb}: interrupted; {lost}nothing was overwritten", file=sys.stderr)
        return INTERRUPTED
    except BrokenPipeError:
        # What Python still holds for standard output has no reader; without this it would complain at its end.
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        return UNREAD
    except OSError as problem:
        print(f"ringwright {options.verb}: {problem.filename or ''}: {problem.strerror}", file=sys.stderr)
        return FAILURE


def print_json(value: object) -> None:
    """Print one JSON object on standard output."""
    print(json.dumps(value, indent=2, ensure_ascii=False, allow_nan=False))


def _options(arguments: Sequence[str] | None) -> argparse.Namespace:
    """What was asked for; something not understood is told with the usage of its verb."""
    parser, verbs = _parser()
    options, rest = parser.parse_known_args(arguments)
    if rest:
        verb = verbs.choices[options.verb]
        known = [name for name in verb.format_help().replace("[", " ").split() if name.startswith("--")]
        near = get_close_matches(rest[0], known, 1)
        verb.error(f"not understood: {' '.join(rest)}" + (f"; did you mean {near[0]}?" if near else ""))
    return options


def _parser() -> tuple[argparse.ArgumentParser, argparse._SubParsersAction[argparse.ArgumentParser]]:
    parser = argparse.ArgumentParser(
        prog="ringwright",
        description="From a measured ring to an angular gravitational radius and a mass with a named error.",
        epilog="A ring diameter is not a shadow diameter, and a prior is not a measurement.",
    )
    parser.add_argument("--version", action="version", version=f"ringwright {__version__}")
    verbs = parser.add_subparsers(dest="verb", required=True, metavar="VERB")
    _add_render(verbs)
    _add_profile(verbs)
    _add_measure(verbs)
    _add_scan(verbs)
    _add_compare(verbs)
    _add_new(verbs)
    verbs.add_parser(
        "schema", help="print the JSON Schema of scene files, for editors that complete and check"
    )
    return parser, verbs


def _add_render(verbs: argparse._SubParsersAction[argparse.ArgumentParser]) -> None:
    parser = verbs.add_parser(
        "render", help="render a scene file into an image (HDF5) with a picture beside it"
    )
    parser.add_argument("scene", help="scene file (TOML)")
    parser.add_argument(
        "--maps", action="store_true", help="also store crossing radius, redshift factor and delay"
    )
    parser.add_argument("--fits", action="store_true", help="also write a FITS image with a celestial WCS")
    _add_accuracy(parser, "1e-5")
    _add_common(parser, "outputs/<scene name>.h5")


def _add_profile(verbs: argparse._SubParsersAction[argparse.ArgumentParser]) -> None:
    parser = verbs.add_parser(
        "profile",
        help="resolve the photon rings of a scene: cuts, widths, fluxes, delays and visibilities per order",
    )
    parser.add_argument("scene", help="scene file (TOML)")
    parser.add_argument("--orders", type=int, default=5, help="how many orders, from n = 0 (default: 5)")
    parser.add_argument(
        "--position-angle",
        action="append",
        default=[],
        metavar="ANGLE",
        help='direction of cuts and baselines, such as "30 deg", east of north; again for more (default: along the '
        "disk's projected axis and across it)",
    )
    parser.add_argument(
        "--angles", type=int, default=64, help="position angles of the table of rings (default: 64)"
    )
    parser.add_argument("--longest", default="1000 Glambda", help="longest baseline (default: 1000 Glambda)")
    parser.add_argument(
        "--sensitivity", default="1 mJy", help="flux density below which order 1 is not seen (default: 1 mJy)"
    )
    parser.add_argument(
        "--emitting-radius",
        metavar="RADIUS",
        help='circle whose images tell rotation and delay, such as "6 M" (default: the one that holds half of order 0)',
    )
    _add_accuracy(parser, "1e-7")
    _add_common(parser, "outputs/<scene name>-profile.h5")


def _add_measure(verbs: argparse._SubParsersAction[argparse.ArgumentParser]) -> None:
    parser = verbs.add_parser(
        "measure", help="measure the ring on images (our HDF5, or FITS with a celestial WCS)"
    )
    parser.add_argument("images", nargs="+", metavar="IMAGE")
    parser.add_argument(
        "--resolution", required=True, help='FWHM to bring the image to, such as "20 uas" or "5 M"'
    )
    parser.add_argument(
        "--centre", nargs=2, metavar=("EAST", "NORTH"), help="fix the centre instead of finding it"
    )
    parser.add_argument(
        "--lengths",
        choices=("relative", "published"),
        default="relative",
        help="lengths of the estimator in units of the diameter, or the published ones in uas",
    )
    parser.add_argument(
        "--picture",
        action="store_true",
        help="draw the ring found on each image (outputs/<image>-ring.png)",
    )
    _add_common(
        parser,
        "none",
        "replace the table that stands there, and foreign pictures",
        "write a table of the rings (ECSV)",
    )


def _add_scan(verbs: argparse._SubParsersAction[argparse.ArgumentParser]) -> None:
    parser = verbs.add_parser("scan", help="render and read every scene that a scan file asks for")
    parser.add_argument("scan", help="scan file (TOML)")
    parser.add_argument("--workers", type=int, help="processes; all the cores unless given")
    _add_common(
        parser, "outputs/<scan name>.h5", "replace whatever stands there; without it a finished scan is kept"
    )


def _add_compare(verbs: argparse._SubParsersAction[argparse.ArgumentParser]) -> None:
    parser = verbs.add_parser("compare", help="the mass that an observed ring allows, given scans of scenes")
    parser.add_argument("observation", help="observation file (TOML)")
    parser.add_argument("scans", nargs="+", metavar="SCAN_PRODUCT")
    _add_common(parser, "outputs/<observation name>", out="beginning of the names OUT.txt and OUT-*.png")


def _add_new(verbs: argparse._SubParsersAction[argparse.ArgumentParser]) -> None:
    parser = verbs.add_parser("new", help="write a commented file to start from")
    parser.add_argument("kind", choices=("scene", "scan", "observation"))
    parser.add_argument("file")
    parser.add_argument("--replace", action="store_true", help="replace the file if it exists")


def _add_accuracy(parser: argparse.ArgumentParser, default: str) -> None:
    parser.add_argument(
        "--accuracy",
        type=float,
        default=default,
        help=f"interpolation error of brightness allowed (default: {default})",
    )


def _add_common(
    parser: argparse.ArgumentParser,
    default: str,
    replace: str = "replace also a file that is not an earlier result of the same name",
    out: str = "where the result goes",
) -> None:
    parser.add_argument("--out", help=f"{out} (default: {default})")
    parser.add_argument("--replace", action="store_true", help=replace)
    parser.add_argument("--json", action="store_true", help="print the result as one JSON object")


if __name__ == "__main__":
    sys.exit(main())
