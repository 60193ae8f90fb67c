"""The reference of the case file, from the same models that read it.

``python -m fem.case.reference > cases/README.md`` writes it.
"""

from __future__ import annotations

import sys
from collections.abc import Iterator
from typing import Any

from fem.case.schema import schema
from fem.heat.exchange import EXCHANGES
from fem.material import MATERIALS
from fem.mesh.shape import SHAPES

_OPENING = """\
# The case file

Every table and every key. This page is made from the program's own models:
`python -m fem.case.reference > cases/README.md`. To begin, let `rimefront draft bar` or
`rimefront draft tube` write a case that runs as it is, or copy one of the cases of this folder.

## Rules

- A case is [TOML](https://toml.io), one question per file. All mistakes are reported at once, each with
  its line, its key and what would be right.
- A quantity is text with its unit: `"22 mm"`, `"-32 degC"`, `"250 W/m2/K"`, `"20 min"`, `"18 %"`. A bare
  number is refused; any unit of the right kind will do.
- `degC`, `degF` and `K` give a temperature; a difference of temperatures is in `K`. Inside a unit such
  as `W/m2/degC` a degree is a difference.
- Shares are by mass, air is by volume. Heat that leaves the product is positive.
- **Changing values** (in the tables: *steady or changing*) are a quantity, or
  `{ time = { unit = "min", values = [0, 5] }, value = { unit = "degC", values = [-22, -20] } }`, or
  `{ log = "coolant.csv", column = "supply" }`: against the clock of their own stage, straight between
  rows, held before the first and after the last. A log heads its columns `time [s]`, `supply [degC]`;
  commas, semicolons or tabs separate them.
- **Lists** are `{ unit = "degC", values = [-30, -10, 20] }`: numbers under one unit, one at least.
- Files are looked for beside the case.
- `--set` on the command line changes a key for one run, stages by their name:
  `--set stages.freeze.surfaces.outside.h="400 W/m2/K"`.

"""

_UNCERTAIN = """

```toml
[uncertainty]
"stages.freeze.surfaces.outside.h"  = "30 %"     # a share of the value
"shape.thickness"                   = "0.5 mm"   # or an amount in its unit
"materials.mix.conductivity_factor" = "10 %"
"piece.start_temperature"           = "2 K"
```

"""

_EDITOR = """\
## In an editor

`rimefront schema > case.schema.json` writes a JSON Schema (draft 2020-12) of all this. An editor with a
TOML language server completes keys, shows their meaning and underlines mistakes once the schema is
associated with the case files: in its settings, by a pattern such as `cases/*.toml`, or by a comment at
the top of the file where the server has one. What the parts of a case have to do with each other, the
program itself checks when it reads the case.
"""


def reference() -> str:
    """Return the page ``cases/README.md``."""
    drawn = schema()
    tables = drawn["$defs"]
    parts = [_OPENING, "## Top of the file\n\n", _table(drawn, tables, sections=False)]
    parts += _one("[piece]", "Piece", tables)
    parts += _shapes(tables)
    parts += ["## `[regions]`\n\n", 'Each region of the shape names its material: `product = "mix"`.\n\n']
    parts += ["## `[materials.NAME]`\n\n", "What a region is made of, by a name of your choice.\n\n"]
    parts += _kinds("kind", MATERIALS, tables)
    parts += _one("[[stages]]", "Stage", tables)
    parts += ["## `[stages.surfaces.NAME]`\n\n", "What a surface meets during the stage above.\n\n"]
    parts += _kinds("exchange", EXCHANGES, tables)
    parts += _one("[watch]", "Watch", tables)
    parts += _one("[aim]", "Aim", tables)
    parts += _one("[stepping]", "Stepping", tables)
    parts += ["## `[uncertainty]`\n\n", drawn["properties"]["uncertainty"]["description"], _UNCERTAIN]
    return "".join([*parts, _EDITOR])


def _one(heading: str, name: str, tables: dict[str, Any]) -> Iterator[str]:
    yield f"## `{heading}`\n\n{tables[name]['description']}\n\n"
    yield from _keys(tables[name], tables)


def _keys(table: dict[str, Any], tables: dict[str, Any]) -> Iterator[str]:
    """Write the keys of a table, and those of the tables within it."""
    yield _table(table, tables)
    inner: dict[str, list[str]] = {}
    for key, described in table["properties"].items():
        for name in _tables_in(described):
            inner.setdefault(name, []).append(f"`{key}`")
    for name, keys in inner.items():
        yield f"{', '.join(keys)} as a table: {tables[name]['description']}\n\n"
        yield from _keys(tables[name], tables)


