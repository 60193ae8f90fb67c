from __future__ import annotations

from functools import cache
from pathlib import Path

import numpy as np
import pytest

from fem.case.case import Case
from fem.case.read import load
from fem.curve import Array
from fem.errors import CaseError
from fem.run import run
from fem.series.fit import fit
from fem.series.passages import Level, passages
from fem.series.probe import ProbeLog
from fem.series.unknowns import unknowns
from tests.pieces import small

OUTSIDE = "stages.freeze.surfaces.outside"
QUIET = ("watch.every=1 s", "watch.frames=10 min", 'watch.fields="none"')
TRUE_H = 232.0
NOISE = 0.2


@cache
def truth(*overrides: str) -> tuple[Array, dict[str, Array]]:
    """Return times [s] and watched points [degC] of a case that a log is made of."""
    curves = run(small(*QUIET, *overrides), ranges=False, numerical_error=False).curves
    points = {n.split(".")[1].split()[0]: v for n, v in curves.items() if n.startswith("point.")}
    return curves["time [s]"], points


def noisy(
    seed: int,
    *overrides: str,
    every: int = 2,
    air: float = 0.0,
    noise: float = NOISE,
    point: str = "centre",
    name: str = "probe.csv",
) -> ProbeLog:
    """Return a log of the small bar that starts so many seconds before the pour, in air."""
    times, points = truth(*(overrides or (f"{OUTSIDE}.h={TRUE_H} W/m2/K",)))
    rng = np.random.default_rng(seed)
    before = np.arange(0.0, air, every)
    T = np.concatenate([np.full(len(before), 19.0), points[point][::every]])
    T = T + rng.normal(0.0, noise, len(T))
    return ProbeLog(name, Path(name), np.concatenate([before, times[::every] + air]), T, 0.0)


def test_h_is_recovered_from_a_log_whose_pour_is_not_marked() -> None:
    found = fit(small(), noisy(3, air=60.0))
    (h,) = found.numbers
    assert h.value == pytest.approx(TRUE_H, rel=0.02)
    assert h.low < TRUE_H < h.high
    assert h.high - h.low < 0.03 * TRUE_H
    (pour,) = found.pours
    assert pour.since == pytest.approx(60.0, abs=3.0)
    assert found.scatter == pytest.approx(1.0, abs=0.4)


def test_h_is_recovered_from_half_and_from_twice_of_it() -> None:
    for start in (110.0, 480.0):
        found = fit(small(f"{OUTSIDE}.h={start} W/m2/K"), noisy(4), pour="0 s", moved_probes=False)
        assert found.numbers[0].value == pytest.approx(TRUE_H, rel=0.01)
        assert found.marches <= 6


def test_the_interval_holds_the_truth_in_at_least_90_of_100_logs() -> None:
    case, held, values, widths = small(), 0, [], []
    for seed in range(100):
        (h,) = fit(case, noisy(seed, every=5, air=35.0), moved_probes=False).numbers
        held += h.low <= TRUE_H <= h.high
        values.append(h.value)
        widths.append(h.high - h.low)
    assert held >= 90
    # Nor is it bought by width: the intervals are those of the scatter that the logs really have.
    assert np.mean(widths) < 1.4 * 2.0 * 1.96 * np.std(values)


def test_a_pour_that_is_known_makes_the_interval_narrower() -> None:
    case, held, widths = small(), 0, []
    for seed in range(12):
        (known,) = fit(case, noisy(seed, every=5), pour="0 s", moved_probes=False).numbers
        (unknown,) = fit(case, noisy(seed, every=5), moved_probes=False).numbers
        held += known.low <= TRUE_H <= known.high
        widths.append((known.high - known.low, unknown.high - unknown.low))
    assert held >= 11
    with_pour, without = np.mean(widths, axis=0)
    assert with_pour < 0.8 * without


def test_h_and_conductivity_from_one_probe_are_refused_with_the_reason() -> None:
    for pour in (None, "0 s"):
        with pytest.raises(CaseError, match=r"cannot tell .*apart") as caught:
            fit(small(), noisy(1), fitted=("h", "conductivity_factor"), pour=pour)
        said = str(caught.value)
        assert "h of stage freeze" in said
        assert "conductivity factor" in said
        assert "condition number" in said
        assert "add a log from another place" in said


