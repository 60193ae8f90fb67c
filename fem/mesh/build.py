"""From a shape to its mesh: rows of quadrilaterals, mapped onto each form.

Mapped cells rather than free ones: rows follow the surfaces, where the front runs parallel to
them; the count is known beforehand; and the same case gives the same mesh anywhere.
"""

from __future__ import annotations

import numpy as np
import skfem

from fem.mesh.domain import Array, Domain
from fem.mesh.shape import Bar, MeshShape, Ring, Rod, Shape, Slab
from fem.mesh.split import split

# Every mapping is exact in area; beyond rounding it is a mistake of the mapping.
AREA_TOLERANCE = 1e-9


def build(shape: Shape, length: float | None) -> Domain:
    """Mesh a shape.

    Parameters
    ----------
    shape
        Any form; a mesh file's was read with it.
    length
        Length of a plane piece along the normal [m]; None where axisymmetric.

    Returns
    -------
    The domain, its area asserted against the shape's own.

    """
    if isinstance(shape, MeshShape):
        grid = shape.file
        for _ in range(shape.split):
            grid = split(grid)
        return grid.domain(shape.length_unit, length)
    if isinstance(shape, Bar):
        domain = _bar(shape, length or 1.0)
    elif isinstance(shape, Slab):
        domain = _rectangle(shape, (0.0, shape.thickness), shape.width, length or 1.0)
    elif isinstance(shape, Rod):
        domain = _rectangle(shape, (0.0, shape.radius), shape.height, None)
    else:
        domain = _rectangle(shape, (shape.inner, shape.outer), shape.height, None)
    for region, area in shape.areas().items():
        meshed = domain.areas[region]
        if abs(meshed - area) > AREA_TOLERANCE * area:
            raise AssertionError(f"meshed area of {region} is {meshed:.6g} m2, the shape has {area:.6g} m2")
    return domain


def _rectangle(
    shape: Slab | Rod | Ring, across: tuple[float, float], height: float, length: float | None
) -> Domain:
    """Mesh a rectangle of the section; its sides carry the names the shape gives them."""
    cell_x, cell_y = shape.cells()
    x = np.linspace(*across, _count(across[1] - across[0], cell_x) + 1)
    y = np.linspace(0.0, height, _count(height, cell_y) + 1)
    mesh = skfem.MeshQuad.init_tensor(x, y)
    middle = mesh.p[:, mesh.facets].mean(axis=1)
    outside = mesh.boundary_facets()
    near = 1e-9 * max(height, across[1])
    sides = {
        0: outside[middle[0, outside] < across[0] + near],
        1: outside[middle[0, outside] > across[1] - near],
        2: outside[middle[1, outside] < near],
        3: outside[middle[1, outside] > height - near],
    }
    names = {
        "slab": ("left", "right", "bottom", "top"),
        "rod": (None, "side", "bottom", "top"),
        "ring": ("inside", "outside", "bottom", "top"),
    }[shape.form]
    return Domain(
        mesh=mesh,
        regions={"product": np.arange(mesh.t.shape[1])},
        surfaces={name: sides[i] for i, name in enumerate(names) if name is not None},
        axisymmetric=length is None,
        length=1.0 if length is None else length,
    )


def _bar(shape: Bar, length: float) -> Domain:
    """Mesh a quarter of a rounded rectangle: a core, a band around it, and rows for the wall.

    The band runs from the core's two outer sides to the outline, so that its rows turn with the
    corner; where core and band meet three cells share a node, which keeps every angle near 120
    degrees or below.
    """
    cell, _ = shape.cells()
    half = np.array([shape.thickness, shape.width]) / 2.0
    depth = 0.5 * half.min()
    inner = half - depth
    corner = 0.0 if shape.sharp else min(shape.corner, float(half.min()))
    arc = corner * np.pi / 4.0
    outer = half - corner + arc
    n_x, n_y = (max(4, _count((inner[i] + outer[i]) / 2.0, cell)) for i in (0, 1))
    n_band = _count(depth, cell)

    # Both lines run from the x axis round the corner to the y axis.
    up, left = np.linspace(0.0, 1.0, n_y + 1), np.linspace(1.0, 0.0, n_x + 1)
    y_side, x_side = _along(n_y, half[1] - corner, arc), _along(n_x, half[0] - corner, arc)[::-1]
    core_line = np.concatenate(
        [[np.full(n_y + 1, inner[0]), up * inner[1]], [left[1:] * inner[0], np.full(n_x, inner[1])]], axis=1
    )
    outline, normal = _outline(half, corner, y_side, x_side[1:])
    lines = [core_line + (outline - core_line) * s for s in np.linspace(0.0, 1.0, n_band + 1)]
    n_wall = 0
    if shape.wall is not None:
        n_wall = max(2, _count(shape.wall, cell))
        lines += [outline + normal * shape.wall * s for s in np.linspace(0.0, 1.0, n_wall + 1)[1:]]
    return _assemble_bar(shape, length, inner, (n_x, n_y, n_band, n_wall), np.array(lines))


