from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from fem.series.sweep_page import write_page
from fem.series.sweep_plan import SweepPlan, read_plan
from fem.series.table import Heads, Row
from fem.series.weights import weights_of
from fem.series.window import pass_at_base, passes_of, turned, window_of
from fem.series.window_answer import answer
from tests.pieces import SMALL

SURFACE = "stages.freeze.surfaces.outside"
COOLANT = f'[vary.coolant]\nkey = "{SURFACE}.coolant"\nfrom = "-30 degC"\nto = "-18 degC"\ncount = 5\n'
H = f'[vary.h]\nkey = "{SURFACE}.h"\nfrom = "100 W/m2/K"\nto = "400 W/m2/K"\ncount = 4\n'
RECIPES = (
    '[vary.recipe.options]\nplain = { "materials.mix.sucrose" = "18 %" }\n'
    'rich = { "materials.mix.sucrose" = "22 %" }\n'
)
Time = Callable[[dict[str, Any]], float | None]


def plan_of(place: Path, body: str, within: str = 'within = "20 min"\n') -> SweepPlan:
    text = SMALL.replace('lasts = "10 min"', 'lasts = "10 h"')
    (place / "small.toml").write_text(text + within, encoding="utf-8")
    (place / "plan.toml").write_text(f'schema = 1\ncase = "small.toml"\n{body}', encoding="utf-8")
    return read_plan(place / "plan.toml")


def rows_of(plan: SweepPlan, time: Time, mean: float = -16.0) -> list[Row]:
    """Rows of runs that took a time which is a formula of their settings; None was not reached."""
    heads, rows = Heads(plan), []
    within = plan.base.aim.within if plan.base.aim else None
    for point in plan.points():
        settings = {k: float(str(v).split()[0]) if plan.unit_of(k) else v for k, v in point.labels.items()}
        t = time(settings)
        summary = {
            "outcome": "finished",
            "aim": {"time_s": t, "met": t is not None and (within is None or t <= within)},
            "slowest": {"temperature_degC": -12.0},
            "stages": [{"mean_degC": mean - settings.get("h", 0.0) / 100.0, "ice": 0.7}],
            "heat_removed_J": 5e3,
            "uncertainty": {"time_s": {"low": 0.8 * (t or 0.0), "high": 1.3 * (t or 0.0)}},
        }
        rows.append(heads.row(point, summary, "", f"runs/{point.number}"))
    return rows


def linear(settings: dict[str, Any]) -> float:
    """1200 s where coolant = -22 + (h - 250) / 50."""
    return 1200.0 + 50.0 * (settings["coolant"] + 22.0) - (settings.get("h", 250.0) - 250.0)


def test_the_pass_line_is_found_between_the_runs_and_at_the_base(tmp_path: Path) -> None:
    plan = plan_of(tmp_path, COOLANT + H)
    window = window_of(plan, rows_of(plan, linear))
    assert window.kind == "contour"
    assert (window.line, window.below) == (1200.0, True)
    assert [(p.at, p.edge, p.side) for p in passes_of(window)] == [
        (100.0, pytest.approx(-25.0), "lower"),
        (200.0, pytest.approx(-23.0), "lower"),
        (300.0, pytest.approx(-21.0), "lower"),
        (400.0, pytest.approx(-19.0), "lower"),
    ]
    at_base = pass_at_base(window)
    assert at_base is not None
    assert (at_base.at, at_base.edge) == (250.0, pytest.approx(-22.0))
    other = pass_at_base(turned(window))
    assert other is not None
    assert (other.at, other.edge, other.side) == (-22.0, pytest.approx(250.0), "higher")


def test_the_answer_names_the_base_and_counts(tmp_path: Path) -> None:
    plan = plan_of(tmp_path, COOLANT + H)
    rows = rows_of(plan, linear)
    passing = sum(row["passes"] for row in rows)
    assert answer(plan, rows, window_of(plan, rows)) == (
        "At h 250 W/m2/K, as in the base, -12 degC is reached within 20 min with coolant -22 degC or lower; "
        f"{passing} of 20 runs pass."
    )


def test_where_no_coolant_will_do_the_answer_says_what_will(tmp_path: Path) -> None:
    plan = plan_of(tmp_path, COOLANT + H)
    rows = rows_of(plan, lambda s: 1500.0 - 2.0 * (s["h"] - 200.0))
    said = answer(plan, rows, window_of(plan, rows))
    assert said.startswith(
        "At coolant -22 degC, as in the base, -12 degC is reached within 20 min with h 350"
    )
    rows = rows_of(plan, lambda s: 2000.0)
    assert "with no h from 100 W/m2/K to 400 W/m2/K; 0 of 20" in answer(plan, rows, window_of(plan, rows))


def test_beyond_what_was_reached_the_line_stays_with_the_last_run_that_passed(tmp_path: Path) -> None:
    plan = plan_of(tmp_path, COOLANT)
    window = window_of(plan, rows_of(plan, lambda s: 900.0 if s["coolant"] < -25.0 else None))
    (found,) = passes_of(window)
    assert (found.edge, found.side) == (-27.0, "lower")


def test_several_recipes_are_curves_with_an_answer_each(tmp_path: Path) -> None:
    plan = plan_of(tmp_path, RECIPES + COOLANT)
    rows = rows_of(plan, lambda s: linear(s) + (50.0 if s["recipe"] == "rich" else 0.0))
    window = window_of(plan, rows)
    assert window.kind == "curves"
    assert window.x is not None
    assert window.x.name == "coolant"
    assert answer(plan, rows, window) == (
        '-12 degC is reached within 20 min for recipe "plain" with coolant -22 degC or lower; for "rich" '
        "with coolant -23 degC or lower; 6 of 10 runs pass."
    )


