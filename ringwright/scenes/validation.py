"""From a TOML document to a validated model, with every problem placed: shared by scene, scan and observation files.

pydantic finds what is wrong; here it is put into words and given a line. Tags of unions, which pydantic weaves into its paths, are
taken out, so that a path is what stands in the file.
"""

from __future__ import annotations

import tomllib
from collections.abc import Callable, Iterable, Mapping
from pathlib import Path as FilePath
from typing import Any, TypeVar, get_args

from pydantic import BaseModel, ValidationError

from ringwright.scenes.errors import Problem, SceneError, did_you_mean
from ringwright.scenes.lines import Path, key_lines

Model = TypeVar("Model", bound=BaseModel)
LARGEST_FILE = 2**22


class Document:
    """One TOML file: its text, its data, and where each key stands."""

    def __init__(self, path: str, text: str, data: dict[str, Any]) -> None:
        self.path = path
        self.text = text
        self.data = data
        self._lines: dict[Path, int] | None = None

    def line_of(self, path: Path) -> int | None:
        """The line of a key, or of the nearest table around it that stands in the file."""
        if self._lines is None:
            self._lines = key_lines(self.text) if self.text else {}
        while path:
            if path in self._lines:
                return self._lines[path]
            path = path[:-1]
        return None

    def problem(self, path: Path, text: str) -> Problem:
        """A problem at a key of this document."""
        line = self.line_of(path)
        source = self.text.splitlines()[line - 1] if line else ""
        return Problem(self.path, line, dotted(path), text, source)

    def error(self, *found: tuple[Path, str]) -> SceneError:
        """An error with all of these problems."""
        return SceneError(self.problem(path, text) for path, text in found)


def read_document(path: str | FilePath) -> Document:
    """Read a TOML file.

    Raises
    ------
    SceneError
        If there is no such file, or it is not TOML.
    """
    name = str(path)
    try:
        raw = FilePath(path).read_bytes()
    except OSError as problem:
        raise SceneError(
            [Problem(name, None, "", f"cannot be read: {problem.strerror or problem}")]
        ) from None
    if len(raw) > LARGEST_FILE:
        raise SceneError([Problem(name, None, "", "is larger than 4 MiB and so is no file of this kind")])
    try:
        text = raw.decode("utf-8")
        return Document(name, text, tomllib.loads(text))
    except UnicodeDecodeError:
        raise SceneError([Problem(name, None, "", "is not text in UTF-8")]) from None
    except (tomllib.TOMLDecodeError, RecursionError) as problem:
        raise SceneError([Problem(name, _toml_line(str(problem)), "", f"is not TOML: {problem}")]) from None


def validated(model: type[Model], document: Document) -> Model:
    """The document as a model.

    Raises
    ------
    SceneError
        With every problem that the model finds.
    """
    try:
        return model.model_validate(document.data)
    except ValidationError as failure:
        raise SceneError(_worded(document, error) for error in failure.errors(include_url=False)) from None


def dotted(path: Iterable[str | int]) -> str:
    """A key path as people write it."""
    return ".".join(str(part) for part in path)


def _worded(document: Document, error: Mapping[str, Any]) -> Problem:
    path = _in_file(document.data, error["loc"], absent=error["type"] == "missing")
    if error["type"] == "union_tag_invalid":
        path = (*path, "kind")
    given = error["input"]
    context = error.get("ctx", {})
    words = _WORDS.get(error["type"])
    if words is not None:
        return document.problem(path, words(given, context, path))
    text = str(context.get("error", error["msg"]))
    return document.problem(path, text if context.get("error") else f"{given!r}: {text.lower()}")


