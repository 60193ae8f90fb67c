"""The whole section of a piece: the solved part together with its mirror images."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fem.mesh.domain import Array, Domain


@dataclass(frozen=True, eq=False)
class Section:
    """A mesh of the whole section, and where each of its nodes comes from.

    Parameters
    ----------
    points
        Coordinates (x, y), or (r, z) with negative r beyond the axis [m], shape (nodes, 2).
    cells
        Corners of each cell, counter-clockwise, shape (cells, 3 or 4).
    source
        The solved node whose values each node has, shape (nodes,).
    region
        Number of the region of each cell in `names`, shape (cells,).
    names
        Of the regions.

    """

    points: Array
    cells: np.ndarray
    source: np.ndarray
    region: np.ndarray
    names: tuple[str, ...]

    @classmethod
    def of(cls, domain: Domain) -> Section:
        """Build the whole section of a piece; an axisymmetric one gets both its halves."""
        region = np.full(domain.mesh.t.shape[1], -1, dtype=np.int32)
        for number, cells in enumerate(domain.regions.values()):
            region[cells] = number
        points, cells = domain.points.T.copy(), domain.mesh.t.T.copy()
        x, y = points[cells].transpose(2, 0, 1)
        turned = (x * np.roll(y, -1, axis=1) - np.roll(x, -1, axis=1) * y).sum(axis=1) < 0.0
        cells[turned] = cells[turned, ::-1]
        section = cls(points, cells, np.arange(len(points)), region, tuple(domain.regions))
        mirrored = (domain.mirrored[0] or domain.axisymmetric, domain.mirrored[1])
        for axis in np.flatnonzero(mirrored):
            section = section.with_image(int(axis))
        return section

    @property
    def in_space(self) -> NDArray[np.float32]:
        """The nodes with a third coordinate of 0 [m], shape (nodes, 3)."""
        return np.pad(self.points, ((0, 0), (0, 1))).astype(np.float32)

    def with_image(self, axis: int) -> Section:
        """Return the section joined to its mirror image; nodes on the line between are shared.

        Parameters
        ----------
        axis
            Coordinate whose sign turns.

        """
        near = 1e-9 * float(np.abs(self.points).max())
        off = np.flatnonzero(np.abs(self.points[:, axis]) > near)
        image = np.arange(len(self.points))
        image[off] = len(self.points) + np.arange(len(off))
        points = self.points[off].copy()
        points[:, axis] *= -1.0
        return Section(
            np.concatenate([self.points, points]),
            # An image turns the other way round: its corners are taken backwards.
            np.concatenate([self.cells, image[self.cells][:, ::-1]]),
            np.concatenate([self.source, self.source[off]]),
            np.concatenate([self.region, self.region]),
            self.names,
        )
