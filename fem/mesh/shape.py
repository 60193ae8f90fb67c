"""Shapes of pieces: their dimensions, the names of their surfaces and regions, their exact areas."""

from __future__ import annotations

import math
from typing import Annotated, ClassVar, Literal

from fem.errors import Problem
from fem.mesh.drawn import MeshShape
from fem.mesh.form import Box, Form, Section, mm
from fem.quantity import Kind, Length

CORNER = Kind("length", "m", "6 mm", least=0.0, most=100.0)


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
        return [Problem("inner", f"must be smaller than outer ({mm(self.outer)}), got {mm(self.inner)}")]

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
        half = f"half of the {side} ({mm(self.smallest)} / 2 = {mm(self.smallest / 2)})"
        return [Problem("corner", f"must be at most {half}, got {mm(self.corner)}")]

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