def _tables_in(described: dict[str, Any]) -> Iterator[str]:
    """Find the tables that may stand at a key; columns and exchanges have a place of their own."""
    if "title" in described:
        return
    if "$ref" in described:
        yield described["$ref"].rpartition("/")[2]
    for choice in (*described.get("anyOf", ()), described.get("additionalProperties")):
        if isinstance(choice, dict):
            yield from _tables_in(choice)


def _shapes(tables: dict[str, Any]) -> Iterator[str]:
    yield "## `[shape]`\n\nOne form, which gives its surfaces and regions their names. Lines of symmetry "
    yield "carry no heat and have no name.\n\n"
    yield "| form | section | surfaces | regions |\n|---|---|---|---|\n"
    for form, model in SHAPES.items():
        # With every key given there are all the regions that there can be.
        least, most = (
            model.model_construct(None, **keys) for keys in ({}, dict.fromkeys(model.model_fields, 1.0))
        )
        regions = [
            f"`{r}`" + ("" if r in (least.regions() or ()) else f" (if `{r}` is given)")
            for r in most.regions() or ()
        ]
        surfaces = [f"`{s}`" for s in most.surfaces() or ()]
        named = "as the file names them"
        section = f'`"{model.section}"`' if model.section else "either"
        yield f"| `{form}` | {section} | {', '.join(surfaces) or named} | {', '.join(regions) or named} |\n"
    yield "\n"
    yield from _kinds("form", SHAPES, tables)


def _kinds(word: str, kinds: dict[str, Any], tables: dict[str, Any]) -> Iterator[str]:
    for kind, model in kinds.items():
        table = tables[model.__name__]
        yield f'### `{word} = "{kind}"`\n\n{table["description"]}\n\n'
        rest = {**table, "properties": {k: v for k, v in table["properties"].items() if k != word}}
        if rest["properties"]:
            yield from _keys(rest, tables)


def _table(table: dict[str, Any], tables: dict[str, Any], sections: bool = True) -> str:
    """Return the keys of a table as Markdown; without `sections` only those that hold a single value."""
    lines = ["| key | value | if left out | meaning | example |", "|---|---|---|---|---|"]
    required = table.get("required", ())
    for key, described in sorted(table["properties"].items(), key=lambda item: item[0] not in required):
        if not sections and not ("const" in described or described.get("type") == "string"):
            continue
        absent = "**required**" if key in required else _absent(described)
        example = f"`{key} = {_toml(_example(described, tables))}`"
        cells = (f"`{key}`", _words(described), absent, described["description"], example)
        lines.append("| " + " | ".join(cell.replace("|", r"\|") for cell in cells) + " |")
    return "\n".join(lines) + "\n\n"


def _absent(described: dict[str, Any]) -> str:
    return f"`{_toml(described['default'])}`" if "default" in described else "–"


def _words(described: dict[str, Any]) -> str:
    """Say what may stand at a key."""
    if "title" in described:
        return str(described["title"])
    if "const" in described:
        return f"`{_toml(described['const'])}`"
    if "enum" in described:
        return " or ".join(f"`{_toml(word)}`" for word in described["enum"])
    if "anyOf" in described:
        return " or ".join(_words(choice) for choice in described["anyOf"])
    if "$ref" in described:
        return "table, see below"
    if described["type"] == "object":
        inner = described.get("additionalProperties", {})
        table = "$ref" in inner or "oneOf" in inner
        return "tables by name, see below" if table else f"{_words(inner)}, by name"
    return {"string": "text", "boolean": "true or false", "array": "list", "integer": "whole number"}.get(
        described["type"], described["type"]
    )


def _example(described: dict[str, Any], tables: dict[str, Any]) -> Any:
    """Return a value that may stand at a key: the stated example, else one made of its parts."""
    if "examples" in described:
        return described["examples"][0]
    for key in ("const", "default"):
        if key in described:
            return described[key]
    if "enum" in described:
        return described["enum"][0]
    for key in ("anyOf", "oneOf"):
        if key in described:
            return _example(described[key][0], tables)
    if "$ref" in described:
        table = tables[described["$ref"].rpartition("/")[2]]
        return {key: _example(table["properties"][key], tables) for key in table.get("required", ())}
    if described.get("type") == "object":
        return {"NAME": _example(described["additionalProperties"], tables)}
    return {"boolean": True, "integer": 1}.get(described.get("type", ""), "text")


def _toml(value: Any) -> str:
    import tomlkit

    if isinstance(value, dict):
        return "{ " + ", ".join(f"{key} = {_toml(inner)}" for key, inner in value.items()) + " }"
    if isinstance(value, list):
        return "[" + ", ".join(_toml(inner) for inner in value) + "]"
    return str(tomlkit.item(value).as_string())


if __name__ == "__main__":
    sys.stdout.write(reference())
