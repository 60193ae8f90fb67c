"""The fields of a run folder looked at: pictures, and a window with a time slider.

Rendering where no graphics library is installed ends the process, without an error that could
be caught. All of it happens in a child process (`fem.result.render`) whose exit code is read.
"""

from __future__ import annotations

import errno
import json
import os
import subprocess
import sys
from pathlib import Path
from typing import Any, NoReturn

from fem.errors import CaseError, Problem

TEMPERATURE = "temperature_degC"

REFUSED = 3
"""Exit code of a child whose last line on standard output says in JSON what is wrong."""
DRAWING = "drawing"
"""Line of a child before the first thing that needs a graphics library."""


class CannotDraw(Exception):
    """Nothing could be drawn; the text says what is missing and that the files are complete."""


def picture(folder: Path, out: Path, array: str = TEMPERATURE, time: float | None = None) -> Path:
    """Draw a frame of a run folder into a PNG file.

    Parameters
    ----------
    folder
        Run folder, of a run that may still be going on.
    out
        File to write.
    array
        Name of the field.
    time
        Since the run began [s]; the nearest frame is drawn, the last one by default.

    Returns
    -------
    `out`.

    Raises
    ------
    CaseError
        Where the folder holds no such frame or field.
    CannotDraw
        Where there is no graphics library to draw with.
    OSError
        Where the file cannot be written.

    """
    if not out.parent.is_dir():
        raise FileNotFoundError(errno.ENOENT, os.strerror(errno.ENOENT), str(out))
    _child(folder, array, time, str(out))
    return out


def window(folder: Path, array: str = TEMPERATURE, time: float | None = None) -> None:
    """Show the frames of a run folder in a window, until it is closed; arguments as for `picture`.

    Raises
    ------
    CaseError
        Where the folder holds no such frame or field.
    CannotDraw
        Where there is no screen, or no graphics library.

    """
    screens = ("DISPLAY", "WAYLAND_DISPLAY")
    if sys.platform.startswith("linux") and not any(os.environ.get(name) for name in screens):
        why = "There is no screen to open a window on: --picture OUT.png draws without one."
        raise CannotDraw(f"{why} {_complete(folder)}")
    _child(folder, array, time, "")


def _child(folder: Path, array: str, time: float | None, out: str) -> None:
    """Draw in a child process, and raise what it says went wrong."""
    command = [sys.executable, "-P", "-m", "fem.result.render"]
    asked = json.dumps({"folder": str(folder), "array": array, "time": time, "out": out})
    done = subprocess.run([*command, asked], capture_output=True, text=True, check=False)
    if done.returncode == 0:
        return
    lines = done.stdout.splitlines()
    if done.returncode == REFUSED:
        _refuse(json.loads(lines[-1]))
    if DRAWING not in lines and done.returncode < 0:
        # A damaged file, too, may end the process that reads it.
        raise CaseError(str(folder), [Problem("fields", "cannot be read: they are cut short or damaged")])
    raise CannotDraw(f"{_why(done)} {_complete(folder)}")


def _refuse(said: dict[str, Any]) -> NoReturn:
    if "problems" in said:
        raise CaseError(said["source"], [Problem(**problem) for problem in said["problems"]])
    raise OSError(said["errno"], os.strerror(said["errno"]), said["filename"])


def _why(done: subprocess.CompletedProcess[str]) -> str:
    """Say why a child drew nothing: a signal means that vtk met no graphics library."""
    lines = done.stderr.strip().splitlines()
    if done.returncode < 0 or not lines:
        return (
            "Nothing could be drawn: no OpenGL library was found (on Debian and Ubuntu: "
            "apt-get install libegl1 libgl1, or libosmesa6 for a computer without a screen)."
        )
    return f"Nothing could be drawn: {lines[-1].rstrip('.')}."


def _complete(folder: Path) -> str:
    return f"The files in {folder} are complete, and any VTK viewer opens them."
