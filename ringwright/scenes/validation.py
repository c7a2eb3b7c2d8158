"""From a TOML document to a validated model, with every problem placed: shared by scene, scan and observation files.

pydantic finds what is wrong; here it is put into words and given a line. Tags of unions, which pydantic weaves into its paths, are
taken out, so that a path is what stands in the file.
"""

from __future__ import annotations

import re
import tomllib
from collections.abc import Callable, Iterable, Mapping
from difflib import get_close_matches
from pathlib import Path as FilePath
from typing import Any, TypeVar, get_args, get_origin

from pydantic import BaseModel, TypeAdapter, ValidationError
from pydantic.fields import FieldInfo

from ringwright.kinds import (
    FITS_START,
    HDF5_START,
    LARGEST_TEXT,
    article,
    kind_of_bytes,
    kind_of_keys,
    use_of,
)
from ringwright.scenes.errors import Problem, SceneError, did_you_mean
from ringwright.scenes.lines import Path, key_lines
from ringwright.units import shown

Model = TypeVar("Model", bound=BaseModel)


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
            try:
                self._lines = key_lines(self.text)
            except (
                RecursionError
            ):  # nested as deeply as tomllib can follow: the problem is told without its line
                self._lines = {}
        while path:
            if path in self._lines:
                return self._lines[path]
            path = path[:-1]
        return None

    def problem(self, path: Path, text: str) -> Problem:
        """A problem at a key of this document."""
        line = self.line_of(path)
        source = self.text.split("\n")[line - 1] if line else ""
        return Problem(self.path, line, dotted(path), text, source)

    def error(self, *found: tuple[Path, str]) -> SceneError:
        """An error with all of these problems."""
        return SceneError(self.problem(path, text) for path, text in found)


def read_document(path: str | FilePath, kind: str = "") -> Document:
    """Read a TOML file that is due to be a "scene", "scan" or "observation" file.

    Raises
    ------
    SceneError
        If there is no such file, it is not TOML, or its keys are those of another kind of file.
    """
    document = _document(path, kind)
    found = kind_of_keys(document.data)
    if kind and found and found != kind:
        raise _another_kind(str(path), found, kind)
    return document


def _another_kind(name: str, found: str, kind: str) -> SceneError:
    due = article(f"{kind} file" if kind else "file of settings")
    return SceneError([Problem(name, None, "", f"this is {use_of(found, name)}. Here {due} is due")])


def _document(path: str | FilePath, kind: str) -> Document:
    name = str(path)
    try:
        raw = FilePath(path).read_bytes()
    except OSError as problem:
        reason = problem.strerror or str(problem)
        raise SceneError([Problem(name, None, "", f"cannot be read: {reason}")]) from None
    except ValueError as problem:  # a null character in the name
        raise SceneError([Problem(name, None, "", f"cannot be read: {problem}")]) from None
    if raw.startswith((HDF5_START, FITS_START)):
        raise _another_kind(name, kind_of_bytes(raw), kind)
    if len(raw) > LARGEST_TEXT:
        raise SceneError([Problem(name, None, "", "is larger than 4 MiB and so is no file of this kind")])
    try:
        text = raw.decode("utf-8-sig")
        return Document(name, text, tomllib.loads(text))
    except UnicodeDecodeError:
        raise SceneError([Problem(name, None, "", "is not text in UTF-8")]) from None
    except RecursionError:
        raise SceneError(
            [Problem(name, None, "", "is nested too deeply to be a file of this kind")]
        ) from None
    except tomllib.TOMLDecodeError as problem:
        line = _toml_line(str(problem))
        # A document that is not TOML may hold control characters, which a terminal would obey.
        source = re.sub(r"[\x00-\x1f\x7f-\x9f]", " ", text.split("\n")[line - 1]) if line else ""
        raise SceneError([Problem(name, line, "", f"is not TOML: {problem}", source)]) from None
    except ValueError:
        raise SceneError(
            [Problem(name, None, "", "holds a number of more digits than can be read")]
        ) from None


