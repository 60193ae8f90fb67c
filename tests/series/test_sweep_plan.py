from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from fem.errors import CaseError
from fem.series.store import key_of
from fem.series.sweep_plan import SweepPlan, read_plan
from fem.series.variations import Keep, number_and_unit
from tests.pieces import SMALL, small

COOLANT = 'key = "stages.freeze.surfaces.outside.coolant"\n'
H = 'key = "stages.freeze.surfaces.outside.h"\n'
HEAD = 'schema = 1\ncase = "small.toml"\n'


@pytest.fixture
def place(tmp_path: Path) -> Path:
    (tmp_path / "small.toml").write_text(SMALL, encoding="utf-8")
    return tmp_path


def read(place: Path, body: str, head: str = HEAD) -> SweepPlan:
    (place / "plan.toml").write_text(head + body, encoding="utf-8")
    return read_plan(place / "plan.toml")


def refused(place: Path, body: str, head: str = HEAD) -> str:
    with pytest.raises(CaseError) as caught:
        read(place, body, head)
    assert [p.name for p in sorted(place.iterdir())] == ["plan.toml", "small.toml"]
    return str(caught.value)


def labels(plan: SweepPlan, name: str) -> list[object]:
    return [point.labels[name] for point in plan.points()]


def test_lists_and_ranges_are_crossed_the_first_changing_slowest(place: Path) -> None:
    plan = read(
        place,
        f'[vary.coolant]\n{COOLANT}values = ["-18 degC", "-22 degC"]\n'
        f'[vary.h]\n{H}from = "100 W/m2/K"\nto = "400 W/m2/K"\ncount = 3\n',
    )
    assert plan.runs == 6
    assert labels(plan, "coolant") == ["-18 degC"] * 3 + ["-22 degC"] * 3
    assert labels(plan, "h") == ["100 W/m2/K", "250 W/m2/K", "400 W/m2/K"] * 2
    last = list(plan.points())[-1]
    assert plan.case_of(last).stages[0].surfaces["outside"].h.at(0.0) == 400.0  # type: ignore[attr-defined]


def test_a_range_in_logarithmic_steps(place: Path) -> None:
    plan = read(place, f'[vary.h]\n{H}from = "100 W/m2/K"\nto = "400 W/m2/K"\ncount = 3\nspacing = "log"\n')
    assert labels(plan, "h") == ["100 W/m2/K", "200 W/m2/K", "400 W/m2/K"]


def test_lists_walked_side_by_side(place: Path) -> None:
    plan = read(
        place,
        'together = [["coolant", "h"]]\n'
        f'[vary.coolant]\n{COOLANT}values = ["-18 degC", "-22 degC"]\n'
        f'[vary.h]\n{H}values = ["100 W/m2/K", "200 W/m2/K"]\n'
        '[vary.wall]\nkey = "shape.wall"\nvalues = ["0.8 mm", "1 mm"]\n',
    )
    pairs = list(zip(labels(plan, "coolant"), labels(plan, "h"), strict=True))
    assert pairs == [("-18 degC", "100 W/m2/K")] * 2 + [("-22 degC", "200 W/m2/K")] * 2


RANGES = (
    f'[vary.coolant]\n{COOLANT}from = "-30 degC"\nto = "-20 degC"\n'
    f'[vary.h]\n{H}from = "100 W/m2/K"\nto = "1000 W/m2/K"\nspacing = "log"\n'
)


@pytest.mark.parametrize("method", ["latin hypercube", "sobol"])
def test_samples_fill_every_stripe_once_and_are_the_same_each_time(place: Path, method: str) -> None:
    body = f'{RANGES}[sample]\nmethod = "{method}"\ncount = 16\n'
    plan = read(place, body)
    assert plan.runs == 16
    numbers = {n: np.array([number_and_unit(v)[0] for v in labels(plan, n)]) for n in ("coolant", "h")}  # type: ignore[index]
    shares = (numbers["coolant"] + 30.0) / 10.0, np.log10(numbers["h"] / 100.0)
    for share in shares:
        assert sorted(np.floor(share * 16).astype(int)) == list(range(16))
    assert abs(np.corrcoef(*shares)[0, 1]) < 0.5
    assert labels(read(place, body), "h") == labels(plan, "h")
    assert labels(read(place, body + "seed = 2\n"), "h") != labels(plan, "h")


