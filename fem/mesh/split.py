"""A mesh file's cells cut in four, names and all."""

from __future__ import annotations

import numpy as np

from fem.mesh.grid import Grid


def split(grid: Grid) -> Grid:
    """Return the same piece with each cell cut in four at the middles of its edges.

    The outline stays what the file drew, straight between its nodes. Nodes keep their numbers, new
    ones follow; children take their parent's region, halves of an edge its surface.
    """
    cells = grid.cells
    corners, count = cells.shape
    nodes = grid.points.shape[1]
    pairs = np.sort(np.stack([cells, np.roll(cells, -1, axis=0)]), axis=0)
    keys = pairs[0].astype(np.int64) * nodes + pairs[1]
    edges, which = np.unique(keys, return_inverse=True)
    ends = np.array([edges // nodes, edges % nodes])
    middles = grid.points[:, ends].mean(axis=1)
    middle = nodes + which.reshape(corners, count)
    points = [grid.points, middles]
    # Each corner keeps a child: the corner, the middle ahead, the inside, the middle behind.
    behind = np.roll(middle, 1, axis=0)
    if corners == 4:
        centre = nodes + len(edges) + np.arange(count)
        points.append(grid.points[:, cells].mean(axis=1))
        children = [np.array([cells[i], middle[i], centre, behind[i]]) for i in range(4)]
    else:
        children = [np.array([cells[i], middle[i], behind[i]]) for i in range(3)] + [middle]
    # The children of a cell stand side by side: 4 i to 4 i + 3.
    whole = np.stack(children, axis=2).reshape(corners, 4 * count)
    regions = {name: (4 * own[:, None] + np.arange(4)).ravel() for name, own in grid.regions.items()}
    surfaces = {}
    for name, lines in grid.surfaces.items():
        low, high = np.sort(lines, axis=0)
        between = nodes + np.searchsorted(edges, low.astype(np.int64) * nodes + high)
        surfaces[name] = np.concatenate([[low, between], [between, high]], axis=1)
    return Grid(np.concatenate(points, axis=1), whole, regions, surfaces)
