from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from fem.case.read import load
from fem.heat.body import Body
from fem.heat.problem import HeatProblem
from fem.march.march import begin, march
from fem.march.newton import Effort
from fem.march.step import Moment, Step
from fem.mesh.build import build
from fem.plan import Plan
from fem.run import run
from fem.watch.product import Product
from fem.watch.texture import DEFAULT_REACH, FreezingTimes
from tests.pieces import MIX, STEEL, WATER, bar, bar_body, material, slab_body, small

COLD, WARM = -10.0, 5.0


def moment(time: float, u: np.ndarray, u_rate: np.ndarray | None = None) -> Moment:
    none = np.zeros(0)
    return Moment(time, u, u, none, u, none, u if u_rate is None else u_rate, None)


def step(body: Body, start: float, end: float, before: float, after: float) -> Step:
    """Every node of a one-material body goes straight, in enthalpy, from a temperature to another."""
    curve = body.materials["product"].curve
    a, b = (np.full(body.size, float(curve.enthalpy(T))) for T in (before, after))
    return Step(moment(start, a), moment(end, b), earlier=None)


def freezing(body: Body, **keys: object) -> FreezingTimes:
    return FreezingTimes(Product(body), **keys)  # type: ignore[arg-type]


def share(body: Body, before: float, after: float, at: float) -> float:
    """How far along a straight fall of enthalpy a temperature lies."""
    a, b, x = (float(body.materials["product"].curve.enthalpy(T)) for T in (before, after, at))
    return (a - x) / (a - b)


def test_nodes_freeze_as_neumanns_front_passes_them(cases: Path) -> None:
    # Carslaw & Jaeger 1959, sect. 11.2: s = 2 lambda sqrt(a t), lambda = 0.232073217621 for these
    # properties, so t = (x / K)^2 with K in m/s^0.5.
    K = 0.0004808276449
    case = load(cases / "slab_neumann.toml", ("stages.freeze.lasts=10 min",))
    plan = Plan.of(case)
    stage = case.stages[0]
    problem = HeatProblem(plan.body, stage.surfaces, 0.0, plan.span)
    seen = FreezingTimes(Product(plan.body), start=plan.start)
    moment = begin(problem, 0.0, plan.start, plan.no_accounts(stage))
    for accepted in march(problem, moment, stage.lasts, [], plan.control(stage), Effort()):
        seen.see(accepted)
    x = plan.body.domain.points[0]
    frozen = ~np.isnan(seen.frozen_at)
    assert x[frozen].max() == pytest.approx(K * np.sqrt(600.0), abs=0.25e-3)
    exact = (x / K) ** 2
    # Near the wall the first cells count: 1.5 mm are six of them.
    deep = frozen & (x > 1.5e-3)
    assert np.all(np.abs(seen.frozen_at - exact)[deep] < np.maximum(0.1, 0.01 * exact[deep]))
    deeper = frozen & (x > 5e-3)
    np.testing.assert_allclose(seen.frozen_at[deeper], exact[deeper], rtol=2e-3)
    # The wall is held below the freezing point from the first moment on.
    assert np.all(seen.frozen_at[x == 0.0] == 0.0)
    assert np.all(seen.local[x == 0.0] == 0.0)


def test_the_local_freezing_time_is_the_difference_of_two_crossings_of_the_curve(tmp_path: Path) -> None:
    import pyvista as pv

    curves = run(small("watch.every=0.1 s"), tmp_path / "out").curves
    last = pv.read(sorted((tmp_path / "out" / "fields").iterdir())[-1])
    centre = int(np.argmin(np.hypot(*last.points[:, :2].T)))
    time, T = curves["time [s]"], curves["point.centre [degC]"]
    freezing_point = small().materials["mix"].build().freezing_point
    fell = [float(time[np.argmax(level >= T)]) for level in (freezing_point, -12.0 + 1e-4)]
    # Each crossing is read to one row of the curve.
    assert last["frozen_at_s"][centre] == pytest.approx(fell[0], abs=0.11)
    assert last["local_freezing_time_s"][centre] == pytest.approx(fell[1] - fell[0], abs=0.21)


@pytest.mark.parametrize("earlier", [None, 80.0])
def test_a_crossing_is_found_along_the_cubic_of_a_step_and_a_first_step_is_straight(
    earlier: float | None,
) -> None:
    body = slab_body()
    curve = body.materials["product"].curve
    high, low = float(curve.enthalpy(WARM)), float(curve.enthalpy(COLD))
    middle = float(curve.enthalpy(0.0))
    ones = np.ones(body.size)
    # H = high + (low - high) s^3 has slope 0 at the start and 3 at the end.
    rates = 0.0 * ones, 3.0 * (low - high) / 100.0 * ones
    seen = freezing(body)
    a, b = moment(50.0, high * ones, rates[0]), moment(150.0, low * ones, rates[1])
    seen.see(Step(a, b, earlier))
    s = (high - middle) / (high - low)
    exact = 50.0 + 100.0 * (s if earlier is None else s ** (1 / 3))
    np.testing.assert_allclose(seen.frozen_at, exact, atol=0.02)


def test_freezing_and_freezing_through_within_one_step_keep_their_order() -> None:
    body = slab_body()
    seen = freezing(body, reach=-4.0)
    seen.see(step(body, 0.0, 10.0, WARM, COLD))
    frozen, through = share(body, WARM, COLD, 0.0), share(body, WARM, COLD, -4.0)
    np.testing.assert_allclose(seen.frozen_at, 10.0 * frozen, atol=0.01)
    np.testing.assert_allclose(seen.local, 10.0 * (through - frozen), atol=0.01)