def test_many_things_are_ranked_by_what_the_time_hangs_on(tmp_path: Path) -> None:
    plan = plan_of(tmp_path, COOLANT + H + RECIPES)
    rows = rows_of(plan, linear)
    window = window_of(plan, rows)
    assert window.kind == "ranking"
    found = weights_of(plan, rows, window.result)
    assert [(w.name, w.low, w.high) for w in found[:2]] == [("coolant", -30.0, -18.0), ("h", 400.0, 100.0)]
    assert [w.swing for w in found] == pytest.approx([600.0, 300.0, 0.0])
    # Of a sum of independent parts the shares are those of their variances, and make one.
    assert sum(w.share for w in found) == pytest.approx(1.0)
    assert found[0].share == pytest.approx(45000.0 / (45000.0 + 12500.0))
    assert "hangs on coolant first" in answer(plan, rows, window)


def test_drawn_samples_are_ranked_in_bins(tmp_path: Path) -> None:
    ranges = (COOLANT + H).replace("count = 5\n", "").replace("count = 4\n", "")
    plan = plan_of(tmp_path, ranges + '[sample]\nmethod = "sobol"\ncount = 64\n')
    rows = rows_of(plan, linear)
    window = window_of(plan, rows)
    assert window.kind == "ranking"
    first, second = weights_of(plan, rows, window.result)
    assert (first.name, second.name) == ("coolant", "h")
    assert first.swing == pytest.approx(600.0 * 5 / 6, rel=0.1)


def test_limits_decide_which_runs_pass(tmp_path: Path) -> None:
    limits = '[limits]\nh.most = "300 W/m2/K"\nmean.most = "-18 degC"\ntime_to_aim.most = "15 min"\n'
    plan = plan_of(tmp_path, COOLANT + H + limits)
    rows = rows_of(plan, linear)
    assert window_of(plan, rows).line == 900.0
    for row in rows:
        h, time, mean = row["h [W/m2/K]"], row["time_to_aim [s]"], row["mean [degC]"]
        assert row["passes"] == (h <= 300.0 and time <= 900.0 and mean <= -18.0)
    assert {row["passes"] for row in rows} == {True, False}


@pytest.mark.parametrize(
    ("body", "within"),
    [
        (COOLANT + H + '[limits.h]\nmost = "300 W/m2/K"\n[limits.mean]\nmost = "-18 degC"\n', "20 min"),
        (COOLANT + H, "1 min"),
        (COOLANT + H, "9 h"),
        (COOLANT + "[keep]\nranges = true\n", "20 min"),
        (RECIPES + COOLANT, "20 min"),
        (RECIPES, "20 min"),
        (COOLANT + H + RECIPES, "20 min"),
    ],
    ids=["limits", "none pass", "all pass", "band", "family", "names", "many"],
)
def test_page_and_picture_are_whole_and_need_nothing_from_outside(
    tmp_path: Path, body: str, within: str
) -> None:
    plan = plan_of(tmp_path, body, f'within = "{within}"\n')

    def time(settings: dict[str, Any]) -> float | None:
        settings = {"coolant": -22.0, **settings}
        return None if settings["coolant"] > -20.0 and settings.get("h", 250.0) < 150.0 else linear(settings)

    rows = rows_of(plan, time)
    passing = sum(bool(row["passes"]) for row in rows)
    summary = {"met": passing, "passes": passing, "failed": [], "program": "0"}
    said = write_page(plan, rows, summary, tmp_path)
    page = (tmp_path / "report.html").read_text(encoding="utf-8")
    assert f"{passing} of {len(rows)} runs pass" in said
    assert f"{passing} of {len(rows)} pass" in page
    assert page.index("<h1>") < page.index("data:image/svg+xml") if "svg+xml" in page else body == RECIPES
    assert "http://" not in page
    assert "<script" not in page
    if body != RECIPES:
        png = (tmp_path / "window.png").read_bytes()
        assert png.startswith(b"\x89PNG")
        width, height = (int.from_bytes(png[n : n + 4]) for n in (16, 20))
        assert width > 1000
        assert height > 300


def test_without_an_aim_the_temperature_at_the_end_is_drawn(tmp_path: Path) -> None:
    (tmp_path / "small.toml").write_text(SMALL.split("[aim]")[0], encoding="utf-8")
    (tmp_path / "plan.toml").write_text(
        f'schema = 1\ncase = "small.toml"\n{COOLANT}[limits.slowest]\nmost = "-14 degC"\n', encoding="utf-8"
    )
    plan = read_plan(tmp_path / "plan.toml")
    heads, rows = Heads(plan), []
    for point in plan.points():
        slowest = 0.75 * float(str(point.labels["coolant"]).split()[0])
        stage = {"mean_degC": slowest - 1.0, "ice": None}
        summary = {"outcome": "finished", "aim": None, "slowest": {"temperature_degC": slowest},
                   "stages": [stage], "heat_removed_J": 1.0}  # fmt: skip
        rows.append(heads.row(point, summary, "", ""))
    window = window_of(plan, rows)
    assert (window.result, window.line) == ("slowest", -14.0)
    assert [p.edge for p in passes_of(window)] == [pytest.approx(-14.0 / 0.75)]
    assert answer(plan, rows, window).startswith(
        "The slowest point ends below -14 degC with coolant -18.7 degC"
    )
    assert np.isfinite(window.grid).all()
    write_page(plan, rows, {"met": 0, "passes": 4, "failed": [], "program": "0"}, tmp_path)
