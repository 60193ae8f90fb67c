"""Frames of the fields in a run folder, whole at any moment: temperature, ice, enthalpy."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from importlib.util import find_spec
from pathlib import Path
from typing import Any, Protocol
from xml.sax.saxutils import quoteattr

import numpy as np
from numpy.typing import NDArray

from fem.curve import Array
from fem.march.step import Step
from fem.result.disk import naming, replace
from fem.result.hdf import HdfFrames
from fem.result.section import Section
from fem.watch.product import Product
from fem.watch.schedule import Watch
from fem.watch.texture import FreezingTimes

Values = Mapping[str, NDArray[np.float32]]

PVD = "fields.pvd"
FOLDER = "fields"


def check_format(fields: str) -> None:
    """Refuse a format of the fields whose library is missing, before a run has begun.

    Raises
    ------
    ValueError
        Says what to install.

    """
    if fields == "vtkhdf" and find_spec("h5py") is None:
        raise ValueError('fields = "vtkhdf" needs h5py (pip install "rimefront[vtkhdf]"); "vtu" does not')


class Frames(Protocol):
    """Where frames are written to."""

    def write(self, number: int, time: float, points: Values) -> None:
        """Write a frame, or replace the last one; a viewer never meets half of it."""


class Fields:
    """Writes a frame at time 0, at every multiple of an interval, and where a stage ends.

    Parameters
    ----------
    folder
        Run folder, which exists.
    watch
        The format of the fields and the interval [s]; the steps land on its multiples.
    product
        What is frozen; its body holds the mesh.
    reach
        Temperature at which a node has frozen through [degC], see `FreezingTimes`.
    start
        Enthalpies at time 0 [J/m3], shape (nodes,).

    Raises
    ------
    OSError
        Here and on each frame where it cannot be written, with the file's name.

    """

    def __init__(self, folder: Path, watch: Watch, product: Product, reach: float | None, start: Array):
        self._product, self._every = product, watch.frames
        self._times: list[float] = []
        self._freezing = FreezingTimes(product, reach, start)
        self._density = np.ones(product.body.size)
        for part in product.body.parts:
            self._density[part.hosted] = part.material.density
        self._section = Section.of(product.body.domain)
        about = {
            "region_names": np.array(self._section.names),
            "local_freezing_to_degC": np.array([self._freezing.reach]),
        }
        self._frames: Frames = FORMATS[watch.fields](folder, self._section, about)
        self._frame(0.0, start)

    def see(self, step: Step) -> None:
        """Follow a step, and write its end where that is a multiple of the interval."""
        self._freezing.see(step)
        count = step.after.time / self._every
        if abs(count - round(count)) < 1e-9 * max(count, 1.0):
            self._frame(step.after.time, step.after.u)

    def end_stage(self, time: float, u: Array) -> None:
        """Write the end of a stage [s] with its enthalpies [J/m3]."""
        if time > self._times[-1]:
            self._frame(time, u)

    def end(self, time: float, u: Array) -> None:
        """Write the last frame, with what is known only now: when each node froze, and how fast."""
        freezing = self._freezing
        self._frame(time, u, {"frozen_at_s": freezing.frozen_at, "local_freezing_time_s": freezing.local})

    def _frame(self, time: float, u: Array, more: Mapping[str, Array] | None = None) -> None:
        if not self._times or time > self._times[-1]:
            self._times.append(time)
        T = self._product.body.temperature(u)
        solved = {
            "temperature_degC": T,
            "ice": self._product.ice(T),
            "enthalpy_J_per_kg": u / self._density,
            **(more or {}),
        }
        whole = {name: values.astype(np.float32)[self._section.source] for name, values in solved.items()}
        self._frames.write(len(self._times) - 1, time, whole)


class VtuFrames:
    """A file for each frame, and a collection that names those which are complete.

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
        import pyvista as pv

        self._folder = folder
        self._times: list[float] = []
        cell = pv.CellType.QUAD if section.cells.shape[1] == 4 else pv.CellType.TRIANGLE
        self._grid = pv.UnstructuredGrid({cell: section.cells}, section.in_space)
        self._grid.cell_data["region"] = section.region
        for name, values in about.items():
            if values.dtype.kind == "U":
                self._grid.GetFieldData().AddArray(_texts(name, values))
            else:
                self._grid.field_data[name] = values
        self._writer = pv.XMLUnstructuredGridWriter(str(folder / PVD), self._grid).writer
        # Files are written by Python: a full disk is then an error and not a line on a terminal.
        self._writer.SetWriteToOutputString(True)
        # The fastest level is half the time of the usual one for 2 % more bytes.
        self._writer.SetCompressorTypeToZLib()
        self._writer.SetCompressionLevel(1)
        with naming(folder / FOLDER):
            (folder / FOLDER).mkdir()

    def write(self, number: int, time: float, points: Values) -> None:
        """Write a frame, or replace the last one."""
        for name, values in points.items():
            self._grid.point_data[name] = values
        self._grid.field_data["TimeValue"] = np.array([time])
        self._writer.Write()
        replace(self._folder / _name(number), self._writer.GetOutputString())
        self._times[number:] = [time]
        replace(self._folder / PVD, collection(self._times))


def _texts(name: str, values: NDArray[Any]) -> Any:
    """Return texts as vtk keeps them; pyvista's own way takes nothing but ASCII."""
    from vtkmodules.vtkCommonCore import vtkStringArray

    array = vtkStringArray()
    array.SetName(name)
    for text in values:
        array.InsertNextValue(str(text))
    return array


def collection(times: list[float]) -> str:
    """Return the text of ``fields.pvd`` for frames at some times [s]."""
    lines = [
        f'    <DataSet timestep="{time!r}" part="0" file={quoteattr(_name(number))}/>\n'
        for number, time in enumerate(map(float, times))
    ]
    head = '<?xml version="1.0"?>\n<VTKFile type="Collection" version="0.1">\n  <Collection>\n'
    return head + "".join(lines) + "  </Collection>\n</VTKFile>\n"


def _name(number: int) -> str:
    return f"{FOLDER}/{number:04d}.vtu"


FORMATS: dict[str, Callable[[Path, Section, Mapping[str, NDArray[Any]]], Frames]] = {
    "vtu": VtuFrames,
    "vtkhdf": HdfFrames,
}
