"""Make ``fluted_bar.msh``: the section of a round bar with six flutes in a mould of even wall.

The outline of the product is r(angle) = 14 mm (1 + 0.1 cos(6 angle)); the wall is 0.8 mm thick,
measured square to it. Run it again after a change: ``python meshes/make_fluted_bar.py``.
"""

from __future__ import annotations

from pathlib import Path

import meshio
import numpy as np

RADIUS, DEPTH, FLUTES, WALL = 14.0, 0.1, 6, 0.8  # [mm], share of the radius, number, [mm]
CORE, BAND, SHELL = (
    20,
    14,
    2,
)  # cells along a side of the core, from the core to the outline, through the wall


def outline(angle: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Return points of the outline [mm] and the normals that point out of it, each (2, n)."""
    r = RADIUS * (1.0 + DEPTH * np.cos(FLUTES * angle))
    slope = -RADIUS * DEPTH * FLUTES * np.sin(FLUTES * angle)
    along = np.array([slope * np.cos(angle) - r * np.sin(angle), slope * np.sin(angle) + r * np.cos(angle)])
    return r * np.array([np.cos(angle), np.sin(angle)]), np.array([along[1], -along[0]]) / np.hypot(*along)


def section() -> meshio.Mesh:
    """Return the mesh: a square of cells at the centre, rows of cells around it."""
    side = np.linspace(-1.0, 1.0, CORE + 1)
    x, y = np.meshgrid(side, side, indexing="ij")
    core = np.arange(x.size).reshape(x.shape)
    rim = np.concatenate([core[-1, :-1], core[:0:-1, -1], core[0, :0:-1], core[:-1, 0]])
    # The rim is walked in equal steps of angle, so that the rows around it are even; its square
    # is bulged a little, or the cells at its corners would be flat.
    angle = -0.25 * np.pi + 2.0 * np.pi * np.arange(len(rim)) / len(rim)
    edge, normal = outline(angle)
    square = 0.42 * RADIUS * np.array([x.ravel(), y.ravel()])
    bulge = np.sqrt(1.0 - 0.3 * np.array([y.ravel() ** 2, x.ravel() ** 2]))
    inner = square * bulge
    rows = [inner[:, rim] + (edge - inner[:, rim]) * s for s in np.arange(1, BAND + 1) / BAND]
    rows += [edge + normal * WALL * s for s in np.arange(1, SHELL + 1) / SHELL]
    points = np.concatenate([inner, *rows], axis=1)
    numbers = np.vstack([rim, x.size + np.arange(len(rows) * len(rim)).reshape(len(rows), -1)])
    following = np.roll(numbers, -1, axis=1)
    around = np.stack([numbers[:-1], numbers[1:], following[1:], following[:-1]], axis=-1).reshape(-1, 4)
    middle = np.stack([core[:-1, :-1], core[1:, :-1], core[1:, 1:], core[:-1, 1:]], axis=-1).reshape(-1, 4)
    cells = np.concatenate([middle, around])
    region = np.where(np.arange(len(cells)) < len(cells) - SHELL * len(rim), 1, 2)
    lines = np.column_stack([numbers[-1], following[-1]])
    tags = [region, np.full(len(lines), 3)]
    return meshio.Mesh(
        np.column_stack([points.T, np.zeros(points.shape[1])]),
        [("quad", cells), ("line", lines)],
        cell_data={"gmsh:physical": tags, "gmsh:geometrical": tags},
        field_data={"product": np.array([1, 2]), "wall": np.array([2, 2]), "outside": np.array([3, 1])},
    )


if __name__ == "__main__":
    target = Path(__file__).with_name("fluted_bar.msh")
    section().write(target, file_format="gmsh22", binary=False, float_fmt=".6f")
