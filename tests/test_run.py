from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from fem.errors import CaseError, RunFailure
from fem.heat import forms
from fem.heat.body import Body
from fem.result.folder import open_run
from fem.run import run
from tests.pieces import SMALL, small


def test_the_answer_of_a_small_bar_hangs_together() -> None:
    result = run(small())
    summary, curves = result.summary, result.curves
    assert summary["outcome"] == "finished"
    assert summary["aim"]["met"]
    assert summary["heat_removed_J"] == pytest.approx(sum(summary["heat_J"].values()), rel=1e-12)
    assert curves["heat_removed [J]"][-1] == pytest.approx(summary["heat_removed_J"], rel=1e-12)
    assert np.all(np.diff(curves["slowest [degC]"]) < 1e-6)
    assert np.all(curves["mean [degC]"] <= curves["slowest [degC]"] + 1e-9)
    crossing = np.interp(-12.0, curves["slowest [degC]"][::-1], curves["time [s]"][::-1])
    assert summary["aim"]["time_s"] == pytest.approx(crossing, abs=0.5)


def test_rows_stand_at_every_multiple_at_zero_and_at_stage_ends() -> None:
    times = run(small("stages.freeze.lasts=33 s")).curves["time [s]"]
    np.testing.assert_allclose(times, [0, 5, 10, 15, 20, 25, 30, 33])


def test_energy_closes_to_rounding_through_every_kind_of_stage() -> None:
    result = run(small(text=STAGES))
    assert abs(result.summary["energy_imbalance"]) < 1e-12
    assert [s["name"] for s in result.summary["stages"]] == ["freeze", "hold", "demould", "wait", "glow"]


