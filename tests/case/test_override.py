"""Overrides change one key of a case and nothing else."""

from __future__ import annotations

import tomllib
from pathlib import Path

import pytest

from fem.case.override import apply, parse
from fem.case.read import loads
from fem.errors import CaseError
from fem.heat.exchange import Fluid

BAR = (Path(__file__).parents[2] / "cases" / "workshop_bar.toml").read_text(encoding="utf-8")
H = "stages.freeze.surfaces.outside.h"


def problems(text: str, overrides: tuple[str, ...]) -> list[tuple[str, str, int | None]]:
    with pytest.raises(CaseError) as caught:
        loads(text, overrides=overrides)
    return [(p.place, p.message, p.line) for p in caught.value.problems]


def line_of(text: str, words: str) -> int:
    (line,) = (number for number, line in enumerate(text.splitlines(), start=1) if words in line)
    return line


def test_a_stage_is_found_by_its_name() -> None:
    outside = loads(BAR, overrides=[f"{H}=400 W/m2/K"]).stages[0].surfaces["outside"]
    assert isinstance(outside, Fluid)
    assert outside.h.at(0.0) == 400.0


def test_only_the_one_line_changes() -> None:
    before, after = BAR.splitlines(), apply(BAR, [f"{H}=400 W/m2/K"]).splitlines()
    changed = [(old, new) for old, new in zip(before, after, strict=True) if old != new]
    assert changed == [(line, line.replace("250", "400")) for line in before if line.startswith("h  ")]


@pytest.mark.parametrize(
    ("override", "path", "value"),
    [
        ("aim.at=slowest", ("aim", "at"), "slowest"),
        ('aim.at="slowest"', ("aim", "at"), "slowest"),
        ("watch.front = -3 degC", ("watch", "front"), "-3 degC"),
        ('watch.points.centre=["1 mm", "0 mm"]', ("watch", "points", "centre"), ["1 mm", "0 mm"]),
        ("aim.within=20", ("aim", "within"), 20),
        (
            'stages."freeze on".until=slowest <= -12 degC',
            ("stages", "freeze on", "until"),
            "slowest <= -12 degC",
        ),
        ('"a=b".c=3', ("a=b", "c"), 3),
        ("title=a\nb = 3", ("title",), "a\nb = 3"),
        ('title="a"\nb = 3', ("title",), '"a"\nb = 3'),
    ],
)
def test_a_value_is_toml_or_text(override: str, path: tuple[str, ...], value: object) -> None:
    read = parse(override)
    assert (read.path, read.value) == (path, value)


def test_what_the_case_leaves_out_may_be_added() -> None:
    text = BAR.split("[watch]")[0]
    wanted = [
        "aim.reach=-5 degC",
        "stepping.accuracy=tight",
        'watch.points.tip=["1 mm", "2 mm"]',
        "piece.start.wall=-9 degC",
    ]
    case = loads(text, overrides=[*wanted, "stages.freeze.until=tip <= -5 degC"])
    assert case.aim is not None
    assert case.aim.reach == -5.0
    assert case.stepping.accuracy == "tight"
    assert case.watch.points == {"tip": (0.001, 0.002)}
    assert case.piece.start_of("wall") == -9.0
    assert tomllib.loads(case.text)["stages"][0]["until"] == "tip <= -5 degC"


def test_a_key_added_to_a_stage_stays_in_that_stage() -> None:
    text = BAR.replace('until = "slowest <= -12 degC"\n', "")
    assert text != BAR
    text += '[[stages]]\nname = "hold"\nlasts = "1 min"\n'
    case = loads(text, overrides=["stages.freeze.until=slowest <= -12 degC"])
    assert [stage.until is not None for stage in case.stages] == [True, False]


@pytest.mark.parametrize(
    ("override", "place", "words"),
    [
        ("foo", "--set foo", "key=value"),
        ("=3", "--set", "key=value"),
        ("aim.reach=", "--set aim.reach", "has no value"),
        ("a b=3", "--set a b", "is no key"),
        ("a..b=3", "--set a..b", "is no key"),
        ("stages.freze.lasts=3 s", "--set stages.freze.lasts", 'did you mean "freeze"?'),
        ("stages.freeze.surfaces.outsid.h=3", "--set stages.freeze.surfaces.outsid.h", 'mean "outside"?'),
        ("steping.accuracy=tight", "--set steping.accuracy", 'no key "steping"'),
        ("title.x=3", "--set title.x", "title is a value"),
        ("title.x.y=3", "--set title.x.y", "title is a value"),
        ("stages.hold=3", "--set stages.hold", 'no entry "hold"'),
    ],
)
def test_a_path_that_is_not_there_is_said(override: str, place: str, words: str) -> None:
    ((at, message, line),) = problems(BAR, (override,))
    assert at == place
    assert words in message
    assert line is None


def test_all_wrong_overrides_are_said_at_once() -> None:
    assert len(problems(BAR, ("foo", "stages.freze.lasts=3 s", "aim.reach=-1 degC"))) == 2


def test_an_override_is_judged_like_the_file_and_says_where_it_came_from() -> None:
    wrong_file = BAR.replace('"4 degC"', '"4"')
    found = problems(wrong_file, (f"{H}=400", "aim.reech=3", "stages.freeze.surfaces.outside.coolant=20 mm"))
    assert {place: line for place, _, line in found} == {
        "piece.start_temperature": line_of(wrong_file, "start_temperature"),
        "aim.reech": None,
        "stages.freeze.surfaces.outside.h": None,
        "stages.freeze.surfaces.outside.coolant": None,
    }
    assert all(message.endswith("(--set)") == (line is None) for _, message, line in found)


def test_lines_are_those_of_the_file_whatever_is_added() -> None:
    wrong_file = BAR + '[stepping]\naccuracy = "sloppy"\n'
    ((place, _, line),) = problems(wrong_file, ("piece.start.wall=3 degC",))
    assert (place, line) == ("stepping.accuracy", line_of(wrong_file, "sloppy"))


def test_a_broken_file_is_said_before_its_overrides() -> None:
    with pytest.raises(CaseError, match="is no TOML"):
        loads("[", overrides=["aim.reach=3"])
