from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from fem.case.case import Case
from fem.case.shift import kind_of, read_spread, shifted
from fem.hangs_on import HangsOn
from fem.march import control
from fem.march.control import Control
from fem.run import run
from tests.pieces import SMALL, small

# Steps that no tolerance moves, solved to rounding: differences of such runs have no scatter.
FROZEN = Control(tolerance=1e9, stop_mean=1e-21, stop_worst=1e-20, most_iterations=60)
STEPS = ("stepping.first_step=2 s", "stepping.largest_step=2 s")
# Not a divisor of the sides: a hair more of thickness must not add a row of cells to the difference.
CELL = "shape.cell=1.45 mm"

TWO_STAGES = (
    SMALL.split("[[stages]]")[0]
    + """
[[stages]]
name = "chill"
lasts = "3 min"
until = "slowest <= -1.0 degC"
[stages.surfaces.outside]
exchange = "fluid"
h = "250 W/m2/K"
coolant = "-22 degC"
[[stages]]
name = "harden"
lasts = "10 min"
[stages.surfaces.outside]
exchange = "radiant"
emissivity = "0.9"
surroundings = "-35 degC"
h = "100 W/m2/K"
air = "-32 degC"
[watch]
frames = "13 min"
[watch.points]
off_centre = ["1 mm", "2 mm"]
[aim]
reach = "-14 degC"
"""
)

SPREADS = {
    "stages.freeze.surfaces.outside.h": "10 %",
    "stages.freeze.surfaces.outside.coolant": "1 K",
    "piece.start_temperature": "1 K",
    "materials.mix.sucrose": "5 %",
    "materials.mix.conductivity_factor": "5 %",
    "materials.mix.freezing_point": "0.1 K",
    "materials.stainless.density": "10 %",
    "shape.thickness": "0.3 mm",
    "shape.wall": "0.1 mm",
    "piece.length": "1 mm",
}


def uncertain(case: Case, spreads: dict[str, str]) -> Case:
    return replace(case, uncertainty={k: read_spread(v, kind_of(case, k)) for k, v in spreads.items()})


def compare(case: Case, by: float, monkeypatch: pytest.MonkeyPatch) -> dict[str, tuple[float, float]]:
    """Return the tangent of the time to the aim, and its central difference, for each input."""
    seen = []
    as_dict = HangsOn.as_dict

    def spy(self: HangsOn, arrival: object) -> dict:
        seen.append((self._sensitivity.inputs, self._sensitivity.effects))
        return as_dict(self, arrival)  # type: ignore[arg-type]

    monkeypatch.setattr(HangsOn, "as_dict", spy)
    run(case)
    ((inputs, found),) = seen
    out = {}
    for entry, slope in zip(inputs, found.time, strict=True):
        times = [
            run(shifted(case, entry.key, entry.spread, x, entry.default), ranges=False).summary["aim"][
                "time_s"
            ]
            for x in (-by, by)
        ]
        out[entry.key] = (float(slope), (times[1] - times[0]) / (2 * by))
    return out


