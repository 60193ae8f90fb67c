from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from pydantic import ValidationError
from pydantic_core import PydanticCustomError

from fem.column import Column, csv_headings, read_csv_columns
from fem.quantity import CONDUCTIVITY, DURATION, TEMPERATURE


@pytest.fixture
def write(tmp_path: Path):
    def write(text: str | bytes) -> Path:
        path = tmp_path / "log.csv"
        path.write_bytes(text if isinstance(text, bytes) else text.encode())
        return path

    return write


def test_a_column_converts_as_a_whole() -> None:
    column = Column(unit="degF", values=(-40.0, 32.0, 212.0))
    np.testing.assert_allclose(column.in_unit(TEMPERATURE), [-40.0, 0.0, 100.0], atol=1e-12)
    np.testing.assert_allclose(Column(unit="min", values=(1, 2.5)).in_unit(DURATION), [60.0, 150.0])


def test_rows_a_millionth_apart_stay_apart() -> None:
    for unit, zero in (("degC", 0.0), ("K", 273.15)):
        T = Column(unit=unit, values=(zero - 1.0, zero - 1.0 + 1e-6)).in_unit(TEMPERATURE)
        assert np.diff(T)[0] == pytest.approx(1e-6, rel=1e-6)


@pytest.mark.parametrize(
    ("values", "said"),
    [
        ([1.0, float("nan")], "row 2: nan is not a finite number"),
        ([float("-inf")], "row 1: -inf is not a finite number"),
        (["3 degC"], "row 1: '3 degC' is no bare number"),
        ([True], "row 1: True is no bare number"),
        ([], "one at least is needed"),
        (4.0, "must be a list of numbers"),
    ],
)
def test_values_that_are_no_numbers_are_refused_with_their_row(values: object, said: str) -> None:
    with pytest.raises(ValidationError) as caught:
        Column.model_validate({"unit": "degC", "values": values})
    (error,) = caught.value.errors()
    assert error["loc"] == ("values",)
    assert said in error["msg"]


def test_units_and_bounds_are_those_of_the_kind() -> None:
    with pytest.raises(PydanticCustomError, match='"mm" is no unit of temperature'):
        Column(unit="mm", values=(1.0,)).in_unit(TEMPERATURE)
    with pytest.raises(PydanticCustomError, match="has no unit"):
        Column(unit="", values=(1.0,)).in_unit(CONDUCTIVITY)
    with pytest.raises(PydanticCustomError, match=r"row 2: must be above 0, got -0\.5 W/m/K"):
        Column(unit="W/m/K", values=(1.0, -0.5)).in_unit(CONDUCTIVITY)


@pytest.mark.parametrize("separator", [",", ";", "\t"])
def test_a_csv_file_is_read_by_its_headings(write, separator: str) -> None:
    rows = [["time [s]", "core probe [degC]", "count"], ["0", "4.5", "1"], ["10", "\N{MINUS SIGN}1e-1", "2"]]
    path = write("\ufeff# logger 3\n\n" + "\r\n".join(separator.join(row) for row in rows) + "\n\n")
    columns = read_csv_columns(path)
    assert list(columns) == csv_headings(path) == ["time", "core probe", "count"]
    assert columns["core probe"] == Column(unit="degC", values=(4.5, -0.1))
    assert columns["count"].unit == ""


def test_columns_that_are_not_wanted_may_hold_anything(write) -> None:
    path = write("clock,time [s],T [degC]\n12:00:01,0,4\n12:00:02,1,\n")
    assert list(read_csv_columns(path, ["time"])) == ["time"]
    with pytest.raises(ValueError, match=r"log\.csv, line 3, T: the cell is empty"):
        read_csv_columns(path, ["time", "T"])


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("", "is empty"),
        ("time [s],T [degC]\n", "has headings but no rows"),
        ("time [s],T [degC]\n0,4,7\n", "line 2: 3 cells, but 2 columns are headed"),
        ("time [s];T [degC]\n0;4,5\n", 'line 2, T: "4,5" is no number; write the decimal sign as a point'),
        ("time [s],T [degC]\n0,4\n\n1,nan\n", 'line 4, T: "nan" is not a finite number'),
        ("time [s],T [degC\n0,4\n", "heading 2"),
        ("T [s],T [degC]\n0,4\n", 'two columns are headed "T"'),
        ("time [s],temp [degC]\n0,4\n", 'no column "T" (there is: time, temp)'),
        ("time [s],T [°C]\n0,4\n".encode("latin-1"), "is not UTF-8 text"),
    ],
)
def test_a_file_that_cannot_be_used_says_where(write, text: str | bytes, said: str) -> None:
    with pytest.raises(ValueError, match=r"log\.csv") as caught:
        read_csv_columns(write(text), ["T"])
    assert said in str(caught.value)


def test_a_file_that_is_not_there_says_so(tmp_path: Path) -> None:
    with pytest.raises(ValueError, match=r"cannot read .*none\.csv: No such file"):
        read_csv_columns(tmp_path / "none.csv")
