"""What stands in a run folder, checked before anything is shown from it."""

from __future__ import annotations

import tomllib
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

import numpy as np

from fem.errors import CaseError, Problem
from fem.result.folder import Array, open_run
from fem.result.summary_check import HUGE, check_summary


@dataclass
class Contents:
    """A run folder as read.

    Parameters
    ----------
    folder
        Where it stands.
    summary
        As in ``summary.json``, of the right types.
    curves, fronts
        Column -> values, NaN where a row has none, shape (rows,).
    case_text
        ``case.toml`` as it stands; empty where it is not there.
    case
        The same as tables; empty where it cannot be read.
    missing
        What the folder lacks -> a sentence that says why.

    """

    folder: Path
    summary: dict[str, Any]
    curves: dict[str, Array] = field(repr=False)
    fronts: dict[str, Array] = field(repr=False)
    case_text: str = field(repr=False)
    case: dict[str, Any] = field(repr=False)
    missing: dict[str, str] = field(default_factory=dict)


def read_contents(folder: Path) -> Contents:
    """Read a run folder, whole or not, and check it.

    Parameters
    ----------
    folder
        Any run folder: finished, killed, from another machine.

    Raises
    ------
    CaseError
        Where it is no run folder, was written by a later version, or was changed by hand so
        that it can no longer be shown; what is merely missing is said in `Contents.missing`.

    """
    result = open_run(folder)
    check_summary(folder, result.summary)
    missing: dict[str, str] = {}
    _check_curves(folder, result.curves, missing)
    _check_times(folder, "fronts.csv", result.fronts)
    text, case = _read_case(folder / "case.toml", missing)
    return Contents(folder, result.summary, result.curves, result.fronts, text, case, missing)


def _check_curves(folder: Path, curves: dict[str, Array], missing: dict[str, str]) -> None:
    if not curves or not len(next(iter(curves.values()))):
        there = (folder / "curves.csv").exists()
        missing["curves"] = "curves.csv " + ("holds no row" if there else "is not in the folder")
        curves.clear()
        return
    for name in ("time [s]", "slowest [degC]", "mean [degC]", "heat_removed [J]"):
        if name not in curves:
            raise _wrong(folder, "curves.csv", f'has no column "{name}"')
    _check_times(folder, "curves.csv", curves)


def _check_times(folder: Path, name: str, table: dict[str, Array]) -> None:
    if not table:
        return
    times = table.get("time [s]")
    if times is None:
        raise _wrong(folder, name, 'has no column "time [s]"')
    if not np.all(np.isfinite(times)) or np.any(np.diff(times) < 0.0):
        raise _wrong(folder, name, "its times do not rise from row to row")
    for column, values in table.items():
        if np.any(np.isinf(values)) or np.any(np.abs(values[np.isfinite(values)]) > HUGE):
            raise _wrong(folder, name, f'the column "{column}" holds numbers without bound')


def _read_case(path: Path, missing: dict[str, str]) -> tuple[str, dict[str, Any]]:
    try:
        text = path.read_text(encoding="utf-8")
    except FileNotFoundError:
        missing["case"] = "case.toml is not in the folder"
        return "", {}
    except (OSError, UnicodeDecodeError):
        missing["case"] = "case.toml cannot be read"
        return "", {}
    try:
        return text, tomllib.loads(text)
    except (tomllib.TOMLDecodeError, RecursionError) as error:
        missing["case"] = f"case.toml is no TOML any more: {error}"
        return text, {}


def _wrong(folder: Path, place: str, message: str) -> CaseError:
    return CaseError(str(folder), [Problem(place, message)])
