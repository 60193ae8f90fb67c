"""A mesh from elsewhere, made fit to be solved on, or refused with the reason."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from fem.curve import Array

if TYPE_CHECKING:
    from fem.mesh.domain import Domain

Numbers = np.ndarray

# A cell of less area than this share of its longest edge squared is a line drawn twice.
FLAT = 1e-9
# Nodes nearer to each other than this share of the piece were meant to be one.
NEAR = 1e-7
# A coordinate beyond this, in whatever unit, is what a damaged file holds.
FARTHEST = 1e9
# Outside these sizes no piece is frozen in a mould [m]: the unit of the file was mistaken.
WIDEST, THINNEST, SHORTEST = 0.5, 2e-3, 10e-3
UNITS = {"mm": 1e-3, "inch": 0.0254, "m": 1.0}


@dataclass(frozen=True, eq=False)
class Grid:
    """A flat mesh whose cells all have a region, in the units of its file.

    Parameters
    ----------
    points
        Coordinates, shape (2, nodes); every node belongs to a cell.
    cells
        Corners in order, anticlockwise, shape (3, cells) or (4, cells).
    regions
        Name -> cells; the product first.
    surfaces
        Name -> pairs of nodes on the outside, shape (2, edges).

    """

    points: Array
    cells: Numbers
    regions: dict[str, Numbers]
    surfaces: dict[str, Numbers]

    def box(self, unit: float) -> tuple[tuple[float, float], tuple[float, float]]:
        """Return the lower left and the upper right corner [m]; `unit` is one unit of the file [m]."""
        low, high = self.points.min(axis=1) * unit, self.points.max(axis=1) * unit
        return (float(low[0]), float(low[1])), (float(high[0]), float(high[1]))

    def unlikely(self, unit: float) -> str | None:
        """Say what is odd about the size of the product, if `unit` [m] is one unit of the file."""
        cells = self.regions["product"] if "product" in self.regions else slice(None)
        x, y = self.points[:, self.cells[:, cells].ravel()]
        extent = (float(np.ptp(x)), float(np.ptp(y)))
        low, high = min(extent) * unit, max(extent) * unit
        if low <= WIDEST and (low >= THINNEST or high >= SHORTEST):
            return None
        others = [f"in {name} {_size(extent, u)}" for name, u in UNITS.items() if abs(u / unit - 1.0) > 1e-6]
        return f"makes the product {_size(extent, unit)}; the same file would be {', '.join(others)}"

    def beyond_axis(self, unit: float) -> str | None:
        """Say how far an axisymmetric section lies on the wrong side of the axis, if it does."""
        least = float(self.points[0].min())
        if least >= -NEAR * float(np.ptp(self.points[0])):
            return None
        return (
            f"has points at r = {least * unit * 1e3:.4g} mm; an axisymmetric section is drawn on one side of "
            "its axis, x = r from 0 upwards"
        )

    def domain(self, unit: float, length: float | None) -> Domain:
        """Return what the solver takes; `unit` is one unit of the file [m].

        Parameters
        ----------
        unit
            [m].
        length
            Length of a plane piece along the normal [m]; None where axisymmetric.

        """
        import skfem

        from fem.mesh.domain import Domain

        points = np.ascontiguousarray(self.points) * unit
        if length is None:
            points[0] = np.maximum(points[0], 0.0)
        kind = skfem.MeshQuad if len(self.cells) == 4 else skfem.MeshTri
        mesh = kind(points, np.ascontiguousarray(self.cells))
        count = points.shape[1]
        known = _keys(np.sort(mesh.facets, axis=0), count)
        order = np.argsort(known)
        surfaces = {
            name: order[np.searchsorted(known, _keys(edges, count), sorter=order)]
            for name, edges in self.surfaces.items()
        }
        return Domain(
            mesh, dict(self.regions), surfaces, length is None, 1.0 if length is None else length,
            product=("product",) if "product" in self.regions else tuple(self.regions),
        )  # fmt: skip


def grid_of(
    points: Array,
    triangles: Numbers,
    quads: Numbers,
    lines: Numbers,
    areas: Mapping[str, Numbers],
    edges: Mapping[str, Numbers],
) -> Grid:
    """Return the mesh that a file holds, mended where that is harmless.

    Cells that run clockwise are turned round, loose nodes dropped, and quadrilaterals that stand
    among triangles split in two.

    Parameters
    ----------
    points
        Coordinates, shape (nodes, 2 or 3).
    triangles, quads, lines
        Corners, shapes (n, 3), (n, 4) and (n, 2).
    areas
        Name -> numbers of cells, triangles counted first.
    edges
        Name -> numbers of lines.

    Raises
    ------
    ValueError
        In one sentence, what cannot be mended.

    """
    flat = _flattened(points, [triangles, quads, lines])
    count = len(triangles)
    middles = np.concatenate([flat[:, cells].mean(axis=2) for cells in (triangles, quads)], axis=1)
    owner = _owners(areas, middles)
    triangles, quads = _facing_up(flat, triangles), _facing_up(flat, quads)
    if len(triangles) and len(quads):
        # The shorter diagonal keeps both halves of a quadrilateral as stout as they can be.
        across = np.hypot(*(flat[:, quads[:, 0]] - flat[:, quads[:, 2]]))
        along = np.hypot(*(flat[:, quads[:, 1]] - flat[:, quads[:, 3]]))
        turned = np.where((across <= along)[:, None], quads, np.roll(quads, -1, axis=1))
        triangles = np.concatenate([triangles, turned[:, [0, 1, 2]], turned[:, [0, 2, 3]]])
        owner = np.concatenate([owner, owner[count:]])
        quads = quads[:0]
    cells = triangles if len(triangles) else quads
    used, renumbered = np.unique(cells, return_inverse=True)
    cells = renumbered.reshape(cells.shape)
    new = np.full(flat.shape[1], -1)
    new[used] = np.arange(len(used))
    outside = _outside(flat[:, used], cells)
    names = sorted(areas, key=lambda name: name != "product")
    regions = {name: np.flatnonzero(owner == list(areas).index(name)) for name in names}
    named = {name: new[lines[some]] for name, some in edges.items()}
    surfaces = _surfaces(flat[:, used], cells, outside, named)
    return Grid(np.ascontiguousarray(flat[:, used]), np.ascontiguousarray(cells.T), regions, surfaces)


def _flattened(points: Array, blocks: list[Numbers]) -> Array:
    """Return the coordinates in the plane, shape (2, nodes)."""
    points = np.asarray(points, dtype=float)
    for block in blocks:
        if block.size and (block.min() < 0 or block.max() >= len(points)):
            raise ValueError("has cells with corners that are no nodes of the file; it is damaged")
    used = np.unique(np.concatenate([block.ravel() for block in blocks[:2]]))
    inside = points[used]
    if not np.all(np.abs(inside) <= FARTHEST):
        raise ValueError("has coordinates that are no numbers, or beyond all sizes; it is damaged")
    extent = float(np.ptp(inside, axis=0).max())
    if inside.shape[1] > 2 and np.ptp(inside[:, 2]) > NEAR * extent:
        low, high = inside[:, 2].min(), inside[:, 2].max()
        span = f"z goes from {low:.4g} to {high:.4g}"
        raise ValueError(f"is not flat: {span}; draw the section in the x, y plane")
    return np.ascontiguousarray(points[:, :2].T)


def _owners(areas: Mapping[str, Numbers], middles: Array) -> Numbers:
    """Return the number of the group that each cell belongs to, each to exactly one."""
    count = middles.shape[1]
    owner = np.full(count, -1)
    names = list(areas)
    for number, name in enumerate(names):
        twice = areas[name][owner[areas[name]] >= 0]
        if len(twice):
            both = f'"{names[owner[twice[0]]]}" and in "{name}"'
            raise ValueError(f"has {len(twice)} cells both in {both}; each needs one")
        owner[areas[name]] = number
    bare = np.flatnonzero(owner < 0)
    if len(bare):
        many = f"{len(bare)} of {count} cells"
        raise ValueError(f"has {many} in no named group, one at {_at(middles[:, bare[0]])}; name every area")
    return owner


def _facing_up(flat: Array, cells: Numbers) -> Numbers:
    """Turn clockwise cells round; refuse those without area and those that fold over."""
    if not len(cells):
        return cells
    x, y = flat[:, cells]
    area = 0.5 * (x * np.roll(y, -1, axis=1) - np.roll(x, -1, axis=1) * y).sum(axis=1)
    ahead = np.roll([x, y], -1, axis=2) - [x, y]
    longest = (ahead**2).sum(axis=0).max(axis=1)
    turn = ahead[0] * np.roll(ahead[1], -1, axis=1) - ahead[1] * np.roll(ahead[0], -1, axis=1)
    turn = turn * np.where(area < 0, -1.0, 1.0)[:, None]
    flats = np.flatnonzero(np.abs(area) <= FLAT * longest)
    folded = np.flatnonzero(turn.min(axis=1) < -FLAT * longest)
    # Two lobes of a cell that crosses itself may cancel, so that it has no area either.
    for found, words in ((folded, "folded over"), (flats, "without area")):
        if len(found):
            where = _at(flat[:, cells[found[0]]].mean(axis=1))
            raise ValueError(f"has {len(found)} of {len(cells)} cells {words}, one at {where}; mesh it again")
    return np.where((area < 0)[:, None], cells[:, ::-1], cells)


def _outside(flat: Array, cells: Numbers) -> Numbers:
    """Return the edges that belong to one cell only, shape (2, n); refuse what is not one sound piece."""
    # Imported here: every case knows this module, and few come with a mesh.
    from scipy.sparse import coo_matrix
    from scipy.sparse.csgraph import connected_components
    from scipy.spatial import cKDTree

    start, end = cells.ravel(), np.roll(cells, -1, axis=1).ravel()
    count = flat.shape[1]
    one_way, times = np.unique(start * count + end, return_counts=True)
    if times.max() > 1:
        # Neighbours run along their common edge in opposite directions.
        edge = one_way[np.argmax(times > 1)]
        where = _at(flat[:, [edge // count, edge % count]].mean(axis=1))
        raise ValueError(f"has cells that lie on top of each other, for example at {where}; mesh it again")
    _, which, times = np.unique(_keys(np.array([start, end]), count), return_inverse=True, return_counts=True)
    outside = np.flatnonzero(times[which] == 1)
    rim = np.unique(start[outside])
    if len(rim) > 1:
        gap, _ = cKDTree(flat[:, rim].T).query(flat[:, rim].T, k=2)
        close = np.flatnonzero(gap[:, 1] <= NEAR * np.ptp(flat, axis=1).max())
        if len(close):
            where = _at(flat[:, rim[close[0]]])
            raise ValueError(f"has {len(close)} nodes that lie on top of another, one at {where}; merge them")
    corner = np.repeat(np.arange(len(cells)), cells.shape[1])
    shared = coo_matrix((np.ones(len(which), dtype=bool), (corner, which))).tocsr()
    parts, _ = connected_components(shared @ shared.T, directed=False)
    if parts > 1:
        raise ValueError(f"holds {parts} parts that do not touch along an edge; a case has one piece")
    return np.array([start[outside], end[outside]])


def _surfaces(
    flat: Array, cells: Numbers, outside: Numbers, edges: Mapping[str, Numbers]
) -> dict[str, Numbers]:
    """Return each named surface as pairs of nodes; refuse what does not lie on the outside."""
    count = flat.shape[1]
    there = _keys(outside, count)
    every = _keys(np.array([cells.ravel(), np.roll(cells, -1, axis=1).ravel()]), count)
    found: dict[str, Numbers] = {}

    def place(key: int) -> str:
        return _at(flat[:, [key // count, key % count]].mean(axis=1))

    for name, pairs in edges.items():
        # -1 stands for a node that no cell has.
        keys = np.unique(_keys(pairs.T, count)) if pairs.min() >= 0 else np.array([-1])
        if not np.all(np.isin(keys, every)):
            raise ValueError(
                f'has lines in "{name}" that are no edges of its cells; mesh lines and areas together, '
                "so that they share their nodes"
            )
        inner = keys[~np.isin(keys, there)]
        if len(inner):
            many = f'{len(inner)} of {len(keys)} lines of "{name}"'
            raise ValueError(
                f"has {many} inside the piece, one at {place(inner[0])}; a surface lies on the outside: "
                "take them out of the group"
            )
        for other, known in found.items():
            twice = np.intersect1d(keys, known)
            if len(twice):
                both = f'"{other}" and in "{name}"'
                raise ValueError(f"has lines both in {both}, one at {place(twice[0])}; each needs one")
        found[name] = keys
    return {name: np.array([keys // count, keys % count]) for name, keys in found.items()}


def _keys(pairs: Numbers, count: int) -> Numbers:
    """Return one number for each pair of nodes, whichever comes first."""
    low, high = np.sort(pairs, axis=0).astype(np.int64)
    return np.asarray(low * count + high)


def _at(place: Array) -> str:
    return f"({place[0]:.4g}, {place[1]:.4g})"


def _size(extent: tuple[float, float], unit: float) -> str:
    metres = [e * unit for e in extent]
    scale, word = (1.0, "m") if min(metres) >= 0.5 else (1e3, "mm")
    return " x ".join(f"{e * scale:.3g}" for e in metres) + f" {word}"
