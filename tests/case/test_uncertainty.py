from __future__ import annotations

import pytest

from fem.case.case import Case
from fem.case.read import loads
from fem.case.shift import Spread, kind_of, read_spread, shifted, value_of
from fem.errors import CaseError
from fem.signal import Signal
from tests.pieces import SMALL, small

TABLE = """
[uncertainty]
"stages.freeze.surfaces.outside.h" = "30 %"
"materials.mix.conductivity_factor" = "10 %"
"piece.start_temperature" = "2 K"
"shape.thickness" = "0.5 mm"
"""


def test_half_widths_are_shares_or_amounts_in_si() -> None:
    case = loads(SMALL + TABLE)
    assert case.uncertainty == {
        "stages.freeze.surfaces.outside.h": Spread(0.3, True),
        "materials.mix.conductivity_factor": Spread(0.1, True),
        "piece.start_temperature": Spread(2.0, False),
        "shape.thickness": Spread(0.0005, False),
    }


@pytest.mark.parametrize(
    ("line", "said"),
    [
        ('"stages.frieze.surfaces.outside.h" = "30 %"', 'did you mean "freeze"'),
        ('"stages.freeze.surfaces.outside.hh" = "30 %"', 'did you mean "h"'),
        ('"stages.freeze.surfaces.outside.h" = 0.3', "bare number"),
        ('"stages.freeze.surfaces.outside.h" = "-30 %"', "must be above 0"),
        ('"piece.start_temperature" = "2 degC"', "reads as a temperature, not as a difference"),
        ('"shape.thickness" = "2 kg"', "no unit of length"),
        ('"piece.section" = "10 %"', "no quantity"),
        ('"title" = "10 %"', "title"),
        ('shape.thickness = "1 mm"', "in quotes"),
    ],
)
def test_what_is_wrong_is_said_at_its_line(line: str, said: str) -> None:
    with pytest.raises(CaseError) as error:
        loads(SMALL + "[uncertainty]\n" + line + "\n")
    (problem,) = error.value.problems
    assert said in problem.message
    assert problem.line == SMALL.count("\n") + 2


def move(case: Case, key: str, text: str, by: float) -> Case:
    return shifted(case, key, read_spread(text, kind_of(case, key)), by)


def test_one_leaf_moves_and_nothing_else() -> None:
    case = small()
    moved = move(case, "stages.freeze.surfaces.outside.h", "10 %", 0.5)
    value = value_of(moved, "stages.freeze.surfaces.outside.h")
    assert isinstance(value, Signal)
    assert value.at(0.0) == pytest.approx(262.5)
    assert value_of(case, "stages.freeze.surfaces.outside.h").at(0.0) == 250.0  # type: ignore[union-attr]
    assert moved.shape is case.shape
    assert moved.materials is case.materials


def test_a_quantity_against_time_moves_as_a_whole() -> None:
    text = SMALL.replace(
        'coolant = "-22 degC"',
        'coolant = { time = { unit = "s", values = [0, 60] }, '
        'value = { unit = "degC", values = [-20, -30] } }',
    )
    moved = value_of(
        move(loads(text), "stages.freeze.surfaces.outside.coolant", "1 K", 2.0),
        "stages.freeze.surfaces.outside.coolant",
    )
    assert isinstance(moved, Signal)
    assert list(moved.values) == [-18.0, -28.0]


def test_what_the_case_leaves_out_moves_from_what_the_program_chose() -> None:
    case = small()
    key = "materials.mix.freezing_point"
    assert value_of(case, key) is None
    spread = read_spread("0.2 K", kind_of(case, key))
    assert value_of(shifted(case, key, spread, -1.0, default=-1.27), key) == pytest.approx(-1.47)
    with pytest.raises(ValueError, match="left out"):
        shifted(case, key, spread, -1.0)