def validated(model: type[Model], document: Document) -> Model:
    """The document as a model.

    Raises
    ------
    SceneError
        With every problem that the model finds.
    """
    whole, problems = examined(model, document)
    if problems:
        raise SceneError(problems)
    return whole


def examined(model: type[Model], document: Document) -> tuple[Model, list[Problem]]:
    """The document as a model, with every problem that the model finds.

    Where there are any, parts of the model that are valid by themselves are kept and the others are None, so that what several
    keys must satisfy together can still be checked where it can be.
    """
    try:
        return model.model_validate(document.data), []
    except ValidationError as failure:
        problems = [_worded(model, document, error) for error in failure.errors(include_url=False)]
        return _valid_parts(model, document.data), problems


def _valid_parts(model: type[Model], data: dict[str, Any]) -> Model:
    parts: dict[str, Any] = {}
    for name, info in model.model_fields.items():
        given = data.get(info.alias or name)
        if given is None:
            parts[name] = None if info.is_required() else info.get_default(call_default_factory=True)
        elif get_origin(info.annotation) is list:
            (inner,) = get_args(info.annotation)
            parts[name] = [_valid(inner, one) for one in given] if isinstance(given, list) else None
        else:
            parts[name] = _valid(info.annotation, given)
    return model.model_construct(**parts)


def _valid(annotation: Any, given: Any) -> Any:
    try:
        return TypeAdapter(annotation).validate_python(given)
    except ValidationError:
        return None


def dotted(path: Iterable[str | int]) -> str:
    """A key path as people write it."""
    return ".".join(str(part) for part in path)


def _worded(model: type[BaseModel], document: Document, error: Mapping[str, Any]) -> Problem:
    path = _in_file(document.data, error["loc"], absent=error["type"] == "missing")
    if error["type"] == "union_tag_invalid":
        path = (*path, "kind")
    if error["type"] == "missing":
        return document.problem(path, _missing(model, document.data, path))
    if error["type"] == "extra_forbidden":
        return document.problem(path, _extra(model, document.data, path))
    given = error["input"]
    context = error.get("ctx", {})
    words = _WORDS.get(error["type"])
    if words is not None:
        return document.problem(path, words(given, context))
    text = str(context.get("error", error["msg"]))
    return document.problem(path, text if context.get("error") else f"{shown(given)}: {text.lower()}")


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


def _missing(model: type[BaseModel], data: Any, path: Path) -> str:
    """That a key is missing, and how it is written or why it has no default."""
    infos = [info for table in _tables(model, data, path[:-1]) for info in _keys(table, path[-1])]
    info = infos[0] if infos else FieldInfo()
    if info.description:
        return f"is missing and has no default, {info.description}"
    if info.examples:
        return f"is missing and has no default; write it like {path[-1]} = {info.examples[0]}"
    return "is missing and has no default"


def _extra(model: type[BaseModel], data: Any, path: Path) -> str:
    key = str(path[-1])
    accepted = accepted_keys(model, data, path[:-1])
    places = _homes(model, key)
    if tuple(part for part in path[:-1] if isinstance(part, str)) in places:
        return f"this kind does not read this key; {did_you_mean(key, accepted)}"
    homes = sorted(dotted(home) or "the top of the file, before the first [table]" for home in places)
    if homes and not (len(homes) > MOST_HOMES or get_close_matches(key, accepted)):
        return f"nothing reads this key here; it belongs to {' or '.join(homes)}"
    return f"nothing reads this key; {did_you_mean(key, accepted)}"


def _unknown_kind(given: Any, context: Mapping[str, Any]) -> str:
    kind = str(context["tag"])
    return f"kind {shown(kind)} is not known; {did_you_mean(kind, _words_of(context['expected_tags']))}"


