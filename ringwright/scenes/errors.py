"""Everything wrong with a file at once: each problem with file, line, key, what was given and what is accepted."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from difflib import get_close_matches

from ringwright.errors import InputError

LONGEST_LINE = 160


@dataclass(frozen=True)
class Problem:
    """One thing that is wrong.

    Attributes
    ----------
    file : str
    line : int or None
        Where it stands; None for a key that is absent from the file or a value that was set from Python.
    key : str
        Path of the key, such as "view.inclination".
    text : str
        What was given, what is accepted, what to do.
    source : str
        The line as it stands in the file.
    """

    file: str
    line: int | None
    key: str
    text: str
    source: str = ""

    def __str__(self) -> str:
        place = f"{self.file}:{self.line}" if self.line else self.file
        head = f"{place}: {self.key}: {self.text}" if self.key else f"{place}: {self.text}"
        source = self.source.strip()
        cut = source if len(source) <= LONGEST_LINE else f"{source[:LONGEST_LINE]}…"
        return f"{head}\n    {self.line} | {cut}" if cut else head


class SceneError(InputError):
    """A scene, scan or observation file that cannot be used; `problems` holds all that is wrong, by line."""

    def __init__(self, problems: Iterable[Problem]) -> None:
        self.problems = tuple(sorted(problems, key=lambda problem: (problem.line or 0, problem.key)))
        super().__init__("\n".join(str(problem) for problem in self.problems))

    def __reduce__(self) -> tuple[type[SceneError], tuple[tuple[Problem, ...]]]:
        return type(self), (self.problems,)


def did_you_mean(given: str, accepted: Iterable[str]) -> str:
    """A sentence that offers the closest accepted word, or lists them all."""
    words = sorted(accepted)
    close = get_close_matches(given, words, n=1, cutoff=0.6)
    if close:
        return f"did you mean '{close[0]}'?"
    return f"accepted: {', '.join(words)}" if words else "nothing is accepted here"
