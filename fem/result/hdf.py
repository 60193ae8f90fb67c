"""Frames of the fields in one VTKHDF file: the mesh once, then the values of each frame.

The layout is that of the VTKHDF file format, version 2, for an unstructured grid in time
(docs.vtk.org, "VTKHDF File Format").
"""

from __future__ import annotations

import errno
import os
import shutil
from collections.abc import Mapping
from pathlib import Path
from typing import Any, NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

from fem.result.disk import naming
from fem.result.section import Section

HDF = "fields.vtkhdf"
SPARE = 2**20
"""Room that has to be left on the disk beside a frame [bytes]: its index, and the rest of the run folder."""
QUAD, TRIANGLE = 9, 5  # numbers of the cell types in VTK files


class HdfFrames:
    """One file for all frames of a run whose mesh does not change.

    The file is closed after each frame and can be read in between. A kill in the few
    milliseconds of a frame may spoil it, which cannot happen to a file for each frame.

    Parameters
    ----------
    folder
        Run folder.
    section
        Mesh.
    about
        What stands beside the fields in every frame, name -> values.

    """

    def __init__(self, folder: Path, section: Section, about: Mapping[str, NDArray[Any]]):
        self._path = folder / HDF
        self._nodes = len(section.points)
        self._about = dict(about)
        self._series: frozenset[str] = frozenset()
        self._need_room(section.in_space.nbytes + section.cells.nbytes)
        with naming(self._path), self._open("w") as file:
            root = file.create_group("VTKHDF")
            root.attrs["Version"] = (2, 0)
            # Readers want a word of fixed length here.
            root.attrs["Type"] = np.bytes_("UnstructuredGrid")
            count, corners = section.cells.shape
            root["NumberOfPoints"] = [self._nodes]
            root["NumberOfCells"] = [count]
            root["NumberOfConnectivityIds"] = [count * corners]
            root["Points"] = section.in_space
            root["Connectivity"] = section.cells.ravel().astype(np.int64)
            root["Offsets"] = np.arange(count + 1, dtype=np.int64) * corners
            root["Types"] = np.full(count, QUAD if corners == 4 else TRIANGLE, dtype=np.uint8)
            root["CellData/region"] = section.region
            for name, values in self._about.items():
                _put_about(root, f"FieldData/{name}", values)
            root.create_group("PointData")
            root.create_group("Steps").attrs["NSteps"] = 0

    def write(self, number: int, time: float, points: Mapping[str, NDArray[np.float32]]) -> None:
        """Write a frame, or replace the last one.

        An array that comes with a later frame is what the run found in the end; every frame
        shows it.
        """
        if number == 0:
            self._series = frozenset(points)
        self._need_room(sum(values.nbytes for values in points.values()))
        with naming(self._path), self._open("r+") as file:
            root = file["VTKHDF"]
            steps = root["Steps"]
            for name, values in points.items():
                place = number * self._nodes if name in self._series else 0
                _put(root["PointData"], name, place, values)
                places = [place] if name in self._series else [0] * (number + 1)
                _put(steps, f"PointDataOffsets/{name}", number + 1 - len(places), places)
            _put(steps, "Values", number, [float(time)])
            # Where there is one frame only, readers know no other word for its time.
            _put(root, "FieldData/TimeValue", number, [float(time)])
            _put(steps, "FieldDataOffsets/TimeValue", number, [number])
            _put(steps, "FieldDataSizes/TimeValue", number, [[1, 1]])
            _put(steps, "NumberOfParts", number, [1])
            for name in ("PartOffsets", "PointOffsets", "CellDataOffsets/region"):
                _put(steps, name, number, [0])
            for name in ("CellOffsets", "ConnectivityIdOffsets"):
                _put(steps, name, number, [[0]])
            for name, values in self._about.items():
                _put(steps, f"FieldDataOffsets/{name}", number, [0])
                _put(steps, f"FieldDataSizes/{name}", number, [[1, len(values)]])
            steps.attrs["NSteps"] = number + 1

    def _need_room(self, size: int) -> None:
        """Refuse to write so many bytes onto a full disk.

        The HDF5 library keeps much for when it closes a file, and loses it there without an
        error: what does not fit has to be seen before.
        """
        if shutil.disk_usage(self._path.parent).free < size + SPARE:
            raise OSError(errno.ENOSPC, os.strerror(errno.ENOSPC), str(self._path))

    def _open(self, mode: str) -> Any:
        import h5py

        # A viewer that has the file open must not stop the run.
        return h5py.File(self._path, mode, locking=False)


class LastStep(NamedTuple):
    """The last frame of a file: its time [s], the mesh, the values at the points, and what stands beside."""

    time: float
    points: NDArray[Any]
    cells: NDArray[Any]
    region: NDArray[Any]
    values: dict[str, NDArray[Any]]
    about: dict[str, Any]


def read_last(path: Path) -> LastStep:
    """Read the last frame, without vtk.

    Raises
    ------
    OSError, LookupError, TypeError, ValueError, RuntimeError
        Where the file is damaged or holds no frame.

    """
    import h5py

    # A run that is still going on writes to the file.
    with h5py.File(path, "r", locking=False) as file:
        root = file["VTKHDF"]
        steps = root["Steps"]
        last = int(steps.attrs["NSteps"]) - 1
        if last < 0:
            raise ValueError("no frame")
        points = root["Points"][:]
        corners = int(root["Offsets"][1])
        values = {}
        for name, dataset in root["PointData"].items():
            place = int(steps[f"PointDataOffsets/{name}"][last])
            values[name] = dataset[place : place + len(points)]
        about = {
            name: [t.decode() if isinstance(t, bytes) else t for t in root[f"FieldData/{name}"][:]]
            for name in root["FieldData"]
        }
        cells = root["Connectivity"][:].reshape(-1, corners)
        return LastStep(
            float(steps["Values"][last]), points, cells, root["CellData/region"][:], values, about
        )


def _put_about(group: Any, name: str, values: NDArray[Any]) -> None:
    """Write numbers or texts that stand beside the fields."""
    if values.dtype.kind != "U":
        group[name] = values
        return
    import h5py

    # UTF-8 under the name of ASCII: vtk's reader crashes on texts that say they are UTF-8.
    texts = [str(text).encode() for text in values]
    group.create_dataset(name, data=texts, dtype=h5py.string_dtype("ascii"))


def _put(group: Any, name: str, place: int, values: ArrayLike) -> None:
    """Write rows of a dataset from a place on; it grows as far as they reach."""
    rows = np.asarray(values)
    if name not in group:
        grows = (None, *rows.shape[1:])
        # Rows come a frame at a time and are read so; single numbers are kept by the hundred.
        chunk = (max(len(rows), 100), *rows.shape[1:])
        group.create_dataset(name, (0, *rows.shape[1:]), rows.dtype, maxshape=grows, chunks=chunk)
    dataset = group[name]
    if len(dataset) < place + len(rows):
        dataset.resize(place + len(rows), axis=0)
    dataset[place : place + len(rows)] = rows
