"""`kind = "table"`: a material measured row by row."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated, Any, Literal, NamedTuple

import numpy as np
from numpy.typing import NDArray
from pydantic import (
    AfterValidator,
    BaseModel,
    ConfigDict,
    Field,
    PlainValidator,
    ValidationInfo,
    WithJsonSchema,
    model_validator,
)
from pydantic_core import PydanticCustomError

from fem.column import Column, csv_headings, holds, read_csv_columns
from fem.curve import Curve
from fem.errors import Problem, Refused, unknown
from fem.material.material import Material
from fem.quantity import CONDUCTIVITY, SHARE, TEMPERATURE, Density, Kind, Temperature

Array = NDArray[np.float64]

ENTHALPY_MASS = Kind("specific enthalpy", "J/kg", "-250 kJ/kg")
ENTHALPY_VOLUME = Kind("enthalpy", "J/m3", "-270 MJ/m3")

COLUMNS = ("temperature", "enthalpy", "conductivity", "ice")
NEEDED = COLUMNS[:3]


def enthalpy_kind(column: Column) -> Kind:
    """Return whether a column of enthalpy is per mass or per volume.

    Raises
    ------
    PydanticCustomError
        Where its unit is neither.

    """
    try:
        column.in_unit(ENTHALPY_VOLUME)
    except PydanticCustomError:
        # Said for enthalpy per mass, which is the usual one.
        column.in_unit(ENTHALPY_MASS)
        return ENTHALPY_MASS
    return ENTHALPY_VOLUME


def _is_enthalpy(column: Column) -> Column:
    enthalpy_kind(column)
    return column


class Enclosed(NamedTuple):
    """A file of rows: where it was read from, and its columns by name."""

    path: Path
    columns: dict[str, Column]


def _read_file(raw: Any, info: ValidationInfo) -> Enclosed | None:
    if raw is None or isinstance(raw, Enclosed):
        return raw
    if not isinstance(raw, (str, Path)):
        raise ValueError(f'must be the name of a CSV file, such as "mix.csv", got {raw!r}')
    folder = (info.context or {}).get("folder") or Path()
    path = Path(folder) / raw
    try:
        headed = csv_headings(path)
        for name in (*NEEDED, *headed):
            if name not in COLUMNS or name not in headed:
                known = COLUMNS if name in headed else headed
                raise ValueError(f"{path.name}: {unknown('column', name, known)}")
        columns = read_csv_columns(path)
    except ValueError as error:
        raise ValueError(str(error)) from error
    for name, column in columns.items():
        try:
            _kind(name, column)
        except PydanticCustomError as error:
            raise ValueError(f"{path.name}, {name}: {error.message()}") from error
    if (said := _wrong_rows(columns)) is not None:
        raise ValueError(f"{path.name}: {said[1]}")
    return Enclosed(path, columns)


_ENTHALPY = Field(title="list of enthalpy", examples=[{"unit": "kJ/kg", "values": [-250]}])
_FILE = WithJsonSchema({"title": "file", "type": "string", "examples": ["mix.csv"]})


class Table(BaseModel):
    """Rows of temperature, enthalpy and conductivity, straight lines between.

    The enthalpy goes on with its end slopes, the conductivity and the ice are held. Rows may
    lie as close as 1e-6 K; they are used as they are.

    Parameters
    ----------
    density
        Density [kg/m3].
    freezing_point
        Where ice first appears, if it is known [degC], such as "-1.6 degC".
    temperature
        Temperatures of the rows, rising [degC].
    enthalpy
        Enthalpy at these temperatures, rising, per mass or per volume [J/kg].
    conductivity
        Conductivity at these temperatures [W/m/K].
    ice
        Ice at these temperatures, by mass [%]; not known if left out.
    file
        A CSV file with these columns instead, each headed by its name and, in square brackets, its
        unit; looked for beside the case file.

    """

    model_config = ConfigDict(frozen=True, extra="forbid")

    kind: Literal["table"] = "table"
    density: Density
    freezing_point: Temperature | None = None
    temperature: Annotated[Column, holds(TEMPERATURE)] | None = None
    enthalpy: Annotated[Column, AfterValidator(_is_enthalpy), _ENTHALPY] | None = None
    conductivity: Annotated[Column, holds(CONDUCTIVITY)] | None = None
    ice: Annotated[Column, holds(SHARE)] | None = None
    file: Annotated[Enclosed | None, PlainValidator(_read_file), _FILE] = None

    @model_validator(mode="after")
    def _rows_fit(self) -> Table:
        listed = [name for name in COLUMNS if getattr(self, name) is not None]
        missing = [name for name in NEEDED if name not in listed]
        if self.file is not None and listed:
            message = f"stands beside {', '.join(listed)}; give the rows as a file or as lists, not both"
            raise Refused([Problem("file", message)])
        if self.file is None and missing:
            message = f"{', '.join(missing)} not given; a table needs {', '.join(NEEDED)} as lists, or a file"
            raise Refused([Problem("", message)])
        if (said := _wrong_rows(self._columns())) is not None:
            raise Refused([Problem(*said)])
        if self.freezing_point is not None:
            T = self._columns()["temperature"].in_unit(TEMPERATURE)
            if not T[0] <= self.freezing_point <= T[-1]:
                rows = f"{T[0]:.6g} to {T[-1]:.6g} degC"
                message = f"{self.freezing_point:.6g} degC is outside the rows, {rows}"
                raise Refused([Problem("freezing_point", message)])
        return self

    def build(self) -> Material:
        """Return the material; enthalpy as the table counts it."""
        columns = self._columns()
        T = columns["temperature"].in_unit(TEMPERATURE)
        kind = enthalpy_kind(columns["enthalpy"])
        H = columns["enthalpy"].in_unit(kind) * (self.density if kind is ENTHALPY_MASS else 1.0)
        ice = columns.get("ice")
        return Material(
            kind=self.kind,
            curve=Curve.from_enthalpy(T, H, columns["conductivity"].in_unit(CONDUCTIVITY)),
            density=self.density,
            range=(float(T[0]), float(T[-1])),
            freezes=True,
            freezing_point=self.freezing_point,
            ice_rows=None if ice is None else (T, ice.in_unit(SHARE) / 100.0),
        )

    def _columns(self) -> dict[str, Column]:
        if self.file is not None:
            return self.file.columns
        return {name: getattr(self, name) for name in COLUMNS if getattr(self, name) is not None}


def falls(column: Column, kind: Kind) -> str | None:
    """Say where a column does not rise, with both rows; None where it rises throughout."""
    values = column.in_unit(kind)
    steps = np.diff(values)
    if np.all(steps > 0.0):
        return None
    row = int(np.argmax(steps <= 0.0))
    before, after = (f"{column.values[i]:.10g} {column.unit}" for i in (row, row + 1))
    return f"must rise from row to row: row {row + 2} is {after}, row {row + 1} is {before}"


def _kind(name: str, column: Column) -> Kind:
    """Return the kind of a column by its name, its unit and values checked."""
    if name == "enthalpy":
        return enthalpy_kind(column)
    kind = {"temperature": TEMPERATURE, "conductivity": CONDUCTIVITY, "ice": SHARE}[name]
    column.in_unit(kind)
    return kind


def _wrong_rows(columns: dict[str, Column]) -> tuple[str, str] | None:
    """Return the first column that cannot stand beside the others, and why."""
    rows = len(columns["temperature"])
    for name, column in columns.items():
        if len(column) != rows:
            return name, f"has {len(column)} values, but temperature has {rows}"
    if rows < 2:
        return "temperature", f"has {rows} row; two at least are needed"
    for name in ("temperature", "enthalpy"):
        if (said := falls(columns[name], _kind(name, columns[name]))) is not None:
            return name, said
    return None
