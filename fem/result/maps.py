"""The last field frame of a run folder: VTU through meshio, VTKHDF through h5py."""

from __future__ import annotations

import struct
import zlib
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from importlib.util import find_spec
from pathlib import Path
from typing import Any
from xml.etree import ElementTree

import numpy as np
from numpy.typing import NDArray

from fem.result.folder import Array
from fem.result.hdf import HDF, read_last

# Spelt here once more: the module that writes it brings the whole solver along.
PVD = "fields.pvd"
CORNERS = ("triangle", "quad")


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


# What a truncated or a garbled file does to its reader: none of it is worth more than a sentence.
DAMAGE = (
    ElementTree.ParseError,
    zlib.error,
    struct.error,
    ArithmeticError,
    AssertionError,
    AttributeError,
    LookupError,
    OSError,
    RuntimeError,
    TypeError,
    ValueError,
    MemoryError,
)


def last_frame(folder: Path) -> Frame:
    """Read the last frame of a run folder.

    Raises
    ------
    NoMaps
        Where there is none, or it cannot be read.

    """
    if not (folder / PVD).exists() and (folder / HDF).exists():
        return _last_of_hdf(folder / HDF)
    time, path = _last_entry(folder)
    name = str(path.relative_to(folder))
    if not path.is_file():
        raise NoMaps(f"{PVD} names {name}, which is not in the folder")
    import meshio

    try:
        read = _read(path)
    except (meshio.ReadError, *DAMAGE) as error:
        raise _damaged(name) from error
    if "region" not in read.cell_data:
        raise NoMaps(f'{name} has no cell array "region"')
    cells = [
        (np.asarray(block.data), np.asarray(numbers))
        for block, numbers in zip(read.cells, read.cell_data["region"], strict=True)
        if block.type in CORNERS
    ]
    return _frame(name, time, read.points, cells, read.point_data, read.field_data)


def _last_of_hdf(path: Path) -> Frame:
    """Read the last frame of the one file that holds them all."""
    if find_spec("h5py") is None:
        raise NoMaps(f'{path.name} needs h5py to be read (pip install "rimefront[vtkhdf]")')
    try:
        time, points, cells, region, values, about = read_last(path)
    # On a damaged file h5py raises whatever its library comes upon, and all of that is one of these.
    except DAMAGE as error:
        raise _damaged(path.name) from error
    return _frame(path.name, time, points, [(cells, region)], values, about)


def _damaged(name: str) -> NoMaps:
    return NoMaps(f"{name} cannot be read: it is cut short or damaged")


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
    index = folder / PVD
    if not index.exists():
        raise NoMaps(f'neither {PVD} nor {HDF} is in the folder (a run with watch.fields = "none" has none)')
    try:
        sets = list(ElementTree.parse(index).getroot().iter("DataSet"))
    except (ElementTree.ParseError, OSError) as error:
        raise NoMaps(f"{PVD} cannot be read: it is cut short or damaged") from error
    if not sets:
        raise NoMaps(f"{PVD} names no frame")
    try:
        times = [float(s.get("timestep", "nan")) for s in sets]
        last = sets[int(np.argmax(times))] if np.all(np.isfinite(times)) else sets[-1]
        time = float(last.get("timestep", "nan"))
    except ValueError:
        raise NoMaps(f"{PVD} holds a timestep that is no number") from None
    path = (folder / last.get("file", "")).resolve()
    if not path.is_relative_to(folder.resolve()):
        raise NoMaps(f"{PVD} names a file outside the run folder; it was left alone")
    return (time if np.isfinite(time) else None), folder / path.relative_to(folder.resolve())


def _frame(
    name: str,
    time: float | None,
    points: Any,
    cells: Sequence[tuple[NDArray[Any], NDArray[Any]]],
    arrays: Mapping[str, Any],
    about: Mapping[str, Any],
) -> Frame:
    """Make a frame of what a file holds: points, blocks of cells with their regions, values at the points."""
    if not cells:
        raise NoMaps(f"{name} holds no triangles or quadrilaterals")
    points = np.asarray(points, dtype=float)[:, :2]
    triangles, regions, edges, sides = [], [], [], []
    for corners, numbers in cells:
        t, number = np.asarray(corners, dtype=np.int64), np.asarray(numbers).astype(np.int64).ravel()
        n = t.shape[1]
        triangles += [t[:, [0, i, i + 1]] for i in range(1, n - 1)]
        regions += [number] * (n - 2)
        edges += [t[:, [i, (i + 1) % n]] for i in range(n)]
        sides += [number] * n
    t, region = np.vstack(triangles), np.concatenate(regions)
    fits = len(t) == len(region) and t.size > 0 and t.min() >= 0 and t.max() < len(points)
    if not fits or not np.all(np.isfinite(points)):
        raise NoMaps("the last frame's cells do not fit its points: it was changed or damaged")
    values = {key: np.asarray(v, dtype=float) for key, v in arrays.items()}
    through = np.ravel(np.asarray(about.get("local_freezing_to_degC", np.nan), dtype=float))
    return Frame(
        time,
        points,
        t,
        region,
        _outline(np.vstack(edges), np.concatenate(sides)),
        {key: v for key, v in values.items() if v.shape == (len(points),)},
        tuple(map(str, about.get("region_names", ()))),
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
