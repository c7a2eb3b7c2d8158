"""Progress on standard error: a bar on a terminal, elsewhere one plain line now and then.

A batch log gets a line after 5 seconds, then one every 30 seconds or 5 %, whichever comes later, and always the last one;
NO_COLOR is honoured by `rich`.
"""

from __future__ import annotations

import sys
import time
from collections.abc import Callable, Iterator
from contextlib import contextmanager

FIRST_LINE_SECONDS = 5.0
LINE_EVERY_SECONDS = 30.0
LINE_EVERY_SHARE = 0.05

Report = Callable[[int, int, int], None]


@contextmanager
def reporting(what: str) -> Iterator[Report]:
    """A function to call with things done, things asked for and things failed."""
    if not sys.stderr.isatty():
        yield _lines(what)
        return
    from rich.console import Console
    from rich.progress import BarColumn, MofNCompleteColumn, Progress, TextColumn, TimeRemainingColumn

    columns = (
        TextColumn(what),
        BarColumn(),
        MofNCompleteColumn(),
        TimeRemainingColumn(),
        TextColumn("{task.fields[note]}"),
    )
    with Progress(*columns, console=Console(stderr=True)) as bar:
        task = bar.add_task(what, total=None, note="")

        def show(done: int, total: int, failed: int) -> None:
            bar.update(task, completed=done, total=total, note=f"{failed} failed" if failed else "")

        yield show


def _lines(what: str) -> Report:
    start = last = time.monotonic()
    shown = 0.0

    def show(done: int, total: int, failed: int) -> None:
        nonlocal last, shown
        now = time.monotonic()
        first = shown == 0.0 and now - start >= FIRST_LINE_SECONDS
        due = now - last >= LINE_EVERY_SECONDS and done / total - shown >= LINE_EVERY_SHARE
        if first or due or done == total:
            note = f", {failed} failed" if failed else ""
            print(
                f"{what}: {done} of {total}{note}{_when(done, total, now - start)}",
                file=sys.stderr,
                flush=True,
            )
            last, shown = now, done / total

    return show


def _when(done: int, total: int, seconds: float) -> str:
    """How long it took, or will take where enough is done to tell."""
    if done == total:
        return f", in {seconds:.0f} s"
    left = seconds / done * (total - done)
    return f", about {left:.0f} s left" if done / total >= LINE_EVERY_SHARE else ""
