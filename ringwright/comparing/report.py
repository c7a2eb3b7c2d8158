"""The answer as a text file beside its figures, and what an earlier answer of the same name was about.

The first paragraph says what was compared: by it an answer is told from an earlier one of another ring or of other scans. Units are
those of the summary.
"""

from __future__ import annotations

from pathlib import Path

from ringwright import __version__
from ringwright.comparing.results import Comparison
from ringwright.comparing.wording import given, summary
from ringwright.products import written_whole


def report_path(stem: str | Path) -> Path:
    """Where the report of figures whose names start with `stem` goes."""
    return Path(f"{stem}.txt")


def write_report(comparison: Comparison, stem: str | Path) -> Path:
    """Write what was compared, and the summary.

    Parameters
    ----------
    comparison : Comparison
    stem : path
        Folder and beginning of the name; ".txt" is added.
    """
    path = report_path(stem)
    with written_whole(path) as temporary:
        temporary.write_text(f"{_head(comparison)}\n\n{summary(comparison)}\n", encoding="utf-8")
    return path


def earlier_answer(comparison: Comparison, stem: str | Path) -> str:
    """What the report that stands there was about, where that is not this comparison; "" otherwise."""
    path = report_path(stem)
    if not path.is_file():
        return ""
    head = path.read_text(encoding="utf-8", errors="replace").split("\n\n")[0]
    return "" if head == _head(comparison) else " ".join(head.splitlines())


def _head(comparison: Comparison) -> str:
    scans = ", ".join(item.table.path or item.table.name for item in comparison.families)
    return (
        f"ringwright {__version__}: {comparison.observation.name} compared with {scans}.\n{given(comparison)}"
    )
