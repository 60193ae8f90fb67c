"""The last field frame of a run folder, read through meshio."""

from __future__ import annotations

import struct
import zlib
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any
from xml.etree import ElementTree

import numpy as np
from numpy.typing import NDArray

from fem.result.folder import Array

CORNERS = {"triangle": 3, "quad": 4}


class NoMaps(Exception):
    """There is no field frame to show; its text says why."""


@dataclass(frozen=True, eq=False)
class Frame:
    """One field frame of the whole piece.

    Parameters
    ----------
    time
        Since the run began [s]; None where ``fields.pvd`` does not say.
    points
        Coordinates (x, y) or (r, z) [m], shape (nodes, 2).
    triangles
        Corners of each triangle, shape (triangles, 3); quadrilaterals are cut in two.
    region
        Number of the region of each triangle, shape (triangles,).
    outline
        Ends of the edges on the outside and between two regions, shape (edges, 2).
    values
        Array's name -> value at each node, shape (nodes,).
    names
        Of the regions, in the order of their numbers; empty where the file does not say.
    frozen_through
        Temperature at which the local freezing time ends [degC]; None where not said.

    """

    time: float | None
    points: Array
    triangles: NDArray[np.int64]
    region: NDArray[np.int64]
    outline: NDArray[np.int64]
    values: dict[str, Array] = field(repr=False)
    names: tuple[str, ...] = ()
    frozen_through: float | None = None


def last_frame(folder: Path) -> Frame:
    """Read the last frame that ``fields.pvd`` names.

    Raises
    ------
    NoMaps
        Where there is none, or it cannot be read.

    """
    time, path = _last_entry(folder)
    if not path.is_file():
        raise NoMaps(f"fields.pvd names {path.relative_to(folder)}, which is not in the folder")
    import meshio

    try:
        read = _read(path)
    # What a truncated or a garbled file does to the reader: none of it is worth more than a sentence.
    except (
        meshio.ReadError,
        ElementTree.ParseError,
        zlib.error,
        struct.error,
        ArithmeticError,
        AssertionError,
        AttributeError,
        LookupError,
        OSError,
        TypeError,
        ValueError,
        MemoryError,
    ) as error:
        raise NoMaps(f"{path.relative_to(folder)} cannot be read: it is cut short or damaged") from error
    if "region" not in read.cell_data:
        raise NoMaps(f'{path.relative_to(folder)} has no cell array "region"')
    if not any(block.type in CORNERS for block in read.cells):
        raise NoMaps(f"{path.relative_to(folder)} holds no triangles or quadrilaterals")
    return _frame(time, read)


def _read(path: Path) -> Any:
    """Read a VTU file through meshio, texts among its field data too."""
    import meshio
    from meshio.vtu._vtu import VtuReader

    class Reader(VtuReader):
        # meshio refuses arrays of texts, which are bytes with a zero after each text.
        def read_data(self, c: Any) -> Any:
            if c.get("type") != "String":
                return super().read_data(c)
            c.set("type", "UInt8")
            return bytes(super().read_data(c)).decode().split("\0")[:-1]

    # The reader itself: meshio.read prints and leaves the process where it meets a damaged file.
    found = Reader(str(path))
    return meshio.Mesh(
        found.points, found.cells, found.point_data, found.cell_data, field_data=found.field_data
    )


def _last_entry(folder: Path) -> tuple[float | None, Path]:
    index = folder / "fields.pvd"
    if not index.exists():
        raise NoMaps("fields.pvd is not in the folder")
    try:
        sets = list(ElementTree.parse(index).getroot().iter("DataSet"))
    except (ElementTree.ParseError, OSError) as error:
        raise NoMaps("fields.pvd cannot be read: it is cut short or damaged") from error
    if not sets:
        raise NoMaps("fields.pvd names no frame")
    try:
        times = [float(s.get("timestep", "nan")) for s in sets]
        last = sets[int(np.argmax(times))] if np.all(np.isfinite(times)) else sets[-1]
        time = float(last.get("timestep", "nan"))
    except ValueError:
        raise NoMaps("fields.pvd holds a timestep that is no number") from None
    path = (folder / last.get("file", "")).resolve()
    if not path.is_relative_to(folder.resolve()):
        raise NoMaps("fields.pvd names a file outside the run folder; it was left alone")
    return (time if np.isfinite(time) else None), folder / path.relative_to(folder.resolve())


def _frame(time: float | None, mesh: Any) -> Frame:
    points = np.asarray(mesh.points, dtype=float)[:, :2]
    triangles, regions, edges, sides = [], [], [], []
    for block, numbers in zip(mesh.cells, mesh.cell_data["region"], strict=True):
        if block.type not in CORNERS:
            continue
        t, number = np.asarray(block.data, dtype=np.int64), np.asarray(numbers).astype(np.int64).ravel()
        n = CORNERS[block.type]
        triangles += [t[:, [0, i, i + 1]] for i in range(1, n - 1)]
        regions += [number] * (n - 2)
        edges += [t[:, [i, (i + 1) % n]] for i in range(n)]
        sides += [number] * n
    t, region = np.vstack(triangles), np.concatenate(regions)
    if t.size == 0 or t.min() < 0 or t.max() >= len(points) or not np.all(np.isfinite(points)):
        raise NoMaps("the last frame's cells do not fit its points: it was changed or damaged")
    values = {name: np.asarray(v, dtype=float) for name, v in mesh.point_data.items()}
    through = np.ravel(np.asarray(mesh.field_data.get("local_freezing_to_degC", np.nan), dtype=float))
    return Frame(
        time,
        points,
        t,
        region,
        _outline(np.vstack(edges), np.concatenate(sides)),
        {name: v for name, v in values.items() if v.shape == (len(points),)},
        tuple(map(str, mesh.field_data.get("region_names", ()))),
        float(through[0]) if through.size and np.isfinite(through[0]) else None,
    )


def _outline(edges: NDArray[np.int64], sides: NDArray[np.int64]) -> NDArray[np.int64]:
    """Return the edges that have one side only, or two of different regions."""
    unique, inverse, count = np.unique(
        np.sort(edges, axis=1), axis=0, return_inverse=True, return_counts=True
    )
    inverse = inverse.ravel()
    low = np.full(len(unique), np.iinfo(np.int64).max)
    high = np.full(len(unique), np.iinfo(np.int64).min)
    np.minimum.at(low, inverse, sides)
    np.maximum.at(high, inverse, sides)
    return np.asarray(unique[(count == 1) | (low != high)])
