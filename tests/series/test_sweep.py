from __future__ import annotations

import csv
import json
import subprocess
import sys
from pathlib import Path

import pytest
from pyarrow import parquet

import fem
from fem.errors import CaseError
from fem.result.folder import open_run
from fem.series.sweep import Progress
from fem.series.sweep_plan import read_plan
from tests.conftest import CASES
from tests.pieces import SMALL

SURFACE = "stages.freeze.surfaces.outside"
PLAN = f"""schema = 1
title = "Small bars"
case = "small.toml"
set = {{ "stepping.accuracy" = "quick" }}
[vary.coolant]
key = "{SURFACE}.coolant"
values = ["-18 degC", "-22 degC", "-26 degC"]
[vary.h]
key = "{SURFACE}.h"
from = "150 W/m2/K"
to = "600 W/m2/K"
count = 3
spacing = "log"
"""


@pytest.fixture
def place(tmp_path: Path) -> Path:
    (tmp_path / "small.toml").write_text(SMALL + 'within = "6 min"\n', encoding="utf-8")
    (tmp_path / "plan.toml").write_text(PLAN, encoding="utf-8")
    return tmp_path


def rimefront(*args: str, cwd: Path) -> subprocess.CompletedProcess[str]:
    return subprocess.run(
        [sys.executable, "-m", "fem.cli", *args], cwd=cwd, capture_output=True, text=True, check=False
    )


# trade.md 7.8, the sweep of the workshop bar: seconds to -12 degC from an independent
# finite-volume calculation (computed for the demo scenario, no published source).
TRADE = {
    f"{SURFACE}.coolant": {
        "-18 degC": 1496, "-20 degC": 1316, "-22 degC": 1178, "-24 degC": 1069, "-26 degC": 980,
        "-30 degC": 842,
    },
    f"{SURFACE}.h": {
        "120 W/m2/K": 1763, "180 W/m2/K": 1393, "250 W/m2/K": 1178, "350 W/m2/K": 1016, "500 W/m2/K": 891,
        "1000 W/m2/K": 738,
    },
    "shape.thickness": {"18 mm": 932, "20 mm": 1055, "22 mm": 1178, "24 mm": 1302, "26 mm": 1425},
    "piece.start_temperature": {"0 degC": 1136, "4 degC": 1178, "10 degC": 1237, "20 degC": 1324},
}  # fmt: skip


QUICK = '"stepping.accuracy" = "quick"'


def test_the_workshop_bar_is_within_5_per_cent_of_the_trade_wherever_it_is_swept(tmp_path: Path) -> None:
    computed = 0
    for number, (key, expected) in enumerate(TRADE.items()):
        plan = tmp_path / f"plan{number}.toml"
        values = json.dumps(list(expected))
        plan.write_text(
            f'schema = 1\ncase = "{CASES}/workshop_bar.toml"\nset = {{ {QUICK}, "watch.rays" = {{}} }}\n'
            f'[vary.varied]\nkey = "{key}"\nvalues = {values}\n[keep]\ncurves = false\n',
            encoding="utf-8",
        )
        swept = fem.sweep(plan, tmp_path / "out", processes=2)
        times = dict(zip(expected, swept.column("time_to_aim [s]"), strict=True))
        assert times == pytest.approx(expected, rel=0.05)
        computed += swept.summary["computed"]
    # The base is in every one of the four, and is run once.
    assert computed == sum(map(len, TRADE.values())) - 3


def test_the_table_is_tidy_and_names_its_units(place: Path) -> None:
    swept = fem.sweep(place / "plan.toml", place / "out", processes=1)
    with (place / "out" / "table.csv").open(newline="") as file:
        rows = list(csv.DictReader(file))
    assert list(rows[0]) == [
        "run", "coolant [degC]", "h [W/m2/K]", "time_to_aim [s]", "met", "passes", "slowest [degC]",
        "mean [degC]", "heat_removed [J]", "ice_mean [-]", "outcome", "reason", "folder",
    ]  # fmt: skip
    assert [(r["coolant [degC]"], r["h [W/m2/K]"]) for r in rows[:4]] == [
        ("-18", "150"), ("-18", "300"), ("-18", "600"), ("-22", "150"),
    ]  # fmt: skip
    columns = parquet.read_table(place / "out" / "table.parquet").to_pydict()
    assert columns == {head: swept.column(head) for head in rows[0]}
    for row in rows:
        result = open_run(place / "out" / row["folder"])
        assert result.summary["outcome"] == "finished"
        time = result.summary["aim"]["time_s"]
        assert row["time_to_aim [s]"] == ("" if time is None else f"{time:.9g}")
        assert row["met"] == ("true" if result.summary["aim"]["met"] else "false")
        assert float(row["heat_removed [J]"]) == pytest.approx(result.summary["heat_removed_J"])
        assert len(result.curves["time [s]"]) > 50
        assert not list(result.folder.glob("fields*"))  # type: ignore[union-attr]
        assert result.summary["uncertainty"] is None
        assert result.summary["numerical_error"] is None
    assert [p.name for p in (place / "out" / "runs").iterdir() if p.name.startswith(".")] == []


