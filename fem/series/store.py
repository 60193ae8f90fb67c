"""Runs of a sweep on disk: a folder each, named by what was run and by what ran it."""

from __future__ import annotations

import dataclasses
import hashlib
import json
import os
import shutil
from functools import cache
from importlib.metadata import version
from pathlib import Path
from typing import Any

import numpy as np
from pydantic import BaseModel

from fem.case.case import Case
from fem.result.folder import SUMMARY
from fem.series.variations import Keep

RUNS = "runs"
PART = ".part-"
DONE = ("finished", "failed")
# Names and places, which change no number.
_LEFT_OUT = ("title", "text", "source", "folder", "path")


@cache
def program() -> str:
    """Return the program's version, with a print of the source that computes: a checkout changes too."""
    here = Path(__file__).parent.parent
    print_ = hashlib.sha256()
    for path in sorted(here.rglob("*.py")):
        inside = path.relative_to(here).as_posix()
        if not inside.startswith(("series/", "cli.py", "terminal.py", "__init__.py")):
            print_.update(inside.encode() + b"\0" + path.read_bytes())
    return f"{version('rimefront')}+{print_.hexdigest()[:12]}"


def key_of(case: Case, keep: Keep) -> str:
    """Return the name of a run: the same for the same case, however its file is laid out.

    Parameters
    ----------
    case
        As read: numbers in SI, what was left out filled in, files by what they hold.
    keep
        What the folder will hold.

    """
    content = {"case": _plain(case), "keep": keep.model_dump(), "program": program()}
    text = json.dumps(content, sort_keys=True, ensure_ascii=False, separators=(",", ":"))
    return hashlib.sha256(text.encode()).hexdigest()[:20]


def _plain(value: Any) -> Any:
    """Return a value as JSON has it; numbers to twelve figures, so that 22 mm is 0.022 m."""
    if isinstance(value, (str, bool)) or value is None:
        return value
    if isinstance(value, (int, float, np.number)):
        return f"{float(value):.12g}"
    if isinstance(value, np.ndarray):
        text = " ".join(f"{x:.12g}" for x in value.ravel().tolist())
        return [str(value.shape), hashlib.sha256(text.encode()).hexdigest()]
    if isinstance(value, BaseModel):
        fields = {name: getattr(value, name) for name in type(value).model_fields}
        return [type(value).__name__, _fields(fields)]
    if dataclasses.is_dataclass(value):
        return _fields({f.name: getattr(value, f.name) for f in dataclasses.fields(value)})
    if hasattr(value, "_asdict"):
        return _fields(value._asdict())
    if isinstance(value, dict):
        # The order of entries decides the order of columns: it stays.
        return [[str(k), _plain(v)] for k, v in value.items()]
    if isinstance(value, (list, tuple)):
        return [_plain(v) for v in value]
    return str(value)


def _fields(fields: dict[str, Any]) -> dict[str, Any]:
    return {name: _plain(value) for name, value in fields.items() if name not in _LEFT_OUT}


class Store:
    """The folder of a sweep.

    Parameters
    ----------
    root
        Made where there is none.

    """

    def __init__(self, root: Path):
        self.root = root
        self.runs = root / RUNS
        self.runs.mkdir(parents=True, exist_ok=True)

    def clear_parts(self) -> None:
        """Remove what runs that were killed had begun to write."""
        for part in self.runs.glob(f"{PART}*"):
            shutil.rmtree(part, ignore_errors=True)

    def place(self, key: str) -> str:
        """Return where a run stands, from the folder of the sweep."""
        return f"{RUNS}/{key}"

    def find(self, key: str) -> dict[str, Any] | None:
        """Return the summary of a run that has come to its end; None where it has to be run."""
        return _ended(self.runs / key)

    def unpack(self, key: str, files: dict[str, bytes]) -> None:
        """Write a run that came over a network."""
        part = self.runs / f"{PART}{key}-{os.getpid()}"
        shutil.rmtree(part, ignore_errors=True)
        for name, content in files.items():
            path = part / name
            path.parent.mkdir(parents=True, exist_ok=True)
            path.write_bytes(content)
        settle(part, self.runs / key)


def settle(part: Path, folder: Path) -> None:
    """Give a whole run its name: a reader, or a kill, meets all of it or nothing."""
    if _ended(folder) is not None:
        # A sweep at the same time was faster.
        shutil.rmtree(part)
        return
    if folder.exists():
        shutil.rmtree(folder)
    os.replace(part, folder)  # noqa: PTH105 - the atomic one


def _ended(folder: Path) -> dict[str, Any] | None:
    """Return the summary of a run that has come to its end; its tables are not looked at."""
    try:
        summary = json.loads((folder / SUMMARY).read_text(encoding="utf-8"))
    except (OSError, ValueError):
        return None
    return summary if isinstance(summary, dict) and summary.get("outcome") in DONE else None