def test_a_log_that_starts_late_needs_its_pour() -> None:
    log = noisy(2)
    late = ProbeLog("late", Path("late.csv"), log.times[80:] - log.times[80], log.temperatures[80:], 0.0)
    with pytest.raises(CaseError, match=r"time of the pour.*--pour"):
        fit(small(), late)
    found = fit(small(), late, pour="-160 s", moved_probes=False)
    assert found.numbers[0].value == pytest.approx(TRUE_H, rel=0.02)


def test_freezing_point_and_h_are_told_apart() -> None:
    case_of_log = (f"{OUTSIDE}.h={TRUE_H} W/m2/K", "materials.mix.freezing_point=-1.6 degC")
    found = fit(
        small(), noisy(5, *case_of_log), fitted=("h", "freezing_point"), pour="0 s", moved_probes=False
    )
    h, freezing_point = found.numbers
    assert h.value == pytest.approx(TRUE_H, rel=0.02)
    assert freezing_point.value == pytest.approx(-1.6, abs=0.1)
    assert freezing_point.low < -1.6 < freezing_point.high


def test_conductivity_is_recovered_where_h_is_known() -> None:
    log = noisy(6, "materials.mix.conductivity_factor=0.85")
    found = fit(small(), log, fitted=("conductivity_factor",), pour="0 s", moved_probes=False)
    assert found.numbers[0].value == pytest.approx(0.85, rel=0.02)


TWO_POINTS = 'watch.points={ centre = ["0 mm", "0 mm"], edge = ["0 mm", "8 mm"] }'


def test_two_probes_on_one_clock_share_their_pour() -> None:
    overrides = (TWO_POINTS, f"{OUTSIDE}.h={TRUE_H} W/m2/K")
    logs = [noisy(7, *overrides, air=30.0, point=at) for at in ("centre", "edge")]
    found = fit(small(TWO_POINTS), logs, points=("centre", "edge"), moved_probes=False)
    assert len(found.pours) == 1
    assert found.numbers[0].value == pytest.approx(TRUE_H, rel=0.02)
    with pytest.raises(CaseError, match="where was each probe"):
        fit(small(TWO_POINTS), logs)
    with pytest.raises(CaseError, match='did you mean "edge"'):
        fit(small(TWO_POINTS), logs, points=("centre", "edg"))


def test_each_stage_has_its_h_and_one_that_the_log_does_not_reach_is_left() -> None:
    case = small()
    again = case.text.replace(
        "[watch]",
        '[[stages]]\nname = "hold"\nlasts = "5 min"\n[stages.surfaces.outside]\nexchange = "fluid"\n'
        'h = "20 W/m2/K"\ncoolant = "-25 degC"\n[watch]',
        1,
    )
    found = fit(small(text=again), noisy(8), pour="0 s", moved_probes=False)
    assert [n.name for n in found.numbers] == ["h of stage freeze"]
    assert any("h of stage hold is left as it is" in remark for remark in found.remarks)
    with pytest.raises(CaseError, match="says nothing about"):
        fit(small(text=again), noisy(8), pour="0 s", fitted=("stages.hold.surfaces.outside.h",))


def test_a_probe_off_its_place_is_said_in_numbers() -> None:
    # The log of a probe that was 2 mm off, taken for the centre's, gives an h that is too high.
    off = 'watch.points={ centre = ["2 mm", "0 mm"] }'
    log = noisy(9, off, f"{OUTSIDE}.h={TRUE_H} W/m2/K")
    (h,) = fit(small(), log, pour="0 s").numbers
    assert h.value > 1.03 * TRUE_H
    # Fitted again with the probe where it was, it gives the truth; mirror images count once.
    assert list(h.moved) == ["centre +2 mm in x", "centre +2 mm in y"]
    assert h.moved["centre +2 mm in x"] == pytest.approx(TRUE_H, rel=0.01)
    low, high = h.if_moved() or (0.0, 0.0)
    assert low <= h.moved["centre +2 mm in x"] <= high


