"""A section that is read from a mesh file."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated, Any, ClassVar, Literal, Self

from pydantic import (
    BaseModel,
    ConfigDict,
    Field,
    PlainValidator,
    ValidationInfo,
    WithJsonSchema,
    model_validator,
)

from fem.errors import Problem, Refused
from fem.mesh.form import CELL, Box
from fem.mesh.grid import Grid

MOST_SPLITS = 4
"""Each split makes four cells of one."""


def _read_length_unit(raw: Any) -> float:
    """Read a unit, such as "mm", or a length that stands for one, such as "1 mm"."""
    return CELL.read(f"1 {raw}" if isinstance(raw, str) and raw[:1].isalpha() else raw)


def _read_mesh(raw: Any, info: ValidationInfo) -> Grid:
    if isinstance(raw, Grid):
        return raw
    if not isinstance(raw, (str, Path)) or not str(raw):
        raise ValueError(f'must be the name of a mesh file, such as "bar.msh", got {raw!r}')
    from fem.mesh.read import read

    return read(Path((info.context or {}).get("folder") or Path()) / raw)


LengthUnit = Annotated[
    float,
    PlainValidator(_read_length_unit),
    WithJsonSchema({"title": "unit of length", "type": "string", "examples": ["mm"]}),
]


class MeshShape(BaseModel):
    """A section read from a mesh file; its named groups are the surfaces and regions.

    Parameters
    ----------
    file
        Path, relative to the case file; read at once, so that a mistake in it is one of the case.
    length_unit
        What the file's coordinates are in: "mm", or a length that stands for it, "1 mm" [m].
    split
        How many times each cell of the file is cut in four, such as 1; the outline stays as drawn.

    """

    model_config = ConfigDict(frozen=True, extra="forbid", arbitrary_types_allowed=True)
    section: ClassVar[None] = None

    form: Literal["mesh"] = "mesh"
    file: Annotated[Grid, PlainValidator(_read_mesh, json_schema_input_type=str), Field(examples=["bar.msh"])]
    length_unit: LengthUnit
    split: Annotated[int, Field(ge=0, le=MOST_SPLITS, strict=True, examples=[1])] = 0

    @model_validator(mode="after")
    def _size_is_likely(self) -> Self:
        if (said := self.file.unlikely(self.length_unit)) is not None:
            raise Refused([Problem("length_unit", said)])
        return self

    def surfaces(self) -> tuple[str, ...] | None:
        """Return the names of the surfaces; None where the file could not be read."""
        return tuple(self.file.surfaces) if self._was_read else None

    def regions(self) -> tuple[str, ...] | None:
        """Return the names of the regions; None where the file could not be read."""
        return tuple(self.file.regions) if self._was_read else None

    def box(self) -> Box:
        """Return the lower left and the upper right corner of the section as drawn [m]."""
        return self.file.box(self.length_unit)

    @property
    def _was_read(self) -> bool:
        # A case with other mistakes is checked with what it says, unread, in this place.
        return isinstance(getattr(self, "file", None), Grid)
