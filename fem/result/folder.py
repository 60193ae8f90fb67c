"""The run folder: written as the run goes, readable at any moment and years later."""

from __future__ import annotations

import csv
import json
import logging
import shutil
from collections.abc import Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any, TextIO

import numpy as np
from numpy.typing import NDArray

from fem.errors import CaseError, Problem
from fem.result.disk import naming, replace

Array = NDArray[np.float64]
SUMMARY = "summary.json"


@dataclass
class Result:
    """What a run has found.

    Parameters
    ----------
    summary
        As in ``summary.json``.
    curves, fronts
        Column -> values, NaN where a row has none, shape (rows,).
    folder
        Where it stands; None for a run that wrote nothing.

    """

    summary: dict[str, Any]
    curves: dict[str, Array] = field(repr=False, default_factory=dict)
    fronts: dict[str, Array] = field(repr=False, default_factory=dict)
    folder: Path | None = None


class Table:
    """Rows of numbers under fixed headers, kept and, where there is a file, written as they come."""

    def __init__(self, path: Path | None = None):
        self.rows: list[dict[str, float | None]] = []
        self._path = path
        self._file: TextIO | None = None
        self._writer: Any = None

    def add(self, row: dict[str, float | None]) -> None:
        """Append a row; the first one gives the headers."""
        self.rows.append(row)
        if self._path is None:
            return
        with naming(self._path):
            if self._file is None:
                self._file = self._path.open("w", newline="", encoding="utf-8")
                self._writer = csv.writer(self._file, lineterminator="\n")
                self._writer.writerow(row)
            self._writer.writerow("" if value is None else f"{value:.9g}" for value in row.values())

    def flush(self) -> None:
        """Hand what was written to the system, so that a kill loses nothing."""
        if self._file is not None and self._path is not None:
            with naming(self._path):
                self._file.flush()

    def close(self) -> None:
        """Close the file."""
        if self._file is not None and self._path is not None:
            with naming(self._path):
                self._file.close()
            self._file = None

    def columns(self) -> dict[str, Array]:
        """Return the columns, NaN where a row has no value."""
        names = self.rows[0] if self.rows else {}
        return {
            n: np.array([np.nan if r[n] is None else r[n] for r in self.rows], dtype=float) for n in names
        }


class RunFolder:
    """A folder being written.

    Parameters
    ----------
    path
        A folder that does not exist, or one made by an earlier run where `overwrite` is set.
    case_text
        The case as run.
    attachments
        File name in the folder -> file that the case names.
    overwrite
        Whether an earlier run's folder may be replaced.

    Raises
    ------
    CaseError
        Where the folder exists and may not be replaced.
    OSError
        Where it cannot be made.

    """

    def __init__(
        self,
        path: Path,
        case_text: str,
        attachments: Mapping[str, Path] | None = None,
        overwrite: bool = False,
    ):
        self.path = path
        _make_room(path, overwrite)
        path.mkdir(parents=True)
        for name, source in (attachments or {}).items():
            target = path / name
            target.parent.mkdir(parents=True, exist_ok=True)
            shutil.copyfile(source, target)
        (path / "case.toml").write_text(case_text, encoding="utf-8")
        self.curves, self.fronts = Table(path / "curves.csv"), Table(path / "fronts.csv")
        self._log = logging.FileHandler(path / "log.txt", encoding="utf-8")
        self._log.setFormatter(logging.Formatter("%(asctime)s %(levelname)s %(message)s"))
        logger = logging.getLogger("fem")
        logger.setLevel(logging.DEBUG)
        logger.addHandler(self._log)

    def summarise(self, summary: Mapping[str, Any]) -> None:
        """Replace ``summary.json`` as a whole: a reader never meets half of one."""
        self.curves.flush()
        self.fronts.flush()
        replace(self.path / SUMMARY, json.dumps(summary, indent=2, ensure_ascii=False) + "\n")

    def close(self) -> None:
        """Close every file."""
        self.curves.close()
        self.fronts.close()
        logging.getLogger("fem").removeHandler(self._log)
        self._log.close()


def fresh(name: str, root: Path = Path("runs")) -> Path:
    """Return the first of ``runs/NAME``, ``runs/NAME-2``, ... that does not exist."""
    path, n = root / name, 1
    while path.exists():
        n += 1
        path = root / f"{name}-{n}"
    return path


def open_run(path: str | Path) -> Result:
    """Read a run folder, finished or not.

    Parameters
    ----------
    path
        The folder.

    Returns
    -------
    The result; a run that was killed has the outcome "running" and says in ``why`` that it is
    unfinished.

    Raises
    ------
    CaseError
        Where it is no run folder or cannot be read.

    """
    folder = Path(path)
    try:
        summary = json.loads((folder / SUMMARY).read_text(encoding="utf-8"))
        if not isinstance(summary, dict):
            raise ValueError("not an object")
    except FileNotFoundError:
        raise CaseError(str(path), [Problem("folder", f"is no run folder: it holds no {SUMMARY}")]) from None
    except (OSError, ValueError, RecursionError) as error:
        raise CaseError(str(path), [Problem(SUMMARY, f"cannot be read: {error}")]) from error
    return Result(summary, _read_table(folder / "curves.csv"), _read_table(folder / "fronts.csv"), folder)


def _read_table(path: Path) -> dict[str, Array]:
    """Read the whole rows of a table; a kill may have left half of the last one."""
    if not path.exists():
        return {}
    try:
        with path.open(newline="", encoding="utf-8") as file:
            rows = list(csv.reader(file))
        whole = [[float(v) if v else np.nan for v in row] for row in rows[1:] if len(row) == len(rows[0])]
    except (OSError, ValueError, csv.Error) as error:
        raise CaseError(str(path.parent), [Problem(path.name, f"cannot be read: {error}")]) from error
    if not rows:
        return {}
    values = np.array(whole, dtype=float).reshape(-1, len(rows[0]))
    return dict(zip(rows[0], values.T, strict=True))


def _make_room(path: Path, overwrite: bool) -> None:
    if not path.exists():
        return
    if not overwrite:
        raise CaseError(str(path), [Problem("--into", "exists; choose another folder, or add --overwrite")])
    if not path.is_dir() or (any(path.iterdir()) and not (path / SUMMARY).exists()):
        raise CaseError(
            str(path), [Problem("--overwrite", f"is no run folder (it holds no {SUMMARY}); left alone")]
        )
    shutil.rmtree(path)