def test_the_dip_of_supercooling_does_not_matter() -> None:
    log = noisy(10, air=40.0)
    dip = (log.times > 200.0) & (log.times < 240.0)
    T = np.where(dip, np.interp(log.times, [200.0, 236.0, 240.0], [-1.2, -5.0, -1.3]), log.temperatures)
    found = fit(small(), ProbeLog("dip", Path("dip.csv"), log.times, T, 0.0), moved_probes=False)
    assert found.numbers[0].value == pytest.approx(TRUE_H, rel=0.02)
    assert any("dips to" in remark for remark in found.remarks)


def test_another_recipe_than_the_cases_shows_in_the_plateau() -> None:
    log = noisy(11, "materials.mix.freezing_point=-2.4 degC")
    remarks = fit(small(), log, fitted=("h", "freezing_point"), moved_probes=False).remarks
    assert any("plateau" in remark and "-1.3 degC" in remark for remark in remarks)


def test_a_clock_in_the_wrong_unit_is_refused() -> None:
    log = noisy(12)
    with pytest.raises(CaseError, match="unit of its clock"):
        fit(small(), ProbeLog("min", Path("min.csv"), log.times / 60.0, log.temperatures, 0.0))


@pytest.mark.parametrize(
    ("keys", "said"),
    [
        ({"fitted": ("g",)}, "nothing that can be fitted"),
        ({"fitted": ("h", f"{OUTSIDE}.h")}, "twice"),
        ({"fitted": ("shape.thickness",)}, "callipers"),
        ({"pour": "noon"}, "14:03:20"),
        ({"columns": ("a", "b")}, "--column"),
    ],
)
def test_words_that_mean_nothing_are_said(keys: dict, said: str) -> None:
    with pytest.raises(CaseError, match=said):
        fit(small(), noisy(0), **keys)


def test_a_case_that_ends_too_early_says_so() -> None:
    with pytest.raises(CaseError, match="the case ends before its probe"):
        fit(small("stages.freeze.lasts=60 s", "watch.frames=60 s"), noisy(0), pour="0 s")


def test_the_fitted_case_is_written_with_the_origin_of_each_number(tmp_path: Path) -> None:
    case: Case = small()
    found = fit(case, noisy(13), pour="0 s")
    path = found.write(tmp_path / "out")
    text = path.read_text(encoding="utf-8")
    again = load(path)
    assert again.stages[0].surfaces["outside"].h.values[0] == pytest.approx(found.numbers[0].value, rel=1e-3)
    line = next(line for line in text.splitlines() if line.startswith("h ="))
    assert "# fitted to probe.csv" in line
    assert "was 250 W/m2/K" in line
    assert (tmp_path / "out" / "residuals.png").read_bytes()[:4] == b"\x89PNG"
    assert len((tmp_path / "out" / "residuals.csv").read_text().splitlines()) > 10
    with pytest.raises(CaseError, match="exists"):
        found.write(tmp_path / "out")


def test_the_comment_of_an_inline_table_stands_behind_it() -> None:
    from fem.case.origin import Origin, with_origins

    text = (
        '[shape]\nwall = { h = "1 W/m2/K" }\n[[stages]]\nname = "a"\nsurfaces.outside = { h = "2 W/m2/K" }\n'
    )
    out = with_origins(text, [Origin("stages.a.surfaces.outside.h", "3 W/m2/K", "fitted")])
    assert 'surfaces.outside = { h = "3 W/m2/K" } # fitted' in out


def test_tangents_of_passing_times_are_differences_of_marches() -> None:
    from fem.plan import Plan

    case = small("watch.frames=10 min", "stepping.accuracy=tight", "shape.cell=1 mm")
    plan = Plan.of(case)
    (h,) = unknowns(plan, ["h"])
    levels = [Level("centre", T) for T in (2.0, -4.0, -8.0)]
    tangent = passages(plan, levels, h.inputs()).slopes[:, 0]
    low, high = (passages(h.put(plan, h.start * f), levels, h.inputs()).times for f in (0.95, 1.05))
    np.testing.assert_allclose(tangent, (high - low) / 0.1, rtol=0.06)
