"""From a TOML text to a `Case`, or to every problem in it at once."""

from __future__ import annotations

import re
import tomllib
from collections.abc import Iterator, Sequence
from dataclasses import replace
from pathlib import Path
from typing import Any, TypeVar

from pydantic import BaseModel, ValidationError

from fem.case.case import Aim, Case, Piece, Stage
from fem.case.check import Parts, check
from fem.case.uncertainty import read_uncertainty
from fem.case.wording import KeyPath, Note, listed, notes, one_line, one_of, shown
from fem.errors import CaseError, Problem, unknown
from fem.heat.exchange import EXCHANGES
from fem.march.control import Stepping
from fem.mesh.shape import SHAPES
from fem.watch.schedule import Watch

SCHEMA = 1
REQUIRED = ("schema", "piece", "shape", "regions", "materials", "stages")
SECTIONS = (*REQUIRED, "title", "watch", "aim", "stepping", "uncertainty")

Model = TypeVar("Model", bound=BaseModel)


def load(path: str | Path, overrides: Sequence[str] = ()) -> Case:
    """Read a case file.

    Parameters
    ----------
    path
        The file; what it names is looked for beside it.
    overrides
        Each ``key=value`` (see `fem.case.override`).

    Raises
    ------
    CaseError
        Every problem of the file and of the overrides.

    """
    return loads(text_of(path), str(path), Path(path).parent, overrides)


def loads(text: str, source: str = "<text>", folder: Path = Path(), overrides: Sequence[str] = ()) -> Case:
    """Read a case from its text.

    Parameters
    ----------
    text
        TOML.
    source
        What messages call it.
    folder
        Where the files that it names are.
    overrides
        Each ``key=value``.

    Raises
    ------
    CaseError
        Every problem of the text and of the overrides.

    """
    written = text
    tree = tree_of(text, source)
    if overrides:
        from fem.case.override import apply

        text = apply(text, overrides, source)
        tree = tree_of(text, source)
    found: list[Note] = []
    parts = Parts(tree)
    title, stepping = _read(parts, folder, found)
    found += check(parts)
    if found:
        raise CaseError(source, _placed(found, tree, written, overrides))
    assert parts.piece is not None
    assert parts.shape is not None
    case = Case(
        schema=SCHEMA,
        title=title,
        piece=parts.piece,
        shape=parts.shape,
        regions=parts.regions,
        materials=parts.materials,
        stages=tuple(stage for stage in parts.stages if stage is not None),
        watch=parts.watch or Watch(),
        aim=parts.aim,
        stepping=stepping or Stepping(),
        text=text,
        source=source,
        folder=folder,
    )
    if "uncertainty" in tree:
        case = replace(case, uncertainty=read_uncertainty(case, tree["uncertainty"], found))
        if found:
            raise CaseError(source, _placed(found, tree, written, overrides))
    return case


def text_of(path: str | Path) -> str:
    """Return the text of a file.

    Raises
    ------
    CaseError
        Where it cannot be read as UTF-8.

    """
    source = str(path)
    try:
        text = Path(path).read_bytes().decode("utf-8-sig")
    except UnicodeDecodeError as error:
        message = f"is not UTF-8 text (byte {error.start + 1}); save it as UTF-8"
        raise CaseError(source, [Problem("file", message)]) from error
    except (OSError, ValueError) as error:
        folder = isinstance(error, IsADirectoryError)
        message = "is a folder, not a case file" if folder else f"cannot be read: {_reason(error)}"
        raise CaseError(source, [Problem("file", message)]) from error
    return text


def tree_of(text: str, source: str) -> dict[str, Any]:
    """Return what a TOML text holds.

    Raises
    ------
    CaseError
        Where it is no TOML, with the line.

    """
    try:
        tree = tomllib.loads(text)
    except RecursionError as error:
        raise CaseError(source, [Problem("file", "is nested too deeply")]) from error
    except ValueError as error:
        said = re.sub(r"\s*\(at .*\)$", "", str(error))
        match = re.search(r"\(at line (\d+)", str(error))
        line = int(match[1]) if match else text.count("\n") + 1 if "(at end" in str(error) else None
        remedy = '; text and quantities stand in quotes, such as "22 mm"' if said == "Invalid value" else ""
        message = one_line(f"is no TOML here: {said}{remedy}")
        raise CaseError(source, [Problem("file", message, line)]) from error
    huge = [Problem(dotted, "is a whole number beyond 64 bits") for dotted in _huge(tree)]
    if huge:
        raise CaseError(source, huge)
    return tree


def _huge(tree: dict[str, Any]) -> Iterator[str]:
    """Find whole numbers that TOML does not have, and that Python would not even print."""
    waiting: list[tuple[str, Any]] = list(tree.items())
    while waiting:
        place, value = waiting.pop()
        if isinstance(value, dict):
            waiting += [(f"{place}.{key}", inner) for key, inner in value.items()]
        elif isinstance(value, list):
            waiting += [(place, inner) for inner in value]
        elif isinstance(value, int) and abs(value) >= 2**63:
            yield one_line(place)


def _schema(found: Any) -> Note | None:
    if type(found) is int and found > SCHEMA:
        newer = f"{found} is newer than this program, which reads schema = {SCHEMA}; update the program"
        return Note(("schema",), newer)
    if type(found) is not int or found != SCHEMA:
        return Note(("schema",), f"must be {SCHEMA}, got {shown(found)}")
    return None