def test_the_last_of_two_freezings_counts() -> None:
    body = slab_body()
    seen = freezing(body)
    seen.see(step(body, 0.0, 10.0, WARM, COLD))
    first = seen.frozen_at.copy()
    seen.see(step(body, 10.0, 20.0, COLD, WARM))
    assert np.all(np.isnan(seen.frozen_at))
    assert np.all(np.isnan(seen.local))
    seen.see(step(body, 20.0, 30.0, WARM, COLD))
    np.testing.assert_allclose(seen.frozen_at, first + 20.0, atol=1e-6)
    assert not np.any(np.isnan(seen.local))


def test_a_node_that_only_warms_up_below_its_freezing_point_keeps_its_times() -> None:
    body = slab_body()
    seen = freezing(body)
    seen.see(step(body, 0.0, 10.0, WARM, COLD))
    before = seen.frozen_at.copy(), seen.local.copy()
    seen.see(step(body, 10.0, 20.0, COLD, -1.0))
    seen.see(step(body, 20.0, 30.0, -1.0, COLD))
    np.testing.assert_array_equal(seen.frozen_at, before[0])
    np.testing.assert_array_equal(seen.local, before[1])


def test_what_has_not_happened_is_a_gap() -> None:
    body = slab_body()
    seen = freezing(body)
    seen.see(step(body, 0.0, 10.0, WARM, 1.0))
    assert np.all(np.isnan(seen.frozen_at))
    seen.see(step(body, 10.0, 20.0, 1.0, -1.0))
    assert not np.any(np.isnan(seen.frozen_at))
    assert np.all(np.isnan(seen.local))


def test_a_piece_frozen_from_the_start_never_froze() -> None:
    body = slab_body()
    seen = freezing(body, reach=-9.0)
    seen.see(step(body, 0.0, 10.0, -5.0, COLD))
    seen.see(step(body, 10.0, 20.0, COLD, COLD))
    assert np.all(np.isnan(seen.frozen_at))
    assert np.all(np.isnan(seen.local))


def test_a_surface_held_cold_by_a_stage_freezes_when_that_begins() -> None:
    body = slab_body()
    seen = freezing(body)
    seen.see(step(body, 0.0, 10.0, WARM, 3.0))
    seen.see(step(body, 10.0, 20.0, -20.0, -20.0))
    np.testing.assert_array_equal(seen.frozen_at, 10.0)
    np.testing.assert_array_equal(seen.local, 0.0)


def test_the_aim_says_where_freezing_through_ends_if_it_lies_below_the_freezing_point() -> None:
    body = slab_body()
    assert freezing(body).reach == DEFAULT_REACH == -8.0
    assert freezing(body, reach=-12.0).reach == -12.0
    assert freezing(body, reach=2.0).reach == DEFAULT_REACH
    assert FreezingTimes(Product(body, cooling=False), -12.0).reach == DEFAULT_REACH


def test_a_march_that_stops_on_its_aim_has_reached_it_there() -> None:
    body = slab_body()
    seen = freezing(body, reach=-12.0)
    seen.see(step(body, 0.0, 10.0, WARM, -12.0 + 1e-6))
    np.testing.assert_allclose(seen.frozen_at + seen.local, 10.0, atol=0.01)


def test_a_mix_that_freezes_below_the_default_has_no_local_freezing_time() -> None:
    alcohol = {"kind": "recipe", "sucrose": "18 %", "freezing_point": "-9 degC"}
    body = slab_body(alcohol)
    seen = freezing(body)
    seen.see(step(body, 0.0, 10.0, WARM, -20.0))
    assert not np.any(np.isnan(seen.frozen_at))
    assert np.all(np.isnan(seen.local))


def test_a_table_without_a_freezing_point_freezes_nowhere() -> None:
    rows = {
        "kind": "table",
        "density": "1000 kg/m3",
        "temperature": {"unit": "degC", "values": [-30, -5, 0, 10]},
        "enthalpy": {"unit": "kJ/kg", "values": [-400, -300, 0, 40]},
        "conductivity": {"unit": "W/m/K", "values": [2, 2, 0.5, 0.5]},
    }
    body = slab_body(rows)
    seen = freezing(body)
    seen.see(step(body, 0.0, 10.0, WARM, -20.0))
    assert np.all(np.isnan(seen.frozen_at))


@pytest.mark.parametrize("wall", [STEEL, WATER])
def test_the_mould_does_not_freeze_but_the_product_on_it_does(wall: dict) -> None:
    body = bar_body(wall=wall)
    seen = freezing(body)
    warm, cold = (np.empty(body.size) for _ in range(2))
    for part in body.parts:
        warm[part.hosted], cold[part.hosted] = (part.curve.enthalpy(T) for T in (WARM, -20.0))
    seen.see(Step(moment(0.0, warm), moment(10.0, cold), earlier=None))
    assert set(np.flatnonzero(~np.isnan(seen.frozen_at))) == set(Product(body).nodes)


def test_each_material_of_the_product_has_its_own_freezing_point() -> None:
    sweet = material({**MIX, "sucrose": "30 %"})
    domain = build(bar(cell="2 mm"), 0.083)
    body = Body(replace(domain, product=("product", "wall")), {"product": material(WATER), "wall": sweet})
    seen = freezing(body)
    state = np.empty(body.size), np.empty(body.size)
    for part in body.parts:
        state[0][part.hosted], state[1][part.hosted] = (part.curve.enthalpy(T) for T in (WARM, -20.0))
    seen.see(Step(moment(0.0, state[0]), moment(10.0, state[1]), earlier=None))
    for part in body.parts:
        a, b, x = (float(part.curve.enthalpy(T)) for T in (WARM, -20.0, part.material.freezing_point))
        np.testing.assert_allclose(seen.frozen_at[part.hosted], 10.0 * (a - x) / (a - b), atol=0.01)