def _along(count: int, straight: float, arc: float) -> Array:
    """Return places along a side, `count` cells: even on the straight, even on the half corner.

    A node falls on the point where they meet, and a corner however small gets cells of its own:
    chords across it would cut away product.
    """
    if arc == 0.0 or straight <= 0.0:
        return np.linspace(0.0, straight + arc, count + 1)
    bent = min(max(2, round(count * arc / (straight + arc))), count - 1)
    return np.concatenate(
        [np.linspace(0.0, straight, count - bent + 1), straight + np.linspace(0.0, arc, bent + 1)[1:]]
    )


def _outline(half: Array, corner: float, y_side: Array, x_side: Array) -> tuple[Array, Array]:
    """Return points on a quarter of the outline and their outward normals, each (2, n).

    `y_side` holds places along the outline from the x axis to the middle of the corner [m],
    `x_side` places from the y axis, falling from the middle of the corner. A normal of a sharp
    corner is as long as the mitre needs.
    """
    if corner == 0.0:
        points = np.concatenate(
            [[np.full_like(y_side, half[0]), y_side], [x_side, np.full_like(x_side, half[1])]], axis=1
        )
        normals = np.concatenate(
            [[np.ones_like(y_side), np.zeros_like(y_side)], [np.zeros_like(x_side), np.ones_like(x_side)]],
            axis=1,
        )
        normals[:, len(y_side) - 1] = 1.0
        return points, normals
    angle_up = np.maximum(y_side - (half[1] - corner), 0.0) / corner
    angle_left = np.pi / 2.0 - np.maximum(x_side - (half[0] - corner), 0.0) / corner
    angle = np.concatenate([angle_up, angle_left])
    normals = np.array([np.cos(angle), np.sin(angle)]) * _swell(angle)
    straight = np.concatenate(
        [
            [np.full_like(y_side, half[0] - corner), np.minimum(y_side, half[1] - corner)],
            [np.minimum(x_side, half[0] - corner), np.full_like(x_side, half[1] - corner)],
        ],
        axis=1,
    )
    return straight + corner * normals, normals


def _swell(angle: Array) -> Array:
    """Return by how much to move each node outwards so that the chords enclose the area of the arc.

    The ends, where the arc joins the straight sides, stay; the nodes between share the shortfall.
    The same factors serve the wall, whose arcs have the same centre.
    """
    sines = np.sin(np.diff(angle))
    inner = (angle > 0.0) & (angle < np.pi / 2.0)
    both, one = inner[1:] & inner[:-1], inner[1:] ^ inner[:-1]
    a, b = sines[both].sum(), sines[one].sum()
    neither = sines[~both & ~one].sum()
    c = np.pi / 2.0 - neither
    factor = 2.0 * c / (b + np.sqrt(b * b + 4.0 * a * c))
    return np.where(inner, factor, 1.0)


def _assemble_bar(
    shape: Bar, length: float, inner: Array, counts: tuple[int, int, int, int], lines: Array
) -> Domain:
    """Join core, band and wall into one mesh, each node numbered once."""
    n_x, n_y, n_band, n_wall = counts
    grid_x, grid_y = np.meshgrid(
        np.linspace(0.0, inner[0], n_x + 1), np.linspace(0.0, inner[1], n_y + 1), indexing="ij"
    )
    core = np.arange(grid_x.size).reshape(grid_x.shape)
    core_line = np.concatenate([core[-1, :], core[-2::-1, -1]])
    rows = grid_x.size + np.arange((len(lines) - 1) * lines.shape[2]).reshape(len(lines) - 1, -1)
    around = np.vstack([core_line, rows])
    points = np.concatenate(
        [[grid_x.ravel(), grid_y.ravel()], lines[1:].transpose(1, 0, 2).reshape(2, -1)], axis=1
    )

    in_core = _quads(core)
    in_rows = _quads(around)
    mesh = skfem.MeshQuad(points, np.ascontiguousarray(np.concatenate([in_core, in_rows], axis=1)))
    per_row = n_x + n_y
    product = np.arange(in_core.shape[1] + n_band * per_row)
    regions = {"product": product}
    if n_wall:
        regions["wall"] = np.arange(len(product), len(product) + n_wall * per_row)
    ends = around[-1]
    facets = np.sort(np.array([ends[:-1], ends[1:]]), axis=0)
    order = {(a, b): i for i, (a, b) in enumerate(zip(*np.sort(mesh.facets, axis=0), strict=True))}
    outside = np.array([order[a, b] for a, b in facets.T])
    return Domain(mesh, regions, {"outside": outside}, False, length, (True, True))


def _quads(grid: np.ndarray) -> np.ndarray:
    """Cells of a grid of node numbers, shape (4, cells), corners in order round each cell."""
    return np.array([g.ravel() for g in (grid[:-1, :-1], grid[1:, :-1], grid[1:, 1:], grid[:-1, 1:])])


def _count(length: float, cell: float) -> int:
    return max(1, int(np.ceil(length / cell - 1e-9)))
