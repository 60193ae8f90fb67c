"""What stands in a run folder, checked before anything is shown from it."""

from __future__ import annotations

import tomllib
from dataclasses import dataclass, field
from pathlib import Path
from typing import Annotated, Any

import numpy as np
from pydantic import BaseModel, ConfigDict, Field, ValidationError

from fem.errors import CaseError, Problem
from fem.result.folder import SUMMARY, Array, open_run

SCHEMA = 1
OUTCOMES = ("running", "finished", "failed", "interrupted")
# A page is read by people: a summary whose text is longer than this was not written by a run.
LONGEST_TEXT = 4000

# Beyond any number of a run in SI, and still far from where arithmetic ends.
HUGE = 1e12

Number = Annotated[float, Field(allow_inf_nan=False, ge=-HUGE, le=HUGE)]
Text = Annotated[str, Field(max_length=LONGEST_TEXT)]


class _Part(BaseModel):
    # A later version may say more; what it says beside these is shown as it stands.
    model_config = ConfigDict(extra="allow", strict=True, frozen=True)


class _Aim(_Part):
    at: Text
    reach_degC: Number
    met: bool
    time_s: Number | None
    within_s: Annotated[Number, Field(gt=0)] | None


class _Slowest(_Part):
    at_m: Annotated[list[Number], Field(min_length=2, max_length=3)]
    temperature_degC: Number


class _Stage(_Part):
    name: Text
    ended_s: Number
    why: Text
    slowest_degC: Number
    mean_degC: Number
    ice: Number | None


class _Effort(_Part):
    nodes: int
    steps: int
    newton: int
    factorisations: int
    elapsed_s: Number


class _Estimate(_Part):
    method: Text
    time_s: Number | None
    in_range: bool | None = None
    remarks: list[Text] | Text = []


class _Summary(_Part):
    title: Text
    outcome: Text
    why: Text
    aim: _Aim | None
    slowest: _Slowest
    heat_removed_J: Number
    heat_J: dict[str, Number]
    energy_imbalance: Number
    mass_kg: dict[str, Number]
    time_s: Number
    stages: list[_Stage]
    effort: _Effort
    cautions: list[Text]
    versions: dict[str, Text]
    estimates: list[_Estimate] | None = None


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
    _check_summary(folder, result.summary)
    missing: dict[str, str] = {}
    _check_curves(folder, result.curves, missing)
    _check_times(folder, "fronts.csv", result.fronts)
    text, case = _read_case(folder / "case.toml", missing)
    return Contents(folder, result.summary, result.curves, result.fronts, text, case, missing)


def _check_summary(folder: Path, summary: dict[str, Any]) -> None:
    schema = summary.get("schema", SCHEMA)
    if not isinstance(schema, int) or isinstance(schema, bool) or schema < 1:
        raise _wrong(folder, SUMMARY, f"schema has to be {SCHEMA}, found {_shown(schema)}")
    if schema > SCHEMA:
        message = (
            f"was written by a later version (schema {schema}, this one reads {SCHEMA}); "
            "bring rimefront up to date"
        )
        raise _wrong(folder, SUMMARY, message)
    try:
        _Summary.model_validate(summary)
    except ValidationError as error:
        problems = [Problem(SUMMARY, _said(e)) for e in error.errors(include_url=False)]
        raise CaseError(str(folder), problems) from None
    outcome, aim = summary["outcome"], summary["aim"]
    if outcome not in OUTCOMES:
        message = f"outcome has to be one of {', '.join(OUTCOMES)}, found {_shown(outcome)}"
        raise _wrong(folder, SUMMARY, message)
    if aim is not None and aim["met"] and aim["time_s"] is None:
        raise _wrong(folder, SUMMARY, "aim.met is true, yet aim.time_s says that it was never reached")
    if strays := sorted(set(summary["heat_J"]) ^ set(summary["mass_kg"])):
        message = f"heat_J and mass_kg have to name the same regions; only one names {', '.join(strays)}"
        raise _wrong(folder, SUMMARY, message)


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


def _said(error: Any) -> str:
    """Say one of pydantic's findings in words: the key, what was found, what would be right."""
    key = ".".join(str(part) for part in error["loc"])
    if error["type"] == "missing":
        return f"{key} is missing"
    wanted = {
        "float_type": "a number",
        "int_type": "a whole number",
        "bool_type": "true or false",
        "string_type": "a text",
        "list_type": "a list",
        "dict_type": "an object",
        "model_type": "an object",
        "finite_number": "a finite number",
        "greater_than": "above 0",
        "greater_than_equal": f"a number above {-HUGE:g}",
        "less_than_equal": f"a number below {HUGE:g}",
        "too_short": "two numbers",
        "too_long": "two numbers",
        "string_too_long": f"a text of at most {LONGEST_TEXT} letters",
    }
    return f"{key} has to be {wanted.get(error['type'], 'something else')}, found {_shown(error['input'])}"


def _shown(value: Any) -> str:
    text = repr(value) if not isinstance(value, str) else f'"{value}"'
    return text if len(text) <= 60 else text[:57] + "..."