def test_tangents_are_the_differences_of_frozen_steps(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setitem(control.ACCURACIES, "standard", FROZEN)
    case = uncertain(small("watch.frames=10 min", CELL, *STEPS), SPREADS)
    pairs = compare(case, 0.02, monkeypatch)
    largest = max(abs(difference) for _, difference in pairs.values())
    for key, (tangent, difference) in pairs.items():
        assert tangent == pytest.approx(difference, rel=5e-3, abs=5e-4 * largest), key


def test_ends_of_stages_that_move_are_chained(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setitem(control.ACCURACIES, "standard", FROZEN)
    spreads = {
        "stages.chill.surfaces.outside.h": "10 %",
        "stages.harden.surfaces.outside.h": "10 %",
        "stages.harden.surfaces.outside.surroundings": "1 K",
        "materials.mix.conductivity_factor": "5 %",
    }
    case = uncertain(small(*STEPS, text=TWO_STAGES), spreads)
    for key, (tangent, difference) in compare(case, 0.02, monkeypatch).items():
        assert tangent == pytest.approx(difference, rel=0.02, abs=0.02), key


def test_the_aim_may_be_at_a_watched_point(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setitem(control.ACCURACIES, "standard", FROZEN)
    case = uncertain(
        small("aim.at=off_centre", CELL, *STEPS, text=TWO_STAGES),
        {"shape.thickness": "0.3 mm", "stages.harden.surfaces.outside.h": "10 %"},
    )
    for key, (tangent, difference) in compare(case, 0.02, monkeypatch).items():
        assert tangent == pytest.approx(difference, rel=0.02, abs=0.02), key


def test_a_fixed_surface_may_be_uncertain(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setitem(control.ACCURACIES, "standard", FROZEN)
    text = SMALL.replace('exchange = "fluid"\nh = "250 W/m2/K"\ncoolant', 'exchange = "fixed"\ntemperature')
    case = uncertain(
        small("watch.frames=10 min", "stepping.first_step=0.5 s", "stepping.largest_step=0.5 s", text=text),
        {"stages.freeze.surfaces.outside.temperature": "1 K", "piece.start_temperature": "1 K"},
    )
    for key, (tangent, difference) in compare(case, 0.02, monkeypatch).items():
        assert tangent == pytest.approx(difference, rel=0.01), key


def test_at_standard_accuracy_tangents_are_near_the_truth(monkeypatch: pytest.MonkeyPatch) -> None:
    keys = ("stages.freeze.surfaces.outside.h", "stages.freeze.surfaces.outside.coolant", "shape.thickness")
    case = uncertain(small("shape.cell=0.5 mm"), {key: SPREADS[key] for key in keys})
    slopes = {e["key"]: e for e in run(case).summary["uncertainty"]["inputs"]}
    monkeypatch.setitem(control.ACCURACIES, "standard", control.ACCURACIES["tight"])
    for key in keys:
        spread = case.uncertainty[key]
        low, high = (
            run(shifted(case, key, spread, x), ranges=False).summary["aim"]["time_s"] for x in (-0.5, 0.5)
        )
        ours = slopes[key]["effect_of_more_s"] - slopes[key]["effect_of_less_s"]
        assert ours / 2 == pytest.approx(high - low, rel=0.05), key


def test_heat_and_temperatures_at_the_end_of_a_stage_have_a_half_width() -> None:
    case = uncertain(small("stages.freeze.lasts=4 min"), {"piece.start_temperature": "2 K"})
    (stage,) = run(case).summary["uncertainty"]["stages"]
    heats = [
        run(
            shifted(case, "piece.start_temperature", case.uncertainty["piece.start_temperature"], x),
            ranges=False,
        )
        for x in (-0.5, 0.5)
    ]
    removed = [r.summary["heat_removed_J"] for r in heats]
    assert stage["heat_removed_J_half_width"] == pytest.approx(abs(removed[1] - removed[0]), rel=0.02)
    mean = [r.summary["stages"][0]["mean_degC"] for r in heats]
    assert stage["mean_degC_half_width"] == pytest.approx(abs(mean[1] - mean[0]), rel=0.05)


def test_without_a_table_the_trades_uncertainty_is_used_and_said() -> None:
    uncertainty = run(small()).summary["uncertainty"]
    assert uncertainty["source"] == "the trade usually finds them"
    names = {entry["name"] for entry in uncertainty["inputs"]}
    assert names == {"agitation", "coolant temperature", "thickness", "conductivity", "freezing point"}
    sizes = [max(abs(e["effect_of_less_s"]), abs(e["effect_of_more_s"])) for e in uncertainty["inputs"]]
    assert sizes[0] == max(sizes)


def test_an_aim_that_is_not_reached_has_no_range() -> None:
    uncertainty = run(small("stages.freeze.lasts=1 min")).summary["uncertainty"]
    assert uncertainty["time_s"] is None
    assert uncertainty["inputs"] == []


def test_an_aim_that_is_barely_reached_says_so() -> None:
    case = small("aim.reach=-21.95 degC", "stages.freeze.lasts=60 min", "watch.every=60 s")
    remarks = run(case).summary["uncertainty"]["remarks"]
    assert any("barely reached" in remark for remark in remarks)


def test_the_answer_does_not_change_by_carrying_sensitivities() -> None:
    with_ranges, without = run(small()), run(small(), ranges=False)
    assert with_ranges.summary["aim"]["time_s"] == without.summary["aim"]["time_s"]
    np.testing.assert_array_equal(with_ranges.curves["mean [degC]"], without.curves["mean [degC]"])
