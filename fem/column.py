"""Columns of numbers under one unit, as a case file lists them or a CSV file heads them.

A column keeps what was typed; `Column.in_unit` converts the whole of it at once and names the
row of a value that cannot be right.
"""

from __future__ import annotations

import csv
import json
import math
import re
from collections.abc import Collection
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray
from pydantic import BaseModel, ConfigDict, GetCoreSchemaHandler, field_validator
from pydantic_core import CoreSchema, PydanticCustomError, core_schema

from fem.errors import unknown
from fem.quantity import Kind, converter

Array = NDArray[np.float64]

_HEADING = re.compile(r"\s*([^\[\]]*?)\s*(?:\[\s*([^\[\]]*?)\s*\])?\s*")


class Column(BaseModel):
    """Numbers under one unit: ``{ unit = "degC", values = [-30, -20, 4] }``.

    Parameters
    ----------
    unit
        Unit of all values, as typed.
    values
        The numbers, one at least, finite.

    """

    model_config = ConfigDict(frozen=True, extra="forbid")

    unit: str
    values: tuple[float, ...]

    @field_validator("values", mode="before")
    @classmethod
    def _numbers(cls, raw: Any) -> tuple[float, ...]:
        if not isinstance(raw, (list, tuple)):
            raise _wrong(f"must be a list of numbers, such as [-30, -20, 4], got {raw!r}")
        if not raw:
            raise _wrong("holds no values; one at least is needed")
        for row, value in enumerate(raw, start=1):
            if isinstance(value, bool) or not isinstance(value, (int, float)):
                raise _wrong(f"row {row}: {value!r} is no bare number; the unit stands once, beside the list")
            if not math.isfinite(value):
                raise _wrong(f"row {row}: {value} is not a finite number")
        return tuple(float(value) for value in raw)

    def __len__(self) -> int:
        return len(self.values)

    def in_unit(self, kind: Kind) -> Array:
        """Return the values in the unit of `kind`, shape (n,).

        Raises
        ------
        PydanticCustomError
            A unit that is missing, unknown or of another kind; a value outside the bounds of
            `kind`, with its row.

        """
        convert: Any = converter(self.unit, kind)  # typed for one number, right for arrays
        values: Array = np.asarray(convert(np.array(self.values)), dtype=np.float64)
        low, high = int(np.argmin(values)), int(np.argmax(values))
        for row in (low, high):
            try:
                kind.check(float(values[row]), f"{self.values[row]:.10g} {self.unit}".rstrip())
            except PydanticCustomError as error:
                raise _wrong(f"row {row + 1}: {error.message()}") from error
        return values


@dataclass(frozen=True)
class holds:
    """Declare a column field whose values have to be of one kind.

    ``temperature: Annotated[Column, holds(TEMPERATURE)]`` puts a wrong unit or value at its own
    key instead of at the whole table.

    Parameters
    ----------
    kind
        The quantity; its bounds hold for every value.

    """

    kind: Kind

    def __get_pydantic_core_schema__(self, source: Any, handler: GetCoreSchemaHandler) -> CoreSchema:
        """Read a column, then convert it once to see whether it can be right."""
        return core_schema.no_info_after_validator_function(self._check, handler(source))

    def __get_pydantic_json_schema__(self, schema: Any, handler: Any) -> dict[str, Any]:
        """Describe the column for editors."""
        number, _, unit = self.kind.example.partition(" ")
        example = {"unit": unit, "values": [json.loads(number)]}
        return {**handler(schema), "title": f"list of {self.kind.name}", "examples": [example]}

    def _check(self, column: Column) -> Column:
        column.in_unit(self.kind)
        return column


def read_csv_columns(path: Path, wanted: Collection[str] | None = None) -> dict[str, Column]:
    """Read a CSV file whose first line heads its columns ``name [unit]``.

    Separated by commas, semicolons or tabs, decimal points, UTF-8; blank lines and lines that
    start with ``#`` are passed over. A heading without brackets gives a column without unit.

    Parameters
    ----------
    path
        The file.
    wanted
        Names of the columns to read; the others may hold anything. None for all.

    Returns
    -------
    Columns by name, in the order of the file.

    Raises
    ------
    ValueError
        A file that cannot be read, no rows, a heading twice, a wanted column that is not there,
        a short line, a cell that is no finite number; with the line of the file, counted from 1.

    """
    lines, separator = _lines(path)
    names, units = _headings(lines, separator, path.name)
    for name in wanted or ():
        if name not in names:
            raise ValueError(f"{path.name}: {unknown('column', name, names)}")
    if len(lines) == 1:
        raise ValueError(f"{path.name} has headings but no rows")
    chosen = [i for i, name in enumerate(names) if wanted is None or name in wanted]
    values: dict[int, list[float]] = {i: [] for i in chosen}
    for number, text in lines[1:]:
        cells = _cells(text, separator)
        if len(cells) != len(names):
            raise ValueError(
                f"{path.name}, line {number}: {len(cells)} cells, but {len(names)} columns are headed"
            )
        for i in chosen:
            values[i].append(_number(cells[i], f"{path.name}, line {number}, {names[i]}"))
    return {names[i]: Column(unit=units[i], values=tuple(values[i])) for i in chosen}


def csv_headings(path: Path) -> list[str]:
    """Return the names of a CSV file's columns; raises ValueError like `read_csv_columns`."""
    return _headings(*_lines(path), path.name)[0]


def _lines(path: Path) -> tuple[list[tuple[int, str]], str]:
    """Return the lines that count, with their numbers, and the separator of the first."""
    try:
        text = path.read_text(encoding="utf-8-sig")
    except UnicodeDecodeError as error:
        raise ValueError(f"{path.name} is not UTF-8 text; save it as CSV in UTF-8") from error
    except OSError as error:
        raise ValueError(f"cannot read {path}: {error.strerror or error}") from error
    numbered = enumerate(text.splitlines(), start=1)
    lines = [(number, line) for number, line in numbered if line.strip() and line.lstrip()[0] != "#"]
    if not lines:
        raise ValueError(f"{path.name} is empty; its first line must head the columns, `name [unit]`")
    return lines, max(";\t,", key=lines[0][1].count)


def _headings(lines: list[tuple[int, str]], separator: str, file: str) -> tuple[list[str], list[str]]:
    """Split the first line into names and units."""
    names, units = [], []
    for position, cell in enumerate(_cells(lines[0][1], separator), start=1):
        match = _HEADING.fullmatch(cell)
        if match is None or not match[1]:
            raise ValueError(f'{file}: heading {position} is "{cell.strip()}"; write it `name [unit]`')
        if match[1] in names:
            raise ValueError(f'{file}: two columns are headed "{match[1]}"')
        names.append(match[1])
        units.append(match[2] or "")
    return names, units


def _cells(line: str, separator: str) -> list[str]:
    return next(csv.reader([line], delimiter=separator))


def _number(cell: str, place: str) -> float:
    text = cell.replace("\N{MINUS SIGN}", "-").strip()
    try:
        value = float(text)
    except ValueError:
        said = f'"{text}" is no number' if text else "the cell is empty"
        remedy = "; write the decimal sign as a point" if re.fullmatch(r"[+-]?\d+,\d+", text) else ""
        raise ValueError(f"{place}: {said}{remedy}") from None
    if not math.isfinite(value):
        raise ValueError(f'{place}: "{text}" is not a finite number')
    return value


def _wrong(message: str) -> PydanticCustomError:
    # Braces would be read as fields of the message's template.
    return PydanticCustomError("column", "{said}", {"said": message})
