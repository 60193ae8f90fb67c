"""Signals: values, columns and logs against a stage's clock."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated, Any

import numpy as np
import pytest
from pydantic import BaseModel, ValidationError

from fem.quantity import COEFFICIENT, TEMPERATURE
from fem.signal import Signal, signal


class Bath(BaseModel):
    coolant: Annotated[Signal, signal(TEMPERATURE)]
    h: Annotated[Signal, signal(COEFFICIENT)] | None = None


COLUMNS = {"time": {"unit": "min", "values": [0, 1, 3]}, "value": {"unit": "degF", "values": [32, 14, 50]}}


def read(raw: Any, folder: Path | None = None) -> Signal:
    context = None if folder is None else {"folder": folder}
    return Bath.model_validate({"coolant": raw}, context=context).coolant


def said(raw: Any, folder: Path | None = None) -> str:
    with pytest.raises(ValidationError) as caught:
        read(raw, folder)
    return " ".join(detail["msg"] for detail in caught.value.errors())


def test_a_value_holds_at_every_clock() -> None:
    steady = read("-22 degC")
    assert steady.constant
    assert [steady.at(clock) for clock in (-1.0, 0.0, 1e9)] == [-22.0] * 3
    assert len(steady.knots) == 0


def test_columns_are_linear_between_and_held_beyond() -> None:
    bath = read(COLUMNS)
    assert not bath.constant
    np.testing.assert_allclose(bath.times, [0.0, 60.0, 180.0])
    np.testing.assert_allclose(bath.values, [0.0, -10.0, 10.0], atol=1e-12)
    assert [bath.at(clock) for clock in (-5.0, 30.0, 60.0, 120.0, 500.0)] == pytest.approx(
        [0, -5, -10, 0, 10]
    )
    np.testing.assert_array_equal(bath.knots, bath.times)
    assert (bath.least, bath.most) == pytest.approx((-10.0, 10.0))


def test_columns_of_one_value_are_constant() -> None:
    flat = read({**COLUMNS, "value": {"unit": "degC", "values": [3, 3, 3]}})
    assert flat.constant
    assert len(flat.knots) == 0
    assert flat.at(77.0) == 3.0


def test_a_log_is_a_column_of_a_file(tmp_path: Path) -> None:
    (tmp_path / "bath.csv").write_text("time [s],a [degC],b [degC]\n0,1,-20\n10,1,-22\n", encoding="utf-8")
    assert read({"log": "bath.csv", "column": "b"}, tmp_path).at(5.0) == pytest.approx(-21.0)
    assert 'no column "c"' in said({"log": "bath.csv", "column": "c"}, tmp_path)
    assert "no value" in said({"log": "bath.csv", "column": "time"}, tmp_path)
    assert "other.csv" in said({"log": "other.csv", "column": "b"}, tmp_path)


@pytest.mark.parametrize(
    ("raw", "words"),
    [
        ("-22", "has no unit"),
        (-22, "bare number"),
        (
            {**COLUMNS, "time": {"unit": "s", "values": [0, 2, 2]}},
            "row 3 (2 s) does not come after row 2 (2 s)",
        ),
        ({**COLUMNS, "time": {"unit": "s", "values": [0, 2]}}, "time has 2 rows and value has 3"),
        ({**COLUMNS, "time": {"unit": "s", "values": []}}, "no values"),
        ({**COLUMNS, "time": {"unit": "s", "values": [0, float("nan"), 3]}}, "row 2"),
        ({**COLUMNS, "time": {"unit": "kg", "values": [0, 1, 3]}}, '"kg" is no unit of time'),
        ({**COLUMNS, "value": {"unit": "degC", "values": [0, -300, 3]}}, "row 2"),
        ({"time": COLUMNS["time"]}, "value is missing"),
        ({"tme": COLUMNS["time"], "value": COLUMNS["value"]}, 'did you mean "time"?'),
        ({"log": "bath.csv"}, "column is missing"),
        ({"log": 3, "column": "b"}, 'log = "file.csv"'),
        ({}, "time is missing"),
        ([1, 2], "with its unit"),
    ],
)
def test_what_cannot_be_a_signal_is_said(raw: Any, words: str) -> None:
    assert words in said(raw)


@pytest.mark.parametrize(
    ("times", "values", "words"),
    [
        ([], [], "no rows"),
        ([0.0], [1.0, 2.0], "rows"),
        ([0.0, 0.0], [1.0, 2.0], "rise"),
        ([0.0], [np.inf], "finite"),
    ],
)
def test_a_signal_made_in_code_is_checked_too(times: list[float], values: list[float], words: str) -> None:
    with pytest.raises(ValueError, match=words):
        Signal(np.array(times), np.array(values))
