"""Every shipped case, with the number that its first lines promise."""

from __future__ import annotations

import re
from functools import cache
from pathlib import Path

import numpy as np
import pytest

from fem.case.read import load
from fem.result.answer import sentence
from fem.result.folder import Result
from fem.run import run
from tests.conftest import CASES

STAINLESS = ("regions.wall=stainless", "shape.wall=0.8 mm")
SILICONE = ("regions.wall=silicone", "shape.wall=2.5 mm")
BLAST = ("stages.freeze.surfaces.outside.h=30 W/m2/K", "stages.freeze.surfaces.outside.coolant=-30 degC")

# Expected times come from an independent finite-volume enthalpy calculation of the same cases
# (1 mm cells; computed for the demo scenario, no published source).
EXPECTED = {
    ("workshop_bar", ()): (1178.0, 0.04),
    ("factory_bar", ()): (416.0, 0.05),
    ("factory_bar", ("stages.freeze.surfaces.outside.h=400 W/m2/K",)): (508.0, 0.05),
    ("tube_in_brine", ()): (967.0, 0.05),
    ("tube_in_blast", ()): (3000.0, 0.05),
    ("tube_at_home", ()): (5.4 * 3600, 0.06),
    ("fruit_bar", ()): (1283.0, 0.05),
    ("mould_swap", ()): (2080.0, 0.05),
    ("mould_swap", STAINLESS): (1178.0, 0.05),
    ("mould_swap", SILICONE): (2120.0, 0.05),
    ("mould_swap", STAINLESS + BLAST): (3460.0, 0.05),
    ("mould_swap", SILICONE + BLAST): (4070.0, 0.05),
}


@cache
def result_of(name: str, overrides: tuple[str, ...] = ()) -> Result:
    return run(load(CASES / f"{name}.toml", overrides))


def all_cases() -> list[str]:
    return sorted(path.stem for path in CASES.glob("*.toml"))


@pytest.mark.parametrize(("name", "overrides"), EXPECTED)
def test_time_to_aim(name: str, overrides: tuple[str, ...]) -> None:
    time, tolerance = EXPECTED[name, overrides]
    assert result_of(name, overrides).summary["aim"]["time_s"] == pytest.approx(time, rel=tolerance)


@pytest.mark.parametrize("name", all_cases())
def test_the_ledger_of_every_case_closes(name: str) -> None:
    assert abs(result_of(name).summary["energy_imbalance"]) < 1e-8


@pytest.mark.parametrize("path", sorted(CASES.glob("*.toml")), ids=lambda p: p.stem)
def test_every_case_opens_with_what_why_and_the_expected_number(path: Path) -> None:
    first = path.read_text(encoding="utf-8").splitlines()[:3]
    assert [line.split(":")[0] for line in first] == ["# What", "# Why", "# Expected"]


def test_workshop_bar_gives_up_its_heat_and_has_its_mass() -> None:
    summary = result_of("workshop_bar").summary
    assert summary["heat_J"]["product"] == pytest.approx(28e3, rel=0.05)
    assert summary["mass_kg"]["product"] == pytest.approx(0.095, rel=0.01)
    assert summary["stages"][-1]["mean_degC"] == pytest.approx(-16.6, abs=0.5)


def test_workshop_bar_just_passes_and_factory_bar_fails_at_low_agitation() -> None:
    assert "yes, 20 min is just enough" in sentence(result_of("workshop_bar").summary)
    slow = result_of("factory_bar", ("stages.freeze.surfaces.outside.h=400 W/m2/K",))
    assert slow.summary["aim"]["met"] is False
    assert "no, 7.3 min is not enough" in sentence(slow.summary)


def test_a_plastic_mould_costs_much_in_brine_and_little_in_air() -> None:
    def longer(mould: tuple[str, ...], coolant: tuple[str, ...] = ()) -> float:
        times = [result_of("mould_swap", m + coolant).summary["aim"]["time_s"] for m in (mould, STAINLESS)]
        return 100.0 * (times[0] / times[1] - 1.0)

    assert longer(()) == pytest.approx(80, abs=6)
    assert longer(SILICONE) == pytest.approx(80, abs=6)
    assert longer(SILICONE, BLAST) == pytest.approx(18, abs=6)
    steel = result_of("mould_swap", STAINLESS).summary["aim"]["time_s"]
    assert steel == pytest.approx(result_of("workshop_bar").summary["aim"]["time_s"], rel=1e-9)


def test_the_overrides_of_the_mould_swap_are_those_that_its_comments_offer() -> None:
    offered = re.findall(
        r"--set (\S+?)=(?:\"(.*?)\"|(\S+))", (CASES / "mould_swap.toml").read_text(encoding="utf-8")
    )
    assert {f"{key}={quoted or bare}" for key, quoted, bare in offered} == {*STAINLESS, *SILICONE, *BLAST}


def test_the_fruit_bar_is_half_ice_and_a_hand_estimate_falls_short() -> None:
    mix = load(CASES / "fruit_bar.toml").materials["mix"].build()
    # Lever rule on the computed freezing curve of this mix (no published source).
    assert mix.freezing_point == pytest.approx(-3.31, abs=0.03)
    assert float(mix.ice(-12.0)) == pytest.approx(0.50, abs=0.01)
    summary = result_of("fruit_bar").summary
    assert summary["aim"]["met"] is False
    # Hand estimate 1024 s: Pham's method by hand for this bar (formulas from memory).
    assert 1024.0 / summary["aim"]["time_s"] == pytest.approx(0.80, abs=0.04)


def test_the_tube_at_home_loses_9_watts_per_square_metre_and_kelvin() -> None:
    (stage,) = load(CASES / "tube_at_home.toml").stages
    side = stage.surfaces["side"]
    flux, _ = side.flux(np.array([-3.0]), 0.0)
    # 9 W/m2/K outside and 0.1 mm of polyethylene film of 0.33 W/m/K.
    assert float(flux[0]) / 15.0 == pytest.approx(1 / (1 / 9 + 1e-4 / 0.33), rel=2e-3)


def test_workshop_bar_is_near_its_own_refined_value() -> None:
    fine = result_of("workshop_bar", ("shape.cell=0.25 mm", "stepping.accuracy=tight"))
    ours, refined = (r.summary["aim"]["time_s"] for r in (result_of("workshop_bar"), fine))
    assert ours == pytest.approx(refined, rel=2e-3)


def test_the_front_of_the_slab_is_neumanns() -> None:
    # Carslaw & Jaeger 1959, sect. 11.2: lambda = 0.232073217621 for these properties.
    fronts = result_of("slab_neumann").fronts
    time, position = fronts["time [s]"], fronts["depth.position [mm]"]
    late = time >= 110
    exact = 1e3 * 0.0004808276449 * np.sqrt(time[late])
    np.testing.assert_allclose(position[late], exact, rtol=5e-3)


# Sensitivities of the workshop bar by the same independent calculation.
@pytest.mark.parametrize(
    ("override", "time"),
    [
        ("stages.freeze.surfaces.outside.coolant=-18 degC", 1496),
        ("stages.freeze.surfaces.outside.coolant=-30 degC", 842),
        ("stages.freeze.surfaces.outside.h=120 W/m2/K", 1763),
        ("stages.freeze.surfaces.outside.h=1000 W/m2/K", 738),
        ("piece.start_temperature=20 degC", 1324),
    ],
)
def test_workshop_bar_answers_to_its_knobs(override: str, time: float) -> None:
    assert result_of("workshop_bar", (override,)).summary["aim"]["time_s"] == pytest.approx(time, rel=0.05)
