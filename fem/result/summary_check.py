"""What ``summary.json`` has to hold before anything is shown from it."""

from __future__ import annotations

import math
from pathlib import Path
from typing import Annotated, Any

from pydantic import BaseModel, BeforeValidator, ConfigDict, Field, ValidationError

from fem.errors import CaseError, Problem
from fem.result.folder import SUMMARY

SCHEMA = 1
OUTCOMES = ("running", "finished", "failed", "interrupted")
# A page is read by people: a summary whose text is longer than this was not written by a run.
LONGEST_TEXT = 4000
# More inputs than this nobody ranks by eye.
MOST_INPUTS = 60

# Beyond any number of a run in SI, and still far from where arithmetic ends.
HUGE = 1e12


def _none_for_nan(value: Any) -> Any:
    return None if isinstance(value, float) and math.isnan(value) else value


Number = Annotated[float, Field(allow_inf_nan=False, ge=-HUGE, le=HUGE)]
Size = Annotated[float, Field(allow_inf_nan=False, ge=0.0, le=HUGE)]
# A derivative that a run could not take stands as NaN.
Maybe = Annotated[Number | None, BeforeValidator(_none_for_nan)]
MaybeSize = Annotated[Size | None, BeforeValidator(_none_for_nan)]
Text = Annotated[str, Field(max_length=LONGEST_TEXT)]
Texts = Annotated[list[Text], BeforeValidator(lambda value: [value] if isinstance(value, str) else value)]


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
    remarks: Texts = []
    ratio: Size | None = None
    band: Annotated[list[Size], Field(min_length=2, max_length=2)] | None = None


class _Input(_Part):
    key: Text
    name: Text
    half_width: Text
    effect_of_less_s: Maybe
    effect_of_more_s: Maybe
    words: Text


class _Range(_Part):
    low: Number
    likely: Number
    high: Number


class _Widths(_Part):
    name: Text
    ended_s_half_width: MaybeSize = None
    slowest_degC_half_width: MaybeSize = None
    mean_degC_half_width: MaybeSize = None
    heat_removed_J_half_width: MaybeSize = None


class _Uncertainty(_Part):
    source: Text
    inputs: Annotated[list[_Input], Field(max_length=MOST_INPUTS)]
    time_s: _Range | None
    stages: list[_Widths] = []
    remarks: list[Text] = []


class _NumericalError(_Part):
    time_s: MaybeSize
    heat_removed_J: MaybeSize = None
    how: Text


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
    uncertainty: _Uncertainty | None = None
    numerical_error: _NumericalError | None = None


def check_summary(folder: Path, summary: dict[str, Any]) -> None:
    """Refuse a summary that cannot be shown.

    Parameters
    ----------
    folder
        Of the run, for the words of the refusal.
    summary
        As read.

    Raises
    ------
    CaseError
        With every key that is of the wrong kind, what was found and what would be right.

    """
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
        found = error.errors(include_url=False)
        problems = [Problem(SUMMARY, text) for text in dict.fromkeys(_said(e) for e in found)]
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
    spread = (summary.get("uncertainty") or {}).get("time_s")
    if spread is not None and not spread["low"] <= spread["high"]:
        raise _wrong(folder, SUMMARY, "uncertainty.time_s.low has to be at most its high")


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
        "greater_than_equal": _least(error),
        "less_than_equal": f"a number below {HUGE:g}",
        "too_short": "two numbers",
        "too_long": f"a list of at most {MOST_INPUTS}" if key.endswith("inputs") else "two numbers",
        "string_too_long": f"a text of at most {LONGEST_TEXT} letters",
    }
    return f"{key} has to be {wanted.get(error['type'], 'something else')}, found {_shown(error['input'])}"


def _least(error: Any) -> str:
    least = error.get("ctx", {}).get("ge", 0.0)
    return "0 or above" if least == 0.0 else f"a number above {least:g}"


def _shown(value: Any) -> str:
    text = repr(value) if not isinstance(value, str) else f'"{value}"'
    return text if len(text) <= 60 else text[:57] + "..."
