"""The estimate of one Poisson solve, of whole cases and beside their runs."""

from __future__ import annotations

from typing import Any

import pytest

from fem.case.case import Case
from fem.case.read import load
from fem.estimate.by_poisson import BAND, poisson
from fem.estimate.outlook import outlook
from fem.plan import Plan
from fem.run import run
from tests.conftest import CASES
from tests.pieces import small

OUTSIDE = "stages.freeze.surfaces.outside"
WARMING = '{ time = { unit = "min", values = [0, 5] }, value = { unit = "degC", values = [-24, -20] } }'
SHIPPED = ("workshop_bar", "factory_bar", "fruit_bar", "mould_swap", "fluted_bar")
TUBES = ("tube_in_brine", "tube_in_blast", "tube_at_home")


def of(case: Case) -> dict[str, Any]:
    return poisson(Plan.of(case))


def beside_the_run(case: Case) -> tuple[dict[str, Any], list[str]]:
    summary = run(case, ranges=False, numerical_error=False).summary
    return next(e for e in summary["estimates"] if e["method"] == "Poisson"), summary["cautions"]


@pytest.mark.parametrize("name", SHIPPED + TUBES)
def test_every_shipped_case_stays_in_the_band(name: str) -> None:
    found, cautions = beside_the_run(load(CASES / f"{name}.toml"))
    assert found["in_range"], found["remarks"]
    assert 0.9 < found["ratio"] < 1.1
    assert not any("theory allows" in caution for caution in cautions)


def test_a_piece_of_one_temperature_takes_exactly_the_estimate() -> None:
    """Small Biot number: m dH/dt = -h A (T - T_c), whatever the curve of the mix."""
    slow = ("stages.freeze.lasts=20 h", "stages.freeze.until=slowest <= -12 degC", "watch.every=1 h")
    found, _ = beside_the_run(
        small(f"{OUTSIDE}.h=1 W/m2/K", *slow, "materials.stainless.heat_capacity=1 J/kg/K")
    )
    assert found["ratio"] == pytest.approx(1.0, abs=0.01)


def test_of_the_limit_the_estimate_is_the_larger_part() -> None:
    found = of(small())
    assert found["limit_s"] < found["time_s"] < 2.0 * found["limit_s"]
    assert any("Ste = 0.17" in remark for remark in found["remarks"])


def test_a_run_out_of_the_band_is_said(monkeypatch: pytest.MonkeyPatch) -> None:
    import fem.run

    def doubled(plan: Plan) -> dict[str, Any]:
        found = poisson(plan)
        return {**found, "time_s": 2.0 * found["time_s"]}

    monkeypatch.setattr(fem.run, "poisson", doubled)
    found, cautions = beside_the_run(small())
    assert found["ratio"] < BAND[0]
    assert any("times the Poisson estimate, theory allows 0.85 to 1.15" in caution for caution in cautions)


@pytest.mark.parametrize(
    ("overrides", "said"),
    [
        (("piece.start_temperature=-25 degC",), "for freezing, not for thawing"),
        ((f"{OUTSIDE}.coolant=-10 degC",), "no stage cools the piece to its aim"),
        (("regions.product=stainless", "watch.front=-3 degC"), "does not freeze"),
        (("piece.start_temperature=-12 degC",), "starts at its aim"),
    ],
)
def test_what_cannot_be_estimated_is_said(overrides: tuple[str, ...], said: str) -> None:
    found = of(small(*overrides))
    assert found["time_s"] is None
    assert said in found["remarks"][0]


@pytest.mark.parametrize(
    ("override", "said"),
    [
        (f"{OUTSIDE}.coolant=-80 degC", "Ste = "),
        ("aim.reach=-21 degC", "only 1 K above"),
        ("piece.start_temperature=60 degC", "heat above the freezing point"),
        ("piece.start_temperature=-3 degC", "partly frozen"),
        (f"{OUTSIDE}.coolant={WARMING}", "means over the stage"),
    ],
)
def test_what_takes_a_case_out_of_the_range_is_said(override: str, said: str) -> None:
    found = of(small(override))
    assert found["time_s"] > 0.0
    assert not found["in_range"]
    assert any(said in remark for remark in found["remarks"])


def test_check_has_it_too() -> None:
    case = small()
    assert outlook(case)["estimates"][-1] == of(case)