def test_samples_are_crossed_with_named_options(place: Path) -> None:
    plan = read(
        place,
        f'{RANGES}[vary.recipe.options]\nplain = {{ "materials.mix.sucrose" = "18 %" }}\n'
        'rich = { "materials.mix" = { kind = "recipe", sucrose = "12 %", glucose = "9 %" } }\n'
        '[sample]\nmethod = "sobol"\ncount = 4\n',
    )
    assert plan.runs == 8
    rich = plan.case_of(list(plan.points())[1]).materials["mix"]
    assert (rich.sucrose, rich.glucose) == (12.0, 9.0)


def test_a_whole_table_is_set_before_what_is_changed_in_it(place: Path) -> None:
    plan = read(
        place,
        '[vary.sugar]\nkey = "materials.mix.sucrose"\nvalues = ["10 %", "20 %"]\n'
        "[vary.recipe]\n"
        'options.rich = { "materials.mix" = { kind = "recipe", sucrose = "1 %", glucose = "9 %" } }\n',
    )
    assert [plan.case_of(p).materials["mix"].sucrose for p in plan.points()] == [10.0, 20.0]


LIST = f'[vary.coolant]\n{COOLANT}values = ["-18 degC"]\n'
BAD = {
    "unknown key": (LIST + "[kept]\ncurves = true\n", 'no key "kept"'),
    "unknown word": (LIST + "[keep]\ncurve = true\n", 'did you mean "curves"?'),
    "empty list": (f"[vary.coolant]\n{COOLANT}values = []\n", "is an empty list"),
    "no key": ('[vary.coolant]\nvalues = ["-18 degC"]\n', "the dotted key that varies"),
    "nothing varies": ("[vary]\n", "is empty; open [vary.NAME]"),
    "two forms": (LIST + 'from = "-20 degC"\nto = "-18 degC"\n', "got several"),
    "a value twice": (LIST.replace('"]\n', '", "-18 degC"]\n'), "twice"),
    "a key twice": (LIST + LIST.replace("vary.coolant", "vary.bath"), 'is set twice, by "coolant" and here'),
    "a name twice": (LIST + LIST, "is no TOML here"),
    "a name of a result": (LIST.replace("vary.coolant", "vary.mean"), "heads a column of results"),
    "unknown place": (
        f'[vary.h]\n{H.replace("freeze", "frees")}values = ["1 W/m2/K"]\n',
        'did you mean "freeze"?',
    ),
    "unknown key of the case": (
        f'[vary.h]\n{H.replace("outside.h", "outside.hh")}values = ["1 W/m2/K"]\n',
        'no key "hh"',
    ),
    "wrong unit": (LIST.replace("-18 degC", "-18 mm"), 'no unit of temperature'),
    "units of a range": (f'[vary.h]\n{H}from = "1 W/m2/K"\nto = "2"\ncount = 2\n', "in the unit of from"),
    "count of one": (f'[vary.h]\n{H}from = "1 W/m2/K"\nto = "2 W/m2/K"\ncount = 1\n', "at least 2"),
    "logarithm of degrees": (
        f'[vary.c]\n{COOLANT}from = "2 degC"\nto = "9 degC"\ncount = 2\nspacing = "log"\n',
        "must be linear",
    ),
    "zip of two lengths": (
        f'together = [["coolant", "h"]]\n{LIST}[vary.h]\n{H}values = ["100 W/m2/K", "200 W/m2/K"]\n',
        "of one length: coolant has 1, h has 2",
    ),
    "zip of an unknown": (f'together = [["coolant", "hh"]]\n{LIST}', 'no thing that varies "hh"'),
    "range without sample": (RANGES, "is a range without count"),
    "sample of nothing": (LIST + '[sample]\nmethod = "sobol"\ncount = 4\n', "has nothing to draw"),
    "sobol of ten": (RANGES + '[sample]\nmethod = "sobol"\ncount = 10\n', "8 or 16"),
    "too many runs": (
        RANGES.replace("[vary.h]", "count = 1000\n[vary.h]") + "count = 1000\n",
        "makes 1000000 runs",
    ),
    "unknown limit": (LIST + '[limits.meen]\nmost = "-14 degC"\n', 'did you mean "mean"?'),
    "limit in a wrong unit": (LIST + '[limits.time_to_aim]\nmost = "20 degC"\n', "no unit of time"),
    "set and varied": (
        f'set = {{ "{COOLANT.split(chr(34))[1]}" = "-20 degC" }}\n{LIST}',
        "by [set] and here",
    ),
    "set wrongly": (f'set = {{ "shape.wal" = "1 mm" }}\n{LIST}', 'did you mean "wall"?'),
    "report without fields": (LIST + "[keep]\nreports = true\n", "needs fields = true"),
}  # fmt: skip