def _read(parts: Parts, folder: Path, found: list[Note]) -> tuple[str, Stepping | None]:
    """Read every section by itself, so that a mistake in one hides none in another."""
    tree = parts.tree
    for key in tree:
        if key not in SECTIONS:
            found.append(Note((key,), unknown("key", key, SECTIONS)))
    for key in REQUIRED:
        if key not in tree:
            found.append(Note((key,), _MISSING[key]))
    if (wrong := _schema(tree.get("schema", SCHEMA))) is not None:
        found.append(wrong)
    title = tree.get("title", "")
    if not isinstance(title, str):
        found.append(Note(("title",), f"must be text in quotes, got {shown(title)}"))
    parts.piece = _section(Piece, parts, "piece", folder, found)
    parts.watch = _section(Watch, parts, "watch", folder, found)
    parts.aim = _section(Aim, parts, "aim", folder, found)
    stepping = _section(Stepping, parts, "stepping", folder, found)
    if "shape" in tree:
        parts.shape = _kind(SHAPES, "form", tree["shape"], ("shape",), folder, found)
    _read_materials(parts, folder, found)
    _read_stages(parts, folder, found)
    return title, stepping


_MISSING = {
    "schema": f"is missing; write schema = {SCHEMA} at the top",
    "piece": 'is missing; open [piece] with section = "plane" and so on',
    "shape": 'is missing; open [shape] with form = "bar" and so on',
    "regions": 'is missing; open [regions] with product = "name of a material"',
    "materials": "is missing; open [materials.NAME] for each material",
    "stages": "is missing; open [[stages]] for each stage, with name and lasts",
}


def _read_materials(parts: Parts, folder: Path, found: list[Note]) -> None:
    from fem.material import MATERIALS

    for name, raw in _entries(parts.tree, "materials", found).items():
        material = _kind(MATERIALS, "kind", raw, ("materials", name), folder, found)
        if material is None:
            continue
        parts.materials[name] = material
        try:
            parts.built[name] = material.build()
        except ValueError as error:
            found.append(Note(("materials", name), one_line(str(error))))
    for region, material in _entries(parts.tree, "regions", found).items():
        if isinstance(material, str):
            parts.regions[region] = material
        else:
            message = f"must be the name of a material, in quotes, got {shown(material)}"
            found.append(Note(("regions", region), message))


def _read_stages(parts: Parts, folder: Path, found: list[Note]) -> None:
    raw = parts.tree.get("stages", [{}])
    if not isinstance(raw, list):
        found.append(Note(("stages",), f"is a list of tables: open each with [[stages]], got {shown(raw)}"))
    elif not raw:
        found.append(Note(("stages",), "is empty; open one [[stages]] at least, with name and lasts"))
    elif "stages" in parts.tree:
        parts.stages = [_stage(entry, ("stages", i), folder, found) for i, entry in enumerate(raw)]


def _stage(raw: Any, path: KeyPath, folder: Path, found: list[Note]) -> Stage | None:
    if not isinstance(raw, dict) or not isinstance(raw.get("surfaces", {}), dict):
        return _table(Stage, raw, path, folder, found)
    surfaces = {
        name: _kind(EXCHANGES, "exchange", exchange, (*path, "surfaces", name), folder, found)
        for name, exchange in raw.get("surfaces", {}).items()
    }
    readable = {name: exchange for name, exchange in surfaces.items() if exchange is not None}
    return _table(Stage, {**raw, "surfaces": readable}, path, folder, found)


def _section(model: type[Model], parts: Parts, key: str, folder: Path, found: list[Note]) -> Model | None:
    return _table(model, parts.tree[key], (key,), folder, found) if key in parts.tree else None


def _entries(tree: dict[str, Any], key: str, found: list[Note]) -> dict[str, Any]:
    raw = tree.get(key, {})
    if not isinstance(raw, dict):
        found.append(Note((key,), f"is a table, got {shown(raw)}"))
        return {}
    if not raw and key in tree:
        found.append(Note((key,), "is empty"))
    return raw


def _kind(kinds: dict[str, Any], word: str, raw: Any, path: KeyPath, folder: Path, found: list[Note]) -> Any:
    """Read a table as the kind that one of its keys names."""
    if not isinstance(raw, dict):
        found.append(Note(path, f"is a table with {word} = ..., got {shown(raw)}"))
    elif word not in raw:
        found.append(Note((*path, word), f"is missing; one of {listed(kinds)}"))
    elif not isinstance(raw[word], str) or raw[word] not in kinds:
        found.append(Note((*path, word), one_of(word, raw[word], list(kinds))))
    else:
        return _table(kinds[raw[word]], raw, path, folder, found)
    return None


def _table(model: type[Model], raw: Any, path: KeyPath, folder: Path, found: list[Note]) -> Model | None:
    if not isinstance(raw, dict):
        found.append(Note(path, f"is a table, got {shown(raw)}"))
        return None
    try:
        return model.model_validate(raw, context={"folder": folder})
    except ValidationError as error:
        found.extend(notes(error, model, path))
        return None


def _placed(found: list[Note], tree: dict[str, Any], written: str, overrides: Sequence[str]) -> list[Problem]:
    """Give each note its dotted key and its line, or the override that brought it in."""
    from fem.case.locate import dotted, line_of, lines, named

    known = lines(written)
    paths = []
    if overrides:
        from fem.case.override import parse

        paths = [parse(override).path for override in overrides]
    problems = []
    for note in dict.fromkeys(found):
        full = named(note.path, tree)
        if any(full[: len(path)] == path for path in paths):
            problems.append(Problem(dotted(note.path, tree), f"{note.message} (--set)"))
        else:
            problems.append(Problem(dotted(note.path, tree), note.message, line_of(note.path, known)))
    return problems


def _reason(error: Exception) -> str:
    return error.strerror or str(error) if isinstance(error, OSError) else str(error)