def _in_file(data: Any, place: tuple[str | int, ...], *, absent: bool) -> Path:
    """A pydantic path without the tags of unions, which are no keys."""
    path: Path = ()
    for index, part in enumerate(place):
        last = index == len(place) - 1
        known = isinstance(data, list) if isinstance(part, int) else isinstance(data, dict) and part in data
        if known:
            data = data[part] if not isinstance(part, int) or part < len(data) else None
            path += (part,)
        elif last and (absent or isinstance(data, dict)):
            path += (part,)
    return path


def _missing(given: Any, context: Mapping[str, Any], path: Path) -> str:
    return "is missing and has no default"


def _extra(given: Any, context: Mapping[str, Any], path: Path) -> str:
    return f"nothing reads this key; {did_you_mean(str(path[-1]), accepted_keys(path[:-1]))}"


def _unknown_kind(given: Any, context: Mapping[str, Any], path: Path) -> str:
    accepted = [word.strip(" '") for word in str(context.get("expected_tags", "")).split(",")]
    return (
        f"kind {context.get('tag', '')!r} is not known; {did_you_mean(str(context.get('tag', '')), accepted)}"
    )


def _no_kind(given: Any, context: Mapping[str, Any], path: Path) -> str:
    return 'has no kind; write it as a table with a kind, such as { kind = "circular" }'


def _choice(given: Any, context: Mapping[str, Any], path: Path) -> str:
    accepted = [word.strip(" '") for word in str(context["expected"]).replace(" or ", ",").split(",")]
    return f"{given!r} is not known; {did_you_mean(str(given), accepted)}"


def _type(name: str) -> Callable[[Any, Mapping[str, Any], Path], str]:
    return lambda given, context, path: f"{given!r} is not {name}"


def _limit(words: str, bound: str) -> Callable[[Any, Mapping[str, Any], Path], str]:
    return lambda given, context, path: f"{given!r} is not accepted; {words} {context[bound]:g} is"


_WORDS: dict[str, Callable[[Any, Mapping[str, Any], Path], str]] = {
    "missing": _missing,
    "extra_forbidden": _extra,
    "union_tag_invalid": _unknown_kind,
    "union_tag_not_found": _no_kind,
    "literal_error": _choice,
    "float_type": _type("a number"),
    "int_type": _type("a whole number"),
    "bool_type": _type("true or false"),
    "string_type": _type("text"),
    "list_type": _type("a list"),
    "dict_type": _type("a table"),
    "model_type": _type("a table"),
    "model_attributes_type": _type("a table"),
    "finite_number": _type("a finite number"),
    "greater_than_equal": _limit("at least", "ge"),
    "less_than_equal": _limit("at most", "le"),
    "greater_than": _limit("more than", "gt"),
    "less_than": _limit("less than", "lt"),
    "too_short": lambda given, context, path: "is empty; at least one is needed",
    "string_pattern_mismatch": lambda given, context, path: (
        f"{given!r} cannot name files; use letters, digits, dots, dashes and underscores"
    ),
}

_registered: list[type[BaseModel]] = []


def register(*models: type[BaseModel]) -> None:
    """Tell which models stand for whole files, so that unknown keys can be met with the known ones."""
    _registered.extend(models)


def accepted_keys(path: Path) -> set[str]:
    """Every key that any registered file accepts within a table of this path."""
    models: set[type[BaseModel]] = set(_registered)
    for part in path:
        if isinstance(part, int):
            continue
        models = {
            inner
            for model in models
            if part in model.model_fields
            for inner in _models_in(model.model_fields[part].annotation)
        }
    return {info.alias or name for model in models for name, info in model.model_fields.items()}


def _models_in(annotation: Any) -> set[type[BaseModel]]:
    if isinstance(annotation, type) and issubclass(annotation, BaseModel):
        return {annotation}
    return {model for inner in get_args(annotation) for model in _models_in(inner)}


def _toml_line(message: str) -> int | None:
    words = message.replace(",", " ").split()
    after = [words[i + 1] for i, word in enumerate(words[:-1]) if word == "line"]
    return int(after[0]) if after and after[0].isdigit() else None
