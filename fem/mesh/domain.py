"""The meshed piece: cells, regions, surfaces and what a solved part stands for."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
import skfem
from numpy.typing import NDArray

Array = NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class Domain:
    """A mesh whose regions and surfaces have names, and its section.

    Parameters
    ----------
    mesh
        Quadrilaterals or triangles of first order; coordinates (x, y) or (r, z) [m].
    regions
        Name -> cells, each cell in exactly one region.
    surfaces
        Name -> facets on the outside; facets in none of them are insulated.
    axisymmetric
        Whether the first coordinate is a radius.
    length
        Length of the piece along the normal of a plane section [m]; 1 where axisymmetric.
    mirrored
        Whether the solved part stands for its mirror image too, about x = 0 and about y = 0.
    product
        Names of the regions that are frozen product, as against mould and film.

    """

    mesh: skfem.Mesh
    regions: dict[str, NDArray[np.int64]]
    surfaces: dict[str, NDArray[np.int64]]
    axisymmetric: bool
    length: float
    mirrored: tuple[bool, bool] = (False, False)
    product: tuple[str, ...] = ("product",)

    @property
    def points(self) -> Array:
        """Coordinates of the nodes [m], shape (2, nodes)."""
        return np.asarray(self.mesh.p)

    @cached_property
    def element(self) -> skfem.Element:
        """The nodal element that fits the cells."""
        return skfem.ElementQuad1() if self.mesh.t.shape[0] == 4 else skfem.ElementTriP1()

    def weight(self, x: Array) -> Array:
        """Return what turns a section integral into one over the whole piece, at points [m].

        The only place where a radius, a length or a number of mirror images enters: metres of
        circumference of a revolution, or the length of a plane piece times its mirror images.
        """
        if self.axisymmetric:
            return np.asarray(2.0 * np.pi * x[0] * 2.0 ** sum(self.mirrored))
        return np.full_like(x[0], self.length * 2.0 ** sum(self.mirrored))

    def edge_areas(self, surface: str) -> Array:
        """Return the area of a surface that each node stands for, from its edges alone [m2].

        Simpson's rule on each straight edge, exact for a weight that is linear along it. The
        ledger of heat uses it in place of the assembled form, so that either checks the other.
        """
        a, b = self.mesh.facets[:, self.surfaces[surface]]
        first, last = self.points[:, a], self.points[:, b]
        sixth = np.hypot(*(last - first)) / 6.0
        middle = 2.0 * self.weight((first + last) / 2.0)
        out = np.zeros(self.points.shape[1])
        np.add.at(out, a, sixth * (self.weight(first) + middle))
        np.add.at(out, b, sixth * (self.weight(last) + middle))
        return out

    def fold(self, points: Array) -> Array:
        """Move points of the whole piece into the solved part, shape (2, n) [m]."""
        flip = np.array(self.mirrored)[:, None]
        return np.where(flip, np.abs(points), points)

    @cached_property
    def bounds(self) -> tuple[Array, Array]:
        """Lowest and highest corner of the whole piece [m]."""
        high = self.points.max(axis=1)
        low = np.where(self.mirrored, -high, self.points.min(axis=1))
        return low, high

    @cached_property
    def areas(self) -> dict[str, float]:
        """Meshed area of each region of the whole section [m2]."""
        size = np.abs(_cell_areas(self.mesh)) * 2.0 ** sum(self.mirrored)
        return {name: float(size[cells].sum()) for name, cells in self.regions.items()}

    @cached_property
    def quality(self) -> float:
        """Worst cell of the mesh, as the least sine of a corner angle scaled to 1 for the best.

        1 is a rectangle (or an equilateral triangle), 0 a cell that has collapsed.
        """
        sine = _corner_sines(self.mesh).min()
        return float(sine if self.mesh.t.shape[0] == 4 else sine / np.sin(np.pi / 3))

    def size(self, region: str) -> float:
        """Return the typical side of the cells of a region [m]."""
        areas = np.abs(_cell_areas(self.mesh))[self.regions[region]]
        triangle = 1.0 if self.mesh.t.shape[0] == 4 else 2.0
        return float(np.sqrt(triangle * np.median(areas)))


def _corners(mesh: skfem.Mesh) -> Array:
    """Coordinates of the corners in order, shape (2, corners, cells)."""
    return np.asarray(mesh.p[:, mesh.t])


def _cell_areas(mesh: skfem.Mesh) -> Array:
    """Signed area of each cell [m2]; below 0 where the corners run clockwise."""
    x, y = _corners(mesh)
    return np.asarray(0.5 * (x * np.roll(y, -1, axis=0) - np.roll(x, -1, axis=0) * y).sum(axis=0))


def _corner_sines(mesh: skfem.Mesh) -> Array:
    """Sine of the angle at each corner, negative where the cell folds over, (corners, cells)."""
    corners = _corners(mesh)
    ahead = np.roll(corners, -1, axis=1) - corners
    behind = np.roll(corners, 1, axis=1) - corners
    cross = ahead[0] * behind[1] - ahead[1] * behind[0]
    lengths = np.hypot(*ahead) * np.hypot(*behind)
    turn = np.sign(_cell_areas(mesh))
    return np.asarray(turn * cross / np.maximum(lengths, np.finfo(float).tiny))