def _no_kind(given: Any, context: Mapping[str, Any]) -> str:
    return 'has no kind; write it as a table with a kind, such as { kind = "circular" }'


def _choice(given: Any, context: Mapping[str, Any]) -> str:
    return f"{shown(given)} is not known; {did_you_mean(str(given), _words_of(context['expected']))}"


def _words_of(listed: str) -> list[str]:
    return [word.strip(" '") for word in listed.replace(" or ", ",").split(",")]


def _too_many(given: Any, context: Mapping[str, Any]) -> str:
    return f"{shown(given)} has {context['actual_length']} entries; {context['max_length']} are due"


def _too_few(given: Any, context: Mapping[str, Any]) -> str:
    if context["min_length"] == 1:
        return "is empty; at least one is needed"
    return f"{shown(given)} has {context['actual_length']} entries; {context['min_length']} are due"


def _type(name: str) -> Callable[[Any, Mapping[str, Any]], str]:
    return lambda given, context: f"{shown(given)} is not {name}"


def _limit(words: str, bound: str) -> Callable[[Any, Mapping[str, Any]], str]:
    return lambda given, context: f"{shown(given)} is not accepted; {words} {context[bound]:g} is"


MOST_HOMES = 2  # a key that belongs to more tables than this says nothing about where it was meant to stand
_WORDS: dict[str, Callable[[Any, Mapping[str, Any]], str]] = {
    "union_tag_invalid": _unknown_kind,
    "union_tag_not_found": _no_kind,
    "literal_error": _choice,
    "float_type": _type("a number"),
    "int_type": _type("a whole number"),
    "int_parsing_size": _type("a whole number of this size"),
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
    "too_long": _too_many,
    "too_short": _too_few,
    "string_pattern_mismatch": lambda given, context: (
        f"{shown(given)} cannot name files; use letters, digits, dots, dashes and underscores"
    ),
}


def accepted_keys(model: type[BaseModel], data: Any, path: Path) -> set[str]:
    """Every key that a file of this model accepts in the table at a path, given the kinds that its data name."""
    return {
        info.alias or name
        for table in _tables(model, data, path)
        for name, info in table.model_fields.items()
    }


def _tables(model: type[BaseModel], data: Any, path: Path) -> set[type[BaseModel]]:
    """The models that the table at a path may have; one of them where its data name a kind."""
    models = {model}
    for part in path:
        try:
            data = data[part]
        except (KeyError, IndexError, TypeError):
            data = None
        if isinstance(part, int):
            if data is None:
                return set()
        else:
            infos = [info for one in models for info in _keys(one, part)]
            models = {inner for info in infos for inner in _models_in(info.annotation)}
        named = {one for one in models if isinstance(data, dict) and data.get("kind") in _kinds(one)}
        models = named or models
    return models


def _keys(model: type[BaseModel], key: str | int) -> list[FieldInfo]:
    return [info for name, info in model.model_fields.items() if (info.alias or name) == key]


def _kinds(model: type[BaseModel]) -> tuple[Any, ...]:
    info = model.model_fields.get("kind")
    return get_args(info.annotation) if info else ()


def _homes(model: type[BaseModel], key: str, path: tuple[str, ...] = ()) -> set[tuple[str, ...]]:
    """Paths of the tables that have a key of this name."""
    found = {path} if _keys(model, key) else set()
    for name, info in model.model_fields.items():
        for inner in _models_in(info.annotation):
            found |= _homes(inner, key, (*path, info.alias or name))
    return found


def _models_in(annotation: Any) -> set[type[BaseModel]]:
    if isinstance(annotation, type) and issubclass(annotation, BaseModel):
        return {annotation}
    return {model for inner in get_args(annotation) for model in _models_in(inner)}


def _toml_line(message: str) -> int | None:
    words = message.replace(",", " ").split()
    after = [words[i + 1] for i, word in enumerate(words[:-1]) if word == "line"]
    return int(after[0]) if after and after[0].isdigit() else None
