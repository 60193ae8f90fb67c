"""One number of a case, found by its dotted key and moved."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace
from typing import Any

from pydantic import BaseModel

from fem.case.case import Case, Stage
from fem.errors import unknown
from fem.quantity import DIFFERENCE, Kind, read_quantity
from fem.signal import Signal

SPREAD = Kind("half-width", "percent", "30 %", above=0.0, most=100.0)


@dataclass(frozen=True)
class Spread:
    """The half-width of the interval that a value lies in 19 times out of 20.

    Parameters
    ----------
    size
        In the unit of the value, or as a share of it [-].
    relative
        Whether it is a share.

    """

    size: float
    relative: bool

    def move(self, value: float, by: float) -> float:
        """Return a value moved by a number of half-widths."""
        return value * (1.0 + by * self.size) if self.relative else value + by * self.size


def read_spread(text: Any, kind: Kind) -> Spread:
    """Read ``"30 %"``, or an amount in the unit of the value: ``"2 K"``, ``"0.5 mm"``.

    Raises
    ------
    PydanticCustomError
        Where it is neither; a value in per cent takes its half-width as a share of itself.

    """
    if isinstance(text, str) and text.strip().endswith("%"):
        return Spread(SPREAD.read(text) / 100.0, relative=True)
    wanted = DIFFERENCE if kind.unit == "degC" else replace(kind, above=0.0, least=None, most=None)
    size = read_quantity(text, wanted)
    wanted.check(size, text)
    return Spread(size, relative=False)


def kind_of(case: Case, key: str) -> Kind:
    """Return what sort of quantity stands at a key.

    Raises
    ------
    ValueError
        Where there is no such key, or no single quantity stands there.

    """
    owner, name = _owner(case, key)
    if isinstance(owner, BaseModel):
        metadata = type(owner).model_fields[name].metadata
        # A quantity that may change with time holds its kind one level further in.
        for item in metadata:
            kind = item if isinstance(item, Kind) else getattr(item, "kind", None)
            if isinstance(kind, Kind):
                return kind
        kind = _inner_kind(type(owner).model_fields[name].annotation)
        if kind is not None:
            return kind
    raise ValueError(f'"{key}" holds no quantity that could be uncertain')


def value_of(case: Case, key: str) -> float | Signal | None:
    """Return what stands at a key; None where the case leaves it to the program."""
    owner, name = _owner(case, key)
    value = getattr(owner, name)
    return value if value is None or isinstance(value, Signal) else float(value)


def shifted(case: Case, key: str, spread: Spread, by: float, default: float | None = None) -> Case:
    """Return the case with the quantity at a key moved by a number of half-widths.

    Parameters
    ----------
    case
        As read.
    key
        Dotted, as the case has it.
    spread, by
        How far.
    default
        Value to move from where the case leaves the key out.

    """

    def move(value: Any) -> Any:
        if isinstance(value, Signal):
            return Signal(value.times, spread.move(value.values, by))  # type: ignore[arg-type]
        start = default if value is None else value
        if start is None:
            raise ValueError(f'"{key}" is left out, and nothing says what to move from')
        return spread.move(start, by)

    return _changed(case, key.split("."), move)


def _owner(case: Case, key: str) -> tuple[Any, str]:
    """Return what holds a key's last word, and the name of its attribute."""
    node: Any = case
    path = key.split(".")
    for word in path[:-1]:
        node = _child(node, word)
    if not isinstance(node, BaseModel):
        raise ValueError(f'"{key}" is not the key of a quantity')
    return node, _field(node, path[-1])


def _child(node: Any, word: str) -> Any:
    if isinstance(node, tuple):
        names = [stage.name for stage in node]
        if word not in names:
            raise ValueError(unknown("stage", word, names))
        return node[names.index(word)]
    if isinstance(node, dict):
        if word not in node:
            raise ValueError(unknown("entry", word, node))
        return node[word]
    if isinstance(node, BaseModel):
        return getattr(node, _field(node, word))
    if isinstance(node, Case) and word in ("piece", "shape", "materials", "stages"):
        return getattr(node, word)
    raise ValueError(unknown("key", word, ("piece", "shape", "materials", "stages")))


def _field(model: BaseModel, word: str) -> str:
    """Return the attribute of a key, which may go by another name in the file."""
    fields = type(model).model_fields
    names = {field.alias or name: name for name, field in fields.items()}
    if word not in names:
        raise ValueError(unknown("key", word, names))
    return names[word]


def _inner_kind(annotation: Any) -> Kind | None:
    """Find the kind of a quantity that may also be None."""
    for part in getattr(annotation, "__args__", ()):
        for item in getattr(part, "__metadata__", ()):
            kind = item if isinstance(item, Kind) else getattr(item, "kind", None)
            if isinstance(kind, Kind):
                return kind
    return None


def _changed(node: Any, path: list[str], move: Callable[[Any], Any]) -> Any:
    """Return a copy of a node with one leaf moved; everything else is shared."""
    if not path:
        return move(node)
    word, rest = path[0], path[1:]
    if isinstance(node, Case):
        return replace(node, **{word: _changed(_child(node, word), rest, move)})
    if isinstance(node, tuple):
        return tuple(_changed(s, rest, move) if _named(s, word) else s for s in node)
    if isinstance(node, dict):
        return {**node, word: _changed(node[word], rest, move)}
    name = _field(node, word)
    return node.model_copy(update={name: _changed(getattr(node, name), rest, move)})


def _named(stage: Any, word: str) -> bool:
    return isinstance(stage, Stage) and stage.name == word
