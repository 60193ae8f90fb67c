"""Boundary values that may change with the clock of their stage.

A signal is a value, a pair of columns in the case, or a column of a logged file: linear between
its rows and held before the first and after the last.
"""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path
from typing import Annotated, Any

import numpy as np
from pydantic import GetCoreSchemaHandler
from pydantic_core import CoreSchema, core_schema

from fem.column import Column, holds, read_csv_columns
from fem.curve import Array
from fem.errors import unknown
from fem.quantity import Kind

CLOCK = Kind("time", "s", "30 s")


@dataclass(frozen=True, eq=False)
class Signal:
    """A value against the clock of its stage.

    Parameters
    ----------
    times
        Clock at the rows, strictly rising [s], shape (n,).
    values
        Values at the rows, in the unit of the quantity, shape (n,).

    Raises
    ------
    ValueError
        Where there is no row, the columns differ in length, a number is not finite, or the time
        does not rise.

    """

    times: Array
    values: Array

    def __post_init__(self) -> None:
        times, values = self.times, self.values
        if len(times) != len(values):
            raise ValueError(f"time has {len(times)} rows and value has {len(values)}")
        if not len(times):
            raise ValueError("has no rows; give one at least")
        if not (np.all(np.isfinite(times)) and np.all(np.isfinite(values))):
            row = int(np.argmin(np.isfinite(times) & np.isfinite(values)))
            raise ValueError(f"row {row + 1} is not a finite number")
        if not np.all(np.diff(times) > 0):
            row = int(np.argmax(np.diff(times) <= 0))
            raise ValueError(
                f"time has to rise, but row {row + 2} ({times[row + 1]:.6g} s) "
                f"does not come after row {row + 1} ({times[row]:.6g} s)"
            )

    @classmethod
    def steady(cls, value: float) -> Signal:
        """Return a signal that never changes."""
        return cls(np.zeros(1), np.array([float(value)]))

    @property
    def constant(self) -> bool:
        """Whether the value is the same at every clock."""
        return bool(np.all(self.values == self.values[0]))

    @property
    def knots(self) -> Array:
        """Clocks at which the slope changes [s], shape (n,); none for a constant."""
        return self.times[:0] if self.constant else self.times

    @property
    def least(self) -> float:
        """Smallest value."""
        return float(self.values.min())

    @property
    def most(self) -> float:
        """Largest value."""
        return float(self.values.max())

    def at(self, clock: float) -> float:
        """Return the value at a clock of the stage [s]."""
        if len(self.values) == 1:
            return float(self.values[0])
        return float(np.interp(clock, self.times, self.values))


@dataclass(frozen=True)
class signal:
    """Declare a field that holds a `Signal`: ``h: Annotated[Signal, signal(COEFFICIENT)]``.

    Parameters
    ----------
    kind
        The quantity; its bounds hold for every row.

    """

    kind: Kind

    def __get_pydantic_core_schema__(self, source: Any, handler: GetCoreSchemaHandler) -> CoreSchema:
        """Read what the case gives; a log's path is taken from the context's ``folder``."""
        columns = {"time": Annotated[Column, holds(CLOCK)], "value": Annotated[Column, holds(self.kind)]}
        fields = {
            name: core_schema.typed_dict_field(handler.generate_schema(annotation))
            for name, annotation in columns.items()
        }
        return core_schema.with_info_wrap_validator_function(
            self._read,
            core_schema.typed_dict_schema(fields),
            metadata={"unit": self.kind.unit, "example": self.kind.example},
        )

    def __get_pydantic_json_schema__(self, schema: Any, handler: Any) -> dict[str, Any]:
        """Describe the value for editors."""
        rows = {**handler.resolve_ref_schema(handler(schema)), "additionalProperties": False}
        named = {key: {"type": "string"} for key in ("log", "column")}
        log = {"type": "object", "properties": named, "required": list(named), "additionalProperties": False}
        return {
            "title": f"{self.kind.name}, steady or changing",
            "anyOf": [self.kind.described(), rows, log],
            "examples": [self.kind.example],
        }

    def _read(self, raw: Any, columns: Any, info: core_schema.ValidationInfo) -> Signal:
        if isinstance(raw, Signal):
            return raw
        if not isinstance(raw, dict):
            return Signal.steady(self.kind.read(raw))
        wanted = ("log", "column") if "log" in raw or "column" in raw else ("time", "value")
        for key in raw:
            if key not in wanted:
                raise ValueError(unknown("key", key, wanted))
        for key in wanted:
            if key not in raw:
                raise ValueError(f"{key} is missing; {_FORMS}")
        if "log" in raw:
            return self._from_log(raw["log"], raw["column"], Path((info.context or {}).get("folder", ".")))
        read = columns(raw)
        return Signal(read["time"].in_unit(CLOCK), read["value"].in_unit(self.kind))

    def _from_log(self, log: Any, column: Any, folder: Path) -> Signal:
        if not (isinstance(log, str) and isinstance(column, str)):
            raise ValueError(_FORMS)
        if column == "time":
            raise ValueError("the column to read is the one beside time; time itself is no value")
        columns = read_csv_columns(folder / log, wanted=("time", column))
        return Signal(columns["time"].in_unit(CLOCK), columns[column].in_unit(self.kind))


_FORMS = (
    'a changing value is { time = { unit = "s", values = [...] }, value = { unit, values } } '
    'or { log = "file.csv", column = "name" }, where the file heads its clock "time [s]"'
)
