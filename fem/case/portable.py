"""A case that can travel: the files it names go with it."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path
from typing import Any

FILE_KEYS = ("file", "log")
PLACE = "inputs"


def portable(text: str, folder: Path) -> tuple[str, dict[str, Path]]:
    """Return the text of a case whose files lie beside it, and where each is to be copied from.

    Parameters
    ----------
    text
        TOML of a case that has been read without a problem.
    folder
        Where the names of its files start.

    Returns
    -------
    The text, its files renamed to ``inputs/NAME``, and ``inputs/NAME`` -> file. A case that names
    no file comes back as it is, to the letter.

    """
    import tomlkit

    document = tomlkit.parse(text)
    files: dict[str, Path] = {}
    for table, key in _references(document):
        source = folder / str(table[key])
        name = _free_name(source, files)
        files[name] = source
        table[key] = name
    return (tomlkit.dumps(document), files) if files else (text, {})


def _references(table: Any) -> Iterator[tuple[Any, str]]:
    """Yield each table that names a file, with the key that does."""
    if isinstance(table, dict):
        for key, value in list(table.items()):
            if key in FILE_KEYS and isinstance(value, str):
                yield table, key
            else:
                yield from _references(value)
    elif isinstance(table, list):
        for entry in table:
            yield from _references(entry)


def _free_name(source: Path, taken: dict[str, Path]) -> str:
    """Return a name for a file that no other file of the case has."""
    n, name = 1, f"{PLACE}/{source.name}"
    while name in taken and taken[name].resolve() != source.resolve():
        n += 1
        name = f"{PLACE}/{source.stem}-{n}{source.suffix}"
    return name
