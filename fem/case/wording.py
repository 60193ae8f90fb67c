"""From what validation found to sentences with place, finding and remedy."""

from __future__ import annotations

import re
import types
from collections.abc import Iterable, Iterator
from dataclasses import dataclass
from typing import Annotated, Any, Literal, Union, get_args, get_origin

from pydantic import BaseModel, ValidationError
from pydantic.fields import FieldInfo
from pydantic_core import ErrorDetails

from fem.errors import Refused, unknown
from fem.quantity import Kind
from fem.signal import signal

KeyPath = tuple[str | int, ...]


@dataclass(frozen=True)
class Note:
    """A problem on its way to a report: its key path, and what is said about it."""

    path: KeyPath
    message: str


def notes(error: ValidationError, model: type[BaseModel], path: KeyPath) -> Iterator[Note]:
    """Say each finding of a validation in the words of the case language.

    Parameters
    ----------
    error
        What pydantic found.
    model
        What the table was read as.
    path
        Where the table stands.

    """
    for detail in error.errors(include_url=False):
        at: KeyPath = detail["loc"]
        if at and at[-1] == "[key]":
            at = at[:-1]
        cause = detail.get("ctx", {}).get("error")
        if isinstance(cause, Refused):
            for problem in cause.problems:
                inner = problem.place.split(".") if problem.place else ()
                yield Note((*path, *at, *inner), one_line(problem.message))
        else:
            yield Note((*path, *at), one_line(_said(detail, model, at, cause)))


def _said(detail: ErrorDetails, model: type[BaseModel], at: KeyPath, cause: Any) -> str:
    kind, found = detail["type"], detail["input"]
    owner = _owner(model, at)
    if cause is not None:
        return str(cause)
    if kind == "missing":
        return "is missing" + _remedy(owner, at[-1])
    if kind == "extra_forbidden":
        return unknown("key", str(at[-1]), keys(owner) if owner else ())
    if kind == "literal_error":
        words = get_args(_bare(_field(owner, at[-1]).annotation)) if owner else ()
        return one_of(str(at[-1]), found, [str(word) for word in words])
    if kind in _EXPECTED:
        return f"must be {_EXPECTED[kind]}, got {shown(found)}"
    if kind == "string_too_short":
        return "must not be empty"
    return detail["msg"]


_EXPECTED = {
    "string_type": 'text in quotes, such as "name"',
    "dict_type": "a table",
    "model_type": "a table",
    "model_attributes_type": "a table",
    "list_type": "a list",
    "tuple_type": "a list",
    "float_type": "a number",
    "int_type": "a whole number",
    "bool_type": "true or false",
}


def one_of(what: str, found: Any, words: list[str]) -> str:
    """Say that a word is none of those which may stand here."""
    if isinstance(found, str):
        return unknown(what, found, words)
    return f"must be one of {listed(words)}, got {shown(found)}"


def listed(words: Iterable[str]) -> str:
    """Write words for a sentence, each in quotes."""
    return ", ".join(f'"{word}"' for word in words)


def shown(value: Any) -> str:
    """Show a value as a reader of the file would name it."""
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, str):
        return f'"{value}"' if value else 'an empty text ("")'
    if isinstance(value, dict):
        return "a table"
    if isinstance(value, (list, tuple)):
        return "a list" if value else "an empty list"
    return str(value)


def one_line(text: str) -> str:
    """Keep a message on its line, whatever was typed."""
    return re.sub(r"[\x00-\x1f\x7f\x85\u2028\u2029]", lambda m: f"\\x{ord(m[0]):02x}", text)


def keys(model: type[BaseModel]) -> list[str]:
    """Return the keys of a table, as they are typed."""
    return [field.alias or name for name, field in model.model_fields.items()]


def _remedy(owner: type[BaseModel] | None, key: str | int) -> str:
    if owner is None:
        return ""
    field = _field(owner, key)
    for mark in field.metadata:
        kind = mark.kind if isinstance(mark, signal) else mark
        if isinstance(kind, Kind):
            return f'; write {key} = "{kind.example}", with your value'
    bare = _bare(field.annotation)
    if get_origin(bare) is Literal:
        return f"; one of {listed(get_args(bare))}"
    return ""


def _owner(model: type[BaseModel], at: KeyPath) -> type[BaseModel] | None:
    """Return the table that the last key of a path belongs to; None where it is no model."""
    found: Any = model
    for key in at[:-1]:
        if _is_model(found):
            found = _bare(_field(found, key).annotation)
        elif get_origin(found) is dict:
            found = _bare(get_args(found)[1])
        else:
            return None
    return found if _is_model(found) else None


def _field(model: type[BaseModel], key: str | int) -> FieldInfo:
    for name, field in model.model_fields.items():
        if key in (name, field.alias):
            return field
    return FieldInfo(annotation=type(None))


def _bare(annotation: Any) -> Any:
    """Take the marks and the None off a type."""
    if get_origin(annotation) is Annotated:
        return _bare(get_args(annotation)[0])
    if get_origin(annotation) in (Union, types.UnionType):
        choices = [_bare(choice) for choice in get_args(annotation) if choice is not type(None)]
        return next((c for c in choices if _is_model(c) or get_origin(c) is dict), choices[0])
    return annotation


def _is_model(annotation: Any) -> bool:
    return isinstance(annotation, type) and issubclass(annotation, BaseModel)
