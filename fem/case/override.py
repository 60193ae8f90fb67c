"""Overrides, ``--set stages.freeze.lasts="20 min"``, written into a case without losing its comments."""

from __future__ import annotations

import re
import tomllib
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import tomlkit
from tomlkit.exceptions import TOMLKitError

from fem.case.locate import split
from fem.errors import CaseError, Problem, unknown

# Tables that a case may leave out, and that an override therefore may open.
OPTIONAL = {
    ("stepping",),
    ("watch",),
    ("watch", "points"),
    ("watch", "rays"),
    ("aim",),
    ("piece", "start"),
    ("uncertainty",),
}

_PARTS = re.compile(r"""((?:[^="']|"(?:[^"\\]|\\.)*"|'[^']*')*)=(.*)""", re.DOTALL)


@dataclass(frozen=True)
class Override:
    """One key to set.

    Parameters
    ----------
    path
        Keys from the top, list entries by their name.
    value
        As TOML gives it.
    place
        How a message names it.

    """

    path: tuple[str, ...]
    value: Any
    place: str


def parse(override: str) -> Override:
    """Read ``key=value``; the value is TOML where it can be read as such, else text.

    Raises
    ------
    ValueError
        Where there is no key, no sign or no value.

    """
    match = _PARTS.fullmatch(override)
    if match is None or not match[1].strip():
        raise ValueError('is written key=value, such as --set stages.freeze.lasts="20 min"')
    key, value = match[1].strip(), match[2].strip()
    if not value:
        raise ValueError(f'has no value; write --set {key}="20 min", with your value')
    return Override(split(key), _value(value), f"--set {key}")


def apply(text: str, overrides: Sequence[str], source: str = "<text>") -> str:
    """Return a case with keys set, its comments and layout kept.

    Parameters
    ----------
    text
        A TOML text that can be read.
    overrides
        Each ``key=value``, in their order.
    source
        What messages call the case.

    Raises
    ------
    CaseError
        A malformed override, or a path that the case does not have; every one of them.

    """
    problems = []
    document = tomlkit.parse(text)
    expected = tomllib.loads(text)
    for override in overrides:
        try:
            wanted = parse(override)
            place = wanted.place
            _set(expected, wanted, table=dict)
            _set(document, wanted, table=tomlkit.table)
        except (ValueError, TOMLKitError) as error:
            key = override.split("=")[0].strip()
            problems.append(Problem(f"--set {key}".rstrip(), str(error)))
    if problems:
        raise CaseError(source, problems)
    changed = tomlkit.dumps(document)
    # Guards against a layout in which the writer would lose or misplace a key.
    if tomllib.loads(changed) != expected:
        raise CaseError(source, [Problem(place, "cannot be set in the layout of this file; edit the file")])
    return changed


def _value(text: str) -> Any:
    try:
        tree = tomllib.loads(f"value = {text}")
    except (ValueError, RecursionError):
        return text
    return tree["value"] if len(tree) == 1 else text


def _set(tree: Any, wanted: Override, table: Any) -> None:
    for depth, key in enumerate(wanted.path[:-1], start=1):
        if isinstance(tree, dict) and key not in tree and wanted.path[:depth] in OPTIONAL:
            tree[key] = table()
        tree = _enter(tree, key, wanted.path[: depth - 1])
    last = wanted.path[-1]
    if isinstance(tree, dict):
        tree[last] = wanted.value
        return
    if not isinstance(tree, list):
        raise ValueError(f'{".".join(wanted.path[:-1])} is a value, it has no key "{last}"')
    tree[_entry(tree, last)] = wanted.value


def _enter(tree: Any, key: str, above: Sequence[str]) -> Any:
    if isinstance(tree, list):
        return tree[_entry(tree, key)]
    if not isinstance(tree, dict):
        raise ValueError(f'{".".join(above)} is a value, it has no key "{key}"')
    if key not in tree:
        raise ValueError(unknown("key", key, tree) + (f" in {'.'.join(above)}" if above else ""))
    return tree[key]


def _entry(entries: list[Any], name: str) -> int:
    names = [str(entry.get("name", "")) if isinstance(entry, dict) else "" for entry in entries]
    if name not in names:
        raise ValueError(unknown("entry", name, [n for n in names if n]))
    return names.index(name)