def test_what_the_plan_asks_for_is_kept(place: Path) -> None:
    asked = "[keep]\nranges = true\nfields = true\nreports = true\ncurves = false\nnumerical_error = true\n"
    one = PLAN.replace(', "-22 degC", "-26 degC"', "").replace(
        "[vary.h]", "[limits.mean]\nmost = '0 degC'\n[vary.h]"
    )
    (place / "plan.toml").write_text(one.replace("count = 3", "count = 2") + asked, encoding="utf-8")
    swept = fem.sweep(place / "plan.toml", place / "out", processes=1)
    row = swept.rows[1]
    assert row["time_to_aim.low [s]"] < row["time_to_aim [s]"] < row["time_to_aim.high [s]"]
    names = {p.name for p in (place / "out" / row["folder"]).iterdir()}
    assert {"case.toml", "summary.json", "report.html", "fields.pvd"} <= names
    assert not {"curves.csv", "fronts.csv", "log.txt"} & names
    assert open_run(place / "out" / row["folder"]).summary["numerical_error"] is not None


def test_finished_runs_are_never_computed_again(place: Path) -> None:
    out, seen = place / "out", []
    first = fem.sweep(place / "plan.toml", out, processes=1)
    before = (out / "table.csv").read_bytes()
    again = fem.sweep(place / "plan.toml", out, processes=1, progress=seen.append)
    assert (first.summary["computed"], again.summary["computed"]) == (9, 0)
    assert (out / "table.csv").read_bytes() == before
    assert [s.done for s in seen] == list(range(10))
    assert isinstance(seen[-1], Progress)
    # A run that was damaged is done again, and one whose plan grew is added.
    (out / again.rows[4]["folder"] / "summary.json").write_text("{", encoding="utf-8")
    (place / "plan.toml").write_text(PLAN.replace('"-26 degC"', '"-26 degC", "-28 degC"'), encoding="utf-8")
    grown = fem.sweep(place / "plan.toml", out, processes=1)
    assert grown.summary["computed"] == 1 + 3
    assert grown.rows[:9] == again.rows


def test_one_bad_case_does_not_stop_the_others(place: Path) -> None:
    bad = '[vary.thickness]\nkey = "shape.thickness"\nvalues = ["12 mm", "10 mm"]\n'
    (place / "plan.toml").write_text(PLAN.replace("count = 3", "count = 2") + bad, encoding="utf-8")
    done = rimefront("sweep", "plan.toml", "--processes", "1", "--json", cwd=place)
    assert done.returncode == 3
    summary = json.loads(done.stdout)
    assert summary == json.loads((place / "sweeps" / "plan" / "sweep.json").read_text())
    assert [f["run"] for f in summary["failed"]] == [2, 4, 6, 8, 10, 12]
    assert all("outside the piece" in f["reason"] for f in summary["failed"])
    assert "6 failed" in done.stderr
    assert "run 2 failed" in done.stderr
    assert "outside the piece" in (place / "sweeps" / "plan" / "report.html").read_text()


def test_what_only_the_mesh_shows_is_a_failed_run_with_its_reason(place: Path) -> None:
    case = (
        (place / "small.toml")
        .read_text()
        .replace('["0 mm", "0 mm"]\n[watch.r', '["5.6 mm", "11.6 mm"]\n[watch.r')
    )
    (place / "small.toml").write_text(case, encoding="utf-8")
    corners = '[vary.corner]\nkey = "shape.corner"\nvalues = ["3 mm", "5 mm"]\n'
    (place / "plan.toml").write_text(PLAN.split("[vary.coolant]")[0] + corners, encoding="utf-8")
    (bad,) = fem.sweep(place / "plan.toml", place / "out", processes=1).failed
    assert bad["corner [mm]"] == 5.0
    assert bad["reason"].startswith("watch: ")
    assert "outside" in bad["reason"]
    assert bad["folder"] == ""


