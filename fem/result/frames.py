"""The fields of a run folder read back, frame by frame."""

from __future__ import annotations

import math
import warnings
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING
from xml.etree import ElementTree

import numpy as np

from fem.errors import CaseError, Problem, unknown
from fem.result.fields import PVD
from fem.result.hdf import HDF

if TYPE_CHECKING:
    import pyvista


@dataclass(frozen=True)
class FieldSeries:
    """The frames that a run folder holds, in the order of their times.

    Parameters
    ----------
    folder
        Run folder.
    times
        Of the frames, since the run began [s].
    files
        File of each frame; the same one for all where it holds them all.

    """

    folder: Path
    times: tuple[float, ...]
    files: tuple[Path, ...]

    def nearest(self, time: float | None) -> int:
        """Return the number of the frame nearest a time [s]; the last one without a time."""
        if time is None:
            return len(self.times) - 1
        return int(np.argmin(np.abs(np.array(self.times) - time)))

    def read(self, number: int) -> pyvista.UnstructuredGrid:
        """Read a frame.

        Raises
        ------
        CaseError
            Where its file is missing or damaged.

        """
        path = self.files[number]
        if not path.is_file():
            raise _wrong(self.folder, f"{self._said(path)} is not in the folder, though {PVD} names it")
        grid = _read(path, number if path.name == HDF else None)
        if grid is None:
            raise _wrong(self.folder, f"{self._said(path)} cannot be read: it is cut short or damaged")
        return grid

    def _said(self, path: Path) -> str:
        return str(path.relative_to(self.folder))


def open_fields(folder: Path) -> FieldSeries:
    """Find the frames of a run folder, which may still be growing.

    Raises
    ------
    CaseError
        Where there are none, or what names them cannot be read.

    """
    if (folder / PVD).is_file():
        found = _collected(folder)
    elif (folder / HDF).is_file():
        found = [(time, folder / HDF) for time in _steps(folder)]
    elif folder.is_dir():
        raise _wrong(
            folder, f'holds no fields: neither {PVD} nor {HDF} (a run with watch.fields = "none" has none)'
        )
    else:
        raise _wrong(folder, "is no run folder: there is no such folder")
    if not found:
        raise _wrong(folder, "holds no frame yet")
    times, files = zip(*found, strict=True)
    return FieldSeries(folder, times, files)


def names(grid: pyvista.UnstructuredGrid) -> list[str]:
    """Return the names of the arrays that can be shown."""
    return [*grid.point_data.keys(), *grid.cell_data.keys()]


def check_array(grid: pyvista.UnstructuredGrid, array: str, time: float) -> None:
    """Refuse an array that a frame does not hold.

    Raises
    ------
    CaseError
        Says which there are.

    """
    if array not in names(grid):
        said = unknown("array", array, names(grid))
        raise CaseError("show", [Problem("--array", f"the frame at {time:g} s holds {said}")])


def _collected(folder: Path) -> list[tuple[float, Path]]:
    """Return time and file of each frame in ``fields.pvd``."""
    try:
        entries = list(ElementTree.parse(folder / PVD).getroot().iter("DataSet"))
        found = [(float(e.attrib["timestep"]), folder / e.attrib["file"]) for e in entries]
    except (ElementTree.ParseError, KeyError, ValueError) as error:
        raise _wrong(folder, f"{PVD} cannot be read: {error}") from error
    for time, path in found:
        if not math.isfinite(time) or not path.resolve().is_relative_to(folder.resolve()):
            raise _wrong(folder, f"{PVD} names a frame that is not of this folder: {path.name}, {time} s")
    return sorted(found)


def _steps(folder: Path) -> list[float]:
    """Return the times of the frames in ``fields.vtkhdf`` [s]."""
    import pyvista as pv
    from vtkmodules.vtkCommonExecutionModel import vtkStreamingDemandDrivenPipeline as Pipeline

    with pv.vtk_verbosity("off"):
        reader = pv.get_reader(str(folder / HDF)).reader
        reader.UpdateInformation()
    information = reader.GetOutputInformation(0)
    if information.Has(Pipeline.TIME_STEPS()):
        return [float(time) for time in information.Get(Pipeline.TIME_STEPS())]
    # One frame has no series of times; a damaged file has no frame.
    grid = _read(folder / HDF, 0)
    if grid is None or "TimeValue" not in grid.field_data:
        raise _wrong(folder, f"{HDF} cannot be read: it is cut short or damaged")
    return [float(grid.field_data["TimeValue"][0])]


def _read(path: Path, step: int | None) -> pyvista.UnstructuredGrid | None:
    """Read a file, or one step of it; None where it holds no fields or is damaged."""
    import pyvista as pv

    # vtk tells of damage on the terminal and hands out an empty grid, which is asked for instead.
    with warnings.catch_warnings(), pv.vtk_verbosity("off"):
        warnings.simplefilter("ignore")
        try:
            reader = pv.get_reader(str(path))
            if step is not None:
                reader.reader.UpdateInformation()
                reader.reader.SetStep(step)
            grid = reader.read()
        except RuntimeError:  # the same, from a reader that checks
            return None
    whole = isinstance(grid, pv.UnstructuredGrid) and grid.n_cells > 0 and "region" in grid.cell_data
    return grid if whole else None


def _wrong(folder: Path, message: str) -> CaseError:
    return CaseError(str(folder), [Problem("fields", message)])
