"""Lines of keys in a TOML text, which `tomllib` drops; asked only when there is a problem to report."""

from __future__ import annotations

import re
import tomllib
from collections.abc import Iterator, Sequence
from typing import Any

import tree_sitter
import tree_sitter_toml

KeyPath = tuple[str | int, ...]
"""Keys from the top of a file; entries of a list by their number, from 0."""

_BARE = re.compile(r"[A-Za-z0-9_-]+")


def lines(text: str) -> dict[KeyPath, int]:
    """Return the line, counted from 1, on which each key, table and list entry begins.

    Parameters
    ----------
    text
        A TOML file that can be read.

    """
    parser = tree_sitter.Parser(tree_sitter.Language(tree_sitter_toml.language()))
    found: dict[KeyPath, int] = {}
    entries: dict[KeyPath, int] = {}
    for node in parser.parse(text.encode()).root_node.named_children:
        path: KeyPath = ()
        if node.type in ("table", "table_array_element"):
            keys = _keys(node.named_children[0])
            path = (*_resolve(keys[:-1], entries), keys[-1])
            _remember(found, path, node)
            if node.type == "table_array_element":
                entries[path] = entries.get(path, -1) + 1
                path = (*path, entries[path])
                _remember(found, path, node)
            else:
                path = _resolve(keys, entries)
        for at, inner in _values(node, path):
            _remember(found, at, inner)
    return found


def line_of(path: KeyPath, known: dict[KeyPath, int]) -> int | None:
    """Return the line of a key, or of the closest table around it; None where there is neither."""
    for end in range(len(path), 0, -1):
        if path[:end] in known:
            return known[path[:end]]
    return None


def dotted(path: KeyPath, tree: Any) -> str:
    """Write a key path as a case file would, entries of a list by their name.

    Parameters
    ----------
    path
        Keys from the top.
    tree
        The file as read, in which the names are looked up.

    """
    place = ""
    for key in named(path, tree):
        if isinstance(key, int):
            place += f"[{key + 1}]"
        else:
            place += ("." if place else "") + (key if _BARE.fullmatch(key) else _quoted(key))
    return place


def named(path: KeyPath, tree: Any) -> KeyPath:
    """Return the path with the name of each list entry for its number, where it alone has it."""
    keys: list[str | int] = []
    for key in path:
        inner = None
        if isinstance(tree, dict):
            inner = tree.get(str(key))
        elif isinstance(tree, list) and isinstance(key, int) and key < len(tree):
            inner = tree[key]
            names = [entry.get("name") if isinstance(entry, dict) else None for entry in tree]
            if isinstance(names[key], str) and names[key] and names.count(names[key]) == 1:
                key = str(names[key])
        keys.append(key)
        tree = inner
    return tuple(keys)


def split(key: str) -> tuple[str, ...]:
    """Split a dotted key into its parts; raise ValueError where it is none."""
    try:
        tree: Any = tomllib.loads(f"{key} = 0")
    except tomllib.TOMLDecodeError as error:
        raise ValueError(f"{key!r} is no key") from error
    parts = []
    while isinstance(tree, dict) and len(tree) == 1:
        (part, tree), *_ = tree.items()
        parts.append(part)
    if tree != 0:
        raise ValueError(f"{key!r} is no key")
    return tuple(parts)


def _keys(node: tree_sitter.Node) -> tuple[str, ...]:
    return split((node.text or b"").decode())


def _resolve(keys: Sequence[str], entries: dict[KeyPath, int]) -> KeyPath:
    """Go into the latest entry of every list of tables on the way."""
    path: KeyPath = ()
    for key in keys:
        path = (*path, key)
        if path in entries:
            path = (*path, entries[path])
    return path


def _values(node: tree_sitter.Node, path: KeyPath) -> Iterator[tuple[KeyPath, tree_sitter.Node]]:
    """Yield the pairs of a table, and what stands in their inline tables and lists."""
    waiting = [(node, path)]
    while waiting:
        node, path = waiting.pop()
        if node.type == "pair":
            key, value = node.named_children[0], node.named_children[-1]
            keys = _keys(key)
            for end in range(1, len(keys) + 1):
                yield (*path, *keys[:end]), key
            waiting.append((value, (*path, *keys)))
        elif node.type == "array":
            values = [inner for inner in node.named_children if inner.type != "comment"]
            for i, inner in enumerate(values):
                yield (*path, i), inner
                waiting.append((inner, (*path, i)))
        elif node.type in ("table", "table_array_element", "inline_table"):
            waiting += [(inner, path) for inner in node.named_children if inner.type == "pair"]
        elif node.type == "document":
            waiting += [(inner, path) for inner in node.named_children]


def _remember(found: dict[KeyPath, int], path: KeyPath, node: tree_sitter.Node) -> None:
    # The first place counts: a table may be opened again for its sub-tables.
    line = node.start_point[0] + 1
    for end in range(1, len(path) + 1):
        found.setdefault(path[:end], line)


def _quoted(key: str) -> str:
    escaped = key.replace("\\", "\\\\").replace('"', '\\"')
    return '"' + re.sub(r"[\x00-\x1f\x7f]", lambda m: f"\\u{ord(m[0]):04x}", escaped) + '"'
