"""What every form that is meshed here has: a cell size, exact areas, and checks of them."""

from __future__ import annotations

import math
from abc import ABC, abstractmethod
from typing import Annotated, Any, ClassVar, Literal, Self

from pydantic import BaseModel, ConfigDict, PlainValidator, WithJsonSchema, model_validator

from fem.errors import Problem, Refused
from fem.quantity import Kind

CELLS_ACROSS = 44
"""Cells across the smallest dimension where the case gives no cell size."""

MOST_CELLS = 2_000_000
"""A finer mesh than this is taken for a slip in the unit of the cell."""

CELL = Kind("length", "m", "0.5 mm", above=0.0, most=100.0)
Section = Literal["plane", "axisymmetric"]
Box = tuple[tuple[float, float], tuple[float, float]]


def _read_cell(raw: Any) -> tuple[float, float]:
    """Read one size, or one across (x, r) and one along (y, z)."""
    if isinstance(raw, (list, tuple)):
        if len(raw) != 2:
            raise ValueError(f"is one size or two (across, along), got {len(raw)}")
        return CELL.read(raw[0]), CELL.read(raw[1])
    size = CELL.read(raw)
    return size, size


_CELLS = {"type": "array", "items": CELL.described(), "minItems": 2, "maxItems": 2}
Cell = Annotated[
    tuple[float, float],
    PlainValidator(_read_cell),
    WithJsonSchema(
        {
            "title": "length, or two: across and along",
            "anyOf": [CELL.described(), _CELLS],
            "examples": [CELL.example],
        }
    ),
]


class Form(BaseModel, ABC):
    """What every form but a mesh file has: a cell size, and checks of it.

    Parameters
    ----------
    cell
        Target size of the cells [m], or two sizes: across (x, r) and along (y, z); chosen from the
        smallest dimension if left out.

    """

    model_config = ConfigDict(frozen=True, extra="forbid")
    section: ClassVar[Section]

    cell: Cell | None = None

    @property
    @abstractmethod
    def smallest(self) -> float:
        """Smallest dimension of the product [m]."""

    @abstractmethod
    def areas(self) -> dict[str, float]:
        """Return the exact area of each region [m2]: the whole section, or the half plane r > 0."""

    @abstractmethod
    def box(self) -> Box:
        """Return the lower left and the upper right corner of the whole piece [m]."""

    def default_cell(self) -> float:
        """Return the cell size chosen where the case gives none [m]."""
        return self.smallest / CELLS_ACROSS

    def cells(self) -> tuple[float, float]:
        """Return the target cell sizes across (x, r) and along (y, z) [m]."""
        return self.cell or (self.default_cell(), self.default_cell())

    @model_validator(mode="after")
    def _fits(self) -> Self:
        problems = self._misfits()
        if not problems:
            problems = _cell(self.cells(), self.box(), sum(self.areas().values()))
        if problems:
            raise Refused(problems)
        return self

    def _misfits(self) -> list[Problem]:
        return []


def _cell(cell: tuple[float, float], box: Box, area: float) -> list[Problem]:
    """Say what is wrong with cell sizes for a piece in a box with an area of cells [m2]."""
    extents = (box[1][0] - box[0][0], box[1][1] - box[0][1])
    for size, extent, axis in zip(cell, extents, ("across", "along"), strict=True):
        if size > extent:
            message = f"must not be larger than the piece, {mm(extent)} {axis}, got {mm(size)}"
            return [Problem("cell", message)]
    cells = area / max(cell[0] * cell[1], 1e-30)
    if cells > MOST_CELLS:
        finest = mm(1.05 * math.sqrt(area / MOST_CELLS))
        message = f"would give {cells:.2g} cells; got {mm(min(cell))}, take about {finest} or more"
        return [Problem("cell", message)]
    return []


def mm(length: float) -> str:
    """Return a length as a sentence says it."""
    return f"{length * 1e3:.4g} mm"