def test_a_march_that_fails_is_a_row_with_its_reason_and_is_not_done_again(place: Path) -> None:
    hopeless = '[vary.step]\nkey = "stepping.largest_step"\nvalues = ["5 s", "1e-9 s"]\n'
    (place / "plan.toml").write_text(PLAN.split("[vary.coolant]")[0] + hopeless, encoding="utf-8")
    swept = fem.sweep(place / "plan.toml", place / "out", processes=1)
    assert [row["outcome"] for row in swept.rows] == ["finished", "failed"]
    (bad,) = swept.failed
    assert bad["reason"]
    assert bad["time_to_aim [s]"] is None
    assert open_run(place / "out" / bad["folder"]).summary["why"] == bad["reason"]
    assert fem.sweep(place / "plan.toml", place / "out", processes=1).summary["computed"] == 0


def test_a_case_with_files_is_swept_from_wherever_the_plan_lies(place: Path) -> None:
    (place / "tank.csv").write_text("time [s],tank [degC]\n0,-20\n600,-24\n", encoding="utf-8")
    logged = SMALL.replace('"-22 degC"', '{ log = "tank.csv", column = "tank" }')
    (place / "small.toml").write_text(logged, encoding="utf-8")
    body = PLAN.split("[vary.coolant]")[0] + PLAN[PLAN.index("[vary.h]") :]
    (place / "plan.toml").write_text(body, encoding="utf-8")
    swept = fem.sweep(place / "plan.toml", place / "out", processes=1)
    assert [row["outcome"] for row in swept.rows] == ["finished"] * 3
    kept = place / "out" / swept.rows[0]["folder"]
    assert (kept / "inputs" / "tank.csv").exists()
    # Another log is another case.
    (place / "tank.csv").write_text("time [s],tank [degC]\n0,-20\n600,-25\n", encoding="utf-8")
    assert fem.sweep(place / "plan.toml", place / "out", processes=1).summary["computed"] == 3


@pytest.mark.parametrize(
    ("args", "said"),
    [
        (("none.toml",), "none.toml"),
        (("plan.toml", "--into", "."), "is no sweep's folder"),
        (("plan.toml", "--processes", "0"), "processes"),
        (("plan.toml", "--cluster", "nonsense://x"), "tcp://HOST:PORT"),
        (("plan.toml", "--cluster", "tcp://127.0.0.1:9"), "no scheduler answers"),
        ((), "PLAN"),
    ],
)
def test_a_wrong_command_is_one_message_with_exit_2(place: Path, args: tuple[str, ...], said: str) -> None:
    done = rimefront("sweep", *args, cwd=place)
    assert done.returncode == 2
    assert said in done.stderr
    assert "Traceback" not in done.stderr
    assert done.stdout == ""
    assert sorted(p.name for p in place.iterdir()) == ["plan.toml", "small.toml"]


def test_a_sweep_is_quiet_in_a_pipe_and_answers_first(place: Path) -> None:
    done = rimefront("sweep", "plan.toml", cwd=place)
    assert done.returncode == 0
    assert done.stderr == ""
    assert done.stdout.startswith("At ")
    assert "runs pass." in done.stdout.splitlines()[0]


def test_the_shipped_plan_reads_and_its_pass_line_is_where_it_says(cases: Path) -> None:
    plan = read_plan(cases / "sweeps" / "coolant_and_agitation.toml")
    assert plan.runs == 130
    assert plan.limits == {"h": (float("-inf"), 600.0)}
    (point,) = (p for p in plan.points() if p.labels == {"coolant": "-27 degC", "h": "151.878 W/m2/K"})
    result = fem.run(plan.case_of(point), ranges=False, numerical_error=False)
    assert result.summary["aim"]["time_s"] == pytest.approx(1200.0, rel=0.01)


def test_python_finds_every_function_and_loads_none_before() -> None:
    code = (
        "import sys, fem; assert not {'numpy', 'pydantic', 'fem.run'} & set(sys.modules);"
        "assert callable(fem.sweep) and callable(fem.load);"
        "import fem.series.sweep; from fem.run import run;"
        "assert callable(fem.run) and callable(run) and callable(fem.open_run)"
    )
    subprocess.run([sys.executable, "-c", code], check=True, timeout=60)
    with pytest.raises(AttributeError, match="sweeep"):
        fem.sweeep  # noqa: B018


def test_a_wrong_plan_raises_in_python_and_writes_nothing(place: Path) -> None:
    (place / "plan.toml").write_text(PLAN.replace("-18 degC", "-18 mm"), encoding="utf-8")
    with pytest.raises(CaseError, match="no unit of temperature"):
        fem.sweep(place / "plan.toml", place / "out")
    assert not (place / "out").exists()