def test_one_per_cent_error_in_the_assembled_boundary_flux_is_one_per_cent_imbalance(
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    exposure = forms.exposure
    monkeypatch.setattr(forms, "exposure", lambda *args: 1.01 * exposure(*args))
    imbalance = run(small("stages.freeze.lasts=2 min")).summary["energy_imbalance"]
    assert imbalance == pytest.approx(-0.01, rel=0.02)


def test_an_error_in_what_a_material_releases_is_seen_by_the_ledger(monkeypatch: pytest.MonkeyPatch) -> None:
    # The naive apparent capacity, dH/dT at the temperature of the step's end in place of H, is
    # what loses latent heat; the ledger has to show it.
    def naive(self: Body, u: np.ndarray, state: object) -> tuple[np.ndarray, np.ndarray]:
        volume, c = self.parts[0].volume, state.capacity  # type: ignore[attr-defined]
        return volume * c * state.temperature, volume * c  # type: ignore[attr-defined]

    text = SMALL.replace('wall = "0.8 mm"\n', "").replace('wall = "stainless"\n', "")
    assert abs(run(small(text=text)).summary["energy_imbalance"]) < 1e-12
    monkeypatch.setattr(Body, "stored", naive)
    try:
        imbalance = run(small(text=text)).summary["energy_imbalance"]
    except RunFailure:
        return
    assert abs(imbalance) > 0.05


STAGES = (
    SMALL.split("[[stages]]")[0]
    + """
[[stages]]
name = "freeze"
lasts = "2 min"
[stages.surfaces.outside]
exchange = "fluid"
h = { time = { unit = "s", values = [0, 30, 60] }, value = { unit = "W/m2/K", values = [100, 400, 250] } }
coolant = "-30 degC"
[[stages]]
name = "hold"
lasts = "1 min"
[stages.surfaces.outside]
exchange = "fixed"
temperature = { time = { unit = "s", values = [0, 60] }, value = { unit = "degC", values = [-25, -20] } }
[[stages]]
name = "demould"
lasts = "20 s"
[stages.surfaces.outside]
exchange = "flux"
flux = "-8000 W/m2"
[[stages]]
name = "wait"
lasts = "30 s"
[[stages]]
name = "glow"
lasts = "2 min"
[stages.surfaces.outside]
exchange = "radiant"
emissivity = "0.9"
surroundings = "-18 degC"
h = "5 W/m2/K"
air = "-18 degC"
"""
)


def test_a_hold_without_exchange_keeps_the_heat_and_evens_out_the_temperature() -> None:
    hold = "stages.hold.lasts=4 min"
    text = SMALL.split("[watch]")[0] + '[[stages]]\nname = "hold"\nlasts = "1 min"\n'
    result = run(small("stages.freeze.lasts=100 s", hold, text=text))
    before, after = result.summary["stages"]
    assert after["mean_degC"] == pytest.approx(before["mean_degC"], abs=0.3)  # the wall gives a little
    assert result.curves["heat_removed [J]"][-1] == pytest.approx(
        np.interp(100, result.curves["time [s]"], result.curves["heat_removed [J]"]), rel=1e-9
    )
    assert after["slowest_degC"] - after["mean_degC"] < 0.3 * (before["slowest_degC"] - before["mean_degC"])


def test_until_ends_a_stage_where_its_condition_is_met() -> None:
    result = run(small(*UNTIL))
    (stage,) = result.summary["stages"]
    assert stage["ended_s"] == pytest.approx(result.summary["aim"]["time_s"], abs=1e-3)
    assert stage["slowest_degC"] == pytest.approx(-12.0, abs=1e-3)
    assert not [c for c in result.summary["cautions"] if "its time was up" in c]


UNTIL = ("stages.freeze.until=slowest <= -12 degC",)


def test_until_that_is_not_met_is_a_caution() -> None:
    result = run(small("stages.freeze.lasts=1 min", *UNTIL))
    assert result.summary["outcome"] == "finished"
    assert any("its time was up before slowest <= -12 degC" in c for c in result.summary["cautions"])
    assert result.summary["aim"]["time_s"] is None
    assert not result.summary["aim"]["met"]


def test_until_that_holds_from_the_start_ends_the_stage_at_once() -> None:
    result = run(small("stages.freeze.until=slowest <= 10 degC"))
    assert result.summary["stages"][0]["ended_s"] == 0.0


def test_the_crossing_does_not_depend_on_the_steps() -> None:
    times = [
        run(small(f"stepping.largest_step={s}", "stepping.accuracy=tight")).summary["aim"]["time_s"]
        for s in ("1 s", "2 s", "600 s")
    ]
    assert max(times) - min(times) < 0.1


def test_a_piece_may_start_frozen_and_thaw() -> None:
    result = run(
        small(
            "piece.start_temperature=-20 degC",
            "aim.reach=-2 degC",
            "stages.freeze.surfaces.outside.coolant=20 degC",
        )
    )
    assert result.summary["aim"]["met"]
    assert result.summary["heat_removed_J"] < 0
    assert abs(result.summary["energy_imbalance"]) < 1e-12
    # The slowest point of a thaw is the coldest.
    assert result.curves["slowest [degC]"][10] <= result.curves["mean [degC]"][10]


def test_a_piece_may_start_part_frozen() -> None:
    slush = run(small("piece.start_temperature=-1.5 degC")).summary
    liquid = run(small()).summary
    assert slush["aim"]["time_s"] < liquid["aim"]["time_s"]
    assert (
        run(small("piece.start_temperature=-1.5 degC", "stages.freeze.lasts=5 s")).curves["ice_mean [-]"][0]
        > 0.1
    )


def test_regions_may_start_at_their_own_temperature() -> None:
    cold = run(small("piece.start={wall='-20 degC'}", "stages.freeze.lasts=10 s")).summary
    warm = run(small("stages.freeze.lasts=10 s")).summary
    assert cold["heat_J"]["wall"] < 0.1 * warm["heat_J"]["wall"]


def test_a_bar_is_the_same_whichever_way_it_lies() -> None:
    text = SMALL.replace('thickness = "12 mm"\nwidth = "24 mm"', 'thickness = "24 mm"\nwidth = "12 mm"')
    lying = text.replace('from = ["6 mm", "0 mm"]', 'from = ["0 mm", "6 mm"]')
    a, b = run(small()).summary, run(small(text=lying)).summary
    assert a["aim"]["time_s"] == pytest.approx(b["aim"]["time_s"], rel=1e-6)
    assert a["heat_removed_J"] == pytest.approx(b["heat_removed_J"], rel=1e-6)


def test_a_wall_splits_heat_but_does_not_move_the_sum() -> None:
    result = run(small("stages.freeze.lasts=40 min"))
    curve = small().materials
    wall = curve["stainless"].build().curve
    given = result.summary["heat_J"]["wall"]
    mass = result.summary["mass_kg"]["wall"]
    per_kg = float(wall.enthalpy(4.0) - wall.enthalpy(-22.0)) / 7900.0
    assert given == pytest.approx(mass * per_kg, rel=1e-3)


def test_the_folder_reads_back_as_what_was_returned(tmp_path: Path) -> None:
    result = run(small(), tmp_path / "out")
    again = open_run(tmp_path / "out")
    assert again.summary == result.summary
    for name, values in result.curves.items():
        np.testing.assert_allclose(again.curves[name], values, rtol=1e-8, atol=1e-12)
    for name, values in result.fronts.items():
        np.testing.assert_allclose(again.fronts[name], values, rtol=1e-8, atol=1e-12)
    assert (tmp_path / "out" / "case.toml").read_text() == small().text
    assert "stage freeze ended" in (tmp_path / "out" / "log.txt").read_text()


def test_a_folder_that_exists_is_refused_and_left_alone(tmp_path: Path) -> None:
    (tmp_path / "keep.txt").write_text("mine")
    for overwrite in (False, True):
        with pytest.raises(CaseError):
            run(small("stages.freeze.lasts=10 s"), tmp_path, overwrite=overwrite)
    assert (tmp_path / "keep.txt").read_text() == "mine"


def test_an_earlier_run_may_be_replaced(tmp_path: Path) -> None:
    run(small("stages.freeze.lasts=10 s"), tmp_path / "out")
    result = run(small("stages.freeze.lasts=20 s"), tmp_path / "out", overwrite=True)
    assert open_run(tmp_path / "out").summary["time_s"] == result.summary["time_s"] == 20.0


def test_a_watched_place_outside_the_outline_is_an_error_and_nothing_is_written(tmp_path: Path) -> None:
    with pytest.raises(CaseError, match=r'watch.*"centre" lies outside'):
        run(small("watch.points.centre=['6.7 mm', '12.7 mm']"), tmp_path / "out")
    assert not (tmp_path / "out").exists()


def test_a_drawing_in_the_wrong_unit_is_cautioned() -> None:
    said = run(
        small(
            "shape.thickness=12 in",
            "shape.width=24 in",
            "shape.cell=2 in",
            'watch.rays.flat.to=["1 mm", "0 mm"]',
        )
    )
    assert any("see whether the drawing's unit was read right" in c for c in said.summary["cautions"])
    assert not any("drawing's unit" in c for c in run(small("stages.freeze.lasts=1 min")).summary["cautions"])


def test_a_run_that_fails_says_when_and_why_and_keeps_its_rows(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    from fem.heat.problem import HeatProblem

    correct = HeatProblem.correct

    def stuck(self: HeatProblem, look: object, g: float, residual: np.ndarray) -> np.ndarray:
        if look.u.mean() < -1e8:  # type: ignore[attr-defined]
            raise ArithmeticError("not positive definite")
        return correct(self, look, g, residual)  # type: ignore[arg-type]

    monkeypatch.setattr(HeatProblem, "correct", stuck)
    with pytest.raises(RunFailure, match="did not converge") as failure:
        run(small(), tmp_path / "out")
    assert failure.value.time > 20
    kept = open_run(tmp_path / "out")
    assert kept.summary["outcome"] == "failed"
    assert "did not converge" in kept.summary["why"]
    assert kept.curves["time [s]"][-1] > 20
    assert "kept in the run folder" in str(failure.value)


def test_interrupting_keeps_the_folder(tmp_path: Path) -> None:
    def interrupt(time: float, *_: object) -> None:
        if time > 50:
            raise KeyboardInterrupt

    with pytest.raises(KeyboardInterrupt):
        run(small(), tmp_path / "out", progress=interrupt)
    kept = open_run(tmp_path / "out")
    assert kept.summary["outcome"] == "interrupted"
    assert kept.curves["time [s]"][-1] >= 50
