"""Shapes of pieces: their dimensions, the names of their surfaces and regions, their exact areas."""

from __future__ import annotations

import math
from abc import ABC, abstractmethod
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
from fem.mesh.grid import Grid
from fem.quantity import Kind, Length

CELLS_ACROSS = 44
"""Cells across the smallest dimension where the case gives no cell size."""

MOST_CELLS = 2_000_000
"""A finer mesh than this is taken for a slip in the unit of the cell."""

MOST_SPLITS = 4
"""Each split makes four cells of one."""

CELL = Kind("length", "m", "0.5 mm", above=0.0, most=100.0)
CORNER = Kind("length", "m", "6 mm", least=0.0, most=100.0)
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
LengthUnit = Annotated[
    float,
    PlainValidator(_read_length_unit),
    WithJsonSchema({"title": "unit of length", "type": "string", "examples": ["mm"]}),
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


class Slab(Form):
    """A rectangle from the origin to (thickness, width).

    Parameters
    ----------
    thickness
        Extent in x [m].
    width
        Extent in y [m], such as "50 mm".

    """

    section: ClassVar[Section] = "plane"

    form: Literal["slab"] = "slab"
    thickness: Length
    width: Length

    @property
    def smallest(self) -> float:
        """Smallest dimension [m]."""
        return min(self.thickness, self.width)

    def surfaces(self) -> tuple[str, ...]:
        """Return the names of the surfaces."""
        return ("left", "right", "bottom", "top")

    def regions(self) -> tuple[str, ...]:
        """Return the names of the regions."""
        return ("product",)

    def areas(self) -> dict[str, float]:
        """Return the exact area of each region in the whole section [m2]."""
        return {"product": self.thickness * self.width}

    def volumes(self, length: float) -> dict[str, float]:
        """Return the volume of each region of a piece that is `length` [m] long [m3]."""
        return {region: area * length for region, area in self.areas().items()}

    def box(self) -> Box:
        """Return the lower left and the upper right corner of the whole piece [m]."""
        return (0.0, 0.0), (self.thickness, self.width)


class Rod(Form):
    """A round rod on the axis, z from 0 to its height.

    Parameters
    ----------
    radius
        Extent in r [m], such as "14 mm".
    height
        Extent in z [m], such as "180 mm".

    """

    section: ClassVar[Section] = "axisymmetric"

    form: Literal["rod"] = "rod"
    radius: Length
    height: Length

    @property
    def smallest(self) -> float:
        """Smallest dimension [m]."""
        return min(self.radius, self.height)

    def surfaces(self) -> tuple[str, ...]:
        """Return the names of the surfaces."""
        return ("side", "bottom", "top")

    def regions(self) -> tuple[str, ...]:
        """Return the names of the regions."""
        return ("product",)

    def areas(self) -> dict[str, float]:
        """Return the exact area of each region in the half plane r > 0 [m2]."""
        return {"product": self.radius * self.height}

    def volumes(self, length: float | None = None) -> dict[str, float]:
        """Return the volume of each region of the full revolution [m3]; there is no length."""
        return {"product": math.pi * self.radius**2 * self.height}

    def box(self) -> Box:
        """Return the lower left and the upper right corner of the whole piece [m]."""
        return (-self.radius, 0.0), (self.radius, self.height)


class Ring(Form):
    """A hollow round piece about the axis, z from 0 to its height.

    Parameters
    ----------
    inner
        Radius of the hole [m], such as "6 mm".
    outer
        Radius of the piece [m], such as "20 mm".
    height
        Extent in z [m], such as "60 mm".

    """

    section: ClassVar[Section] = "axisymmetric"

    form: Literal["ring"] = "ring"
    inner: Length
    outer: Length
    height: Length

    def _misfits(self) -> list[Problem]:
        if self.inner < self.outer:
            return []
        return [Problem("inner", f"must be smaller than outer ({_mm(self.outer)}), got {_mm(self.inner)}")]

    @property
    def smallest(self) -> float:
        """Smallest dimension [m]."""
        return min(self.outer - self.inner, self.height)

    def surfaces(self) -> tuple[str, ...]:
        """Return the names of the surfaces."""
        return ("inside", "outside", "bottom", "top")

    def regions(self) -> tuple[str, ...]:
        """Return the names of the regions."""
        return ("product",)

    def areas(self) -> dict[str, float]:
        """Return the exact area of each region in the half plane r > 0 [m2]."""
        return {"product": (self.outer - self.inner) * self.height}

    def volumes(self, length: float | None = None) -> dict[str, float]:
        """Return the volume of each region of the full revolution [m3]; there is no length."""
        return {"product": math.pi * (self.outer - self.inner) * (self.outer + self.inner) * self.height}

    def box(self) -> Box:
        """Return the lower left and the upper right corner of the whole piece [m]."""
        return (-self.outer, 0.0), (self.outer, self.height)


class Bar(Form):
    """A rectangle with rounded corners about the origin, with or without a mould wall around it.

    Parameters
    ----------
    thickness
        Extent of the product in x [m].
    width
        Extent of the product in y [m], such as "50 mm".
    corner
        Radius of the product's corners [m].
    wall
        Thickness of the mould wall around the product [m], such as "0.8 mm"; no wall if left out.

    """

    section: ClassVar[Section] = "plane"

    form: Literal["bar"] = "bar"
    thickness: Length
    width: Length
    corner: Annotated[float, CORNER] = 0.0
    wall: Length | None = None

    def _misfits(self) -> list[Problem]:
        if self.corner <= self.smallest / 2 * (1 + 1e-12):
            return []
        side = "thickness" if self.thickness <= self.width else "width"
        half = f"half of the {side} ({_mm(self.smallest)} / 2 = {_mm(self.smallest / 2)})"
        return [Problem("corner", f"must be at most {half}, got {_mm(self.corner)}")]

    @property
    def smallest(self) -> float:
        """Smallest dimension of the product [m]."""
        return min(self.thickness, self.width)

    @property
    def outer_corner(self) -> float:
        """Radius of the outer corners of the wall [m]; a sharp corner stays sharp outside."""
        return 0.0 if self.sharp else self.corner + (self.wall or 0.0)

    @property
    def sharp(self) -> bool:
        """Whether the corners cannot be told from sharp ones: below a millionth of the bar."""
        return self.corner <= 1e-6 * self.smallest

    def surfaces(self) -> tuple[str, ...]:
        """Return the names of the surfaces."""
        return ("outside",)

    def regions(self) -> tuple[str, ...]:
        """Return the names of the regions; without a wall there is the product only."""
        return ("product",) if self.wall is None else ("product", "wall")

    def areas(self) -> dict[str, float]:
        """Return the exact area of each region in the whole section [m2]."""
        product = _rounded(self.thickness, self.width, self.corner)
        if self.wall is None:
            return {"product": product}
        outer = _rounded(self.thickness + 2 * self.wall, self.width + 2 * self.wall, self.outer_corner)
        return {"product": product, "wall": outer - product}

    def volumes(self, length: float) -> dict[str, float]:
        """Return the volume of each region of a piece that is `length` [m] long [m3]."""
        return {region: area * length for region, area in self.areas().items()}

    def box(self) -> Box:
        """Return the lower left and the upper right corner of the whole piece, wall included [m]."""
        x = self.thickness / 2 + (self.wall or 0.0)
        y = self.width / 2 + (self.wall or 0.0)
        return (-x, -y), (x, y)


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


Shape = Slab | Rod | Ring | Bar | MeshShape
SHAPES: dict[str, type[Slab | Rod | Ring | Bar | MeshShape]] = {
    "bar": Bar,
    "slab": Slab,
    "rod": Rod,
    "ring": Ring,
    "mesh": MeshShape,
}


def _rounded(thickness: float, width: float, corner: float) -> float:
    return thickness * width - (4 - math.pi) * corner**2


def _cell(cell: tuple[float, float], box: Box, area: float) -> list[Problem]:
    """Say what is wrong with cell sizes for a piece in a box with an area of cells [m2]."""
    extents = (box[1][0] - box[0][0], box[1][1] - box[0][1])
    for size, extent, axis in zip(cell, extents, ("across", "along"), strict=True):
        if size > extent:
            message = f"must not be larger than the piece, {_mm(extent)} {axis}, got {_mm(size)}"
            return [Problem("cell", message)]
    cells = area / max(cell[0] * cell[1], 1e-30)
    if cells > MOST_CELLS:
        finest = _mm(1.05 * math.sqrt(area / MOST_CELLS))
        message = f"would give {cells:.2g} cells; got {_mm(min(cell))}, take about {finest} or more"
        return [Problem("cell", message)]
    return []


def _mm(length: float) -> str:
    return f"{length * 1e3:.4g} mm"