@pytest.mark.parametrize("name", BAD)
def test_a_bad_plan_is_refused_before_anything_runs(place: Path, name: str) -> None:
    body, said = BAD[name]
    text = refused(place, body)
    assert said in text
    assert text.startswith(f"{place / 'plan.toml'}: ")


def test_every_mistake_is_said_in_one_go_with_its_line(place: Path) -> None:
    text = refused(
        place,
        f"[vary.coolant]\n{COOLANT}values = []\n[vary.h]\n{H}from = 1\n"
        "[sample]\nmethod = 'dice'\ncount = 2\n",
    )
    found = [line.split()[:2] for line in text.splitlines()[1:]]
    assert found == [["5", "vary.coolant.values"], ["6", "vary.h.to"], ["10", "sample.method"]]


def test_a_base_that_does_not_read_is_said_in_its_own_lines(place: Path) -> None:
    broken = SMALL.replace('lasts = "10 min"', "lasts = 10")
    (place / "small.toml").write_text(broken, encoding="utf-8")
    text = refused(place, LIST)
    assert text.startswith(f"{place / 'small.toml'}: 1 problem")
    assert "stages.freeze.lasts" in text


def test_a_base_that_does_not_mesh_is_refused(place: Path) -> None:
    # Within what the check of the case knows of the bar, and in none of its cells.
    beyond = SMALL.replace('centre = ["0 mm", "0 mm"]', 'centre = ["5.6 mm", "11.6 mm"]')
    (place / "small.toml").write_text(beyond.replace('"3 mm"', '"5 mm"'), encoding="utf-8")
    assert "outside" in refused(place, LIST)


def test_a_base_that_is_not_there(place: Path) -> None:
    assert "none.toml" in refused(place, LIST, HEAD.replace("small", "none"))


def test_the_name_of_a_run_is_that_of_its_case_and_not_of_its_layout() -> None:
    keep = Keep()
    key = key_of(small(), keep)
    spelled = SMALL.replace('"-22 degC"', '"251.15 K"').replace('"10 min"', '"600 s"  # as long')
    assert key_of(small(text=spelled), keep) == key
    assert key_of(small(text=SMALL.replace("A small bar", "Another title")), keep) == key
    assert key_of(small('stepping.accuracy="standard"'), keep) == key
    assert key_of(small('shape.thickness="12.001 mm"'), keep) != key
    assert key_of(small(), Keep(ranges=True)) != key


def test_the_plan_of_the_reference_reads(cases: Path, tmp_path: Path) -> None:
    text = (cases / "sweeps" / "README.md").read_text(encoding="utf-8")
    block = text.split("```toml\n")[1].split("```")[0]
    (tmp_path / "workshop_bar.toml").write_bytes((cases / "workshop_bar.toml").read_bytes())
    (tmp_path / "plan.toml").write_text(block.replace("../", ""), encoding="utf-8")
    plan = read_plan(tmp_path / "plan.toml")
    assert plan.runs == 3 * 2 * 16
    assert [axis.names for axis in plan.axes] == [("coolant", "h"), ("recipe",), ("fill",)]
