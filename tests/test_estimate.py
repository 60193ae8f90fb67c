"""Hand estimates of whole cases, against the same worked by hand and against the runs."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest

from fem import handbook
from fem.case.read import load, loads
from fem.estimate.by_hand import estimates
from fem.estimate.conditions import NoMethod, Simple, cooling_of, depth, simple_of
from fem.estimate.outlook import outlook, resistances, seconds
from fem.plan import Plan
from fem.run import run
from tests.conftest import CASES
from tests.pieces import SMALL, small


def by_hand(plan: Plan) -> dict[str, dict[str, Any]]:
    return {estimate["method"]: estimate for estimate in estimates(plan)}


# Worked by hand for the demo scenario, with k = 1.70 W/m/K where ours is the material's own (values
# from memory, no published source).
@pytest.mark.parametrize(
    ("name", "time"),
    [
        ("workshop_bar", 1130.0),
        ("factory_bar", 427.0),
        ("tube_in_brine", 1000.0),
        ("tube_in_blast", 3110.0),
        ("fruit_bar", 1024.0),
    ],
)
def test_phams_method_gives_what_was_worked_by_hand(name: str, time: float) -> None:
    found = by_hand(Plan.of(load(CASES / f"{name}.toml")))
    assert found["Pham"]["time_s"] == pytest.approx(time, rel=0.015)
    assert 0.6 * time < found["Plank"]["time_s"] < found["Pham"]["time_s"]


@pytest.mark.parametrize("name", ["workshop_bar", "factory_bar", "tube_in_brine"])
def test_the_run_lies_above_planks_bound_and_near_phams_time(name: str) -> None:
    summary = run(load(CASES / f"{name}.toml")).summary
    found = {estimate["method"]: estimate for estimate in summary["estimates"]}
    time = summary["aim"]["time_s"]
    assert found["Plank"]["time_s"] < time
    assert found["Pham"]["in_range"]
    # Pham states 10 %.
    assert found["Pham"]["time_s"] == pytest.approx(time, rel=0.10)


def test_planks_bound_of_a_bar_is_its_slabs_over_the_shape_factor() -> None:
    plan = Plan.of(load(CASES / "workshop_bar.toml"))
    mix = plan.body.materials["product"]
    k = float(mix.curve.conductivity(-15.0))
    U = 1.0 / (1.0 / 250.0 + 0.8e-3 / 16.0)
    slab = mix.latent_heat(-10.0) / (mix.freezing_point + 22.0) * (0.5 * 0.022 / U + 0.022**2 / 8.0 / k)  # type: ignore[operator]
    factor = handbook.shape_factor(50.0 / 22.0, U * 0.022 / k)
    assert by_hand(plan)["Plank"]["time_s"] == pytest.approx(slab / factor, rel=1e-9)


def test_a_soft_mix_is_said_to_take_longer_than_by_hand() -> None:
    found = by_hand(Plan.of(load(CASES / "fruit_bar.toml")))["Pham"]
    assert not found["in_range"]
    assert any("49 % of the mass is ice at -12 degC" in remark for remark in found["remarks"])
    firm = by_hand(Plan.of(load(CASES / "workshop_bar.toml")))["Pham"]
    assert not any("is ice" in remark for remark in firm["remarks"])


def slab(surfaces: str, size: str = 'thickness = "20 mm"\nwidth = "60 mm"\ncell = "2 mm"') -> Plan:
    text = SMALL.split("[shape]")[0] + f'[shape]\nform = "slab"\n{size}\n[regions]\nproduct = "mix"\n'
    text += '[materials.mix]\nkind = "recipe"\nsucrose = "18 %"\n[[stages]]\nname = "freeze"\nlasts = "1 h"\n'
    return Plan.of(loads(text + surfaces + '[aim]\nreach = "-12 degC"\n'))


def fluid(*names: str, h: float = 100.0, coolant: float = -30.0) -> str:
    return "".join(
        f'[stages.surfaces.{n}]\nexchange = "fluid"\nh = "{h} W/m2/K"\ncoolant = "{coolant} degC"\n'
        for n in names
    )


@pytest.mark.parametrize(
    ("names", "shape", "half", "beta"),
    [
        (("left", "right"), "slab", 0.010, 1.0),
        (("left",), "slab", 0.020, 1.0),
        (("bottom", "top"), "slab", 0.030, 1.0),
        (("left", "right", "bottom", "top"), "bar", 0.010, 3.0),
        (("left", "bottom", "top"), "bar", 0.020, 1.5),
    ],
)
def test_a_slab_is_what_its_cold_sides_make_it(
    names: tuple[str, ...], shape: str, half: float, beta: float
) -> None:
    plan = slab(fluid(*names))
    found = simple_of(plan, cooling_of(plan))
    assert (found.shape, found.half, found.beta) == (shape, pytest.approx(half), pytest.approx(beta))


def test_a_slab_cooled_from_one_side_takes_as_long_as_one_of_twice_its_thickness() -> None:
    double = 'thickness = "40 mm"\nwidth = "60 mm"\ncell = "2 mm"'
    one, two = slab(fluid("left")), slab(fluid("left", "right"), double)
    for method in ("Plank", "Pham"):
        assert by_hand(one)[method]["time_s"] == pytest.approx(by_hand(two)[method]["time_s"])


def test_a_round_bar_is_a_cylinder_and_a_rod_with_far_ends_too() -> None:
    bar = Plan.of(small("shape.thickness=24 mm", "shape.corner=12 mm"))
    assert simple_of(bar, cooling_of(bar)).shape == "cylinder"
    tube = Plan.of(load(CASES / "tube_in_brine.toml"))
    round_tube = simple_of(tube, cooling_of(tube))
    assert (round_tube.shape, round_tube.half) == ("cylinder", 0.014)


def rod(height: str, *names: str) -> Plan:
    text = SMALL.split("[shape]")[0].replace(
        'section = "plane"\nlength = "50 mm"', 'section = "axisymmetric"'
    )
    text += f'[shape]\nform = "rod"\nradius = "14 mm"\nheight = "{height}"\ncell = "2 mm"\n'
    text += '[regions]\nproduct = "mix"\n[materials.mix]\nkind = "recipe"\nsucrose = "18 %"\n'
    return Plan.of(
        loads(f'{text}[[stages]]\nname = "freeze"\nlasts = "1 h"\n{fluid(*names)}[aim]\nreach = "-12 degC"\n')
    )


def test_the_ends_of_a_long_rod_are_left_out_and_said_so() -> None:
    found = by_hand(rod("180 mm", "side", "bottom", "top"))["Pham"]
    assert found["time_s"] == pytest.approx(by_hand(rod("180 mm", "side"))["Pham"]["time_s"])
    assert "its ends are left out" in found["remarks"]
    (short,) = estimates(rod("40 mm", "side", "bottom", "top"))
    assert "a short rod" in short["remarks"][0]


def test_a_rod_that_freezes_from_its_ends_is_a_slab() -> None:
    plan = rod("40 mm", "bottom", "top")
    assert simple_of(plan, cooling_of(plan)) == Simple("slab", 0.020)


@pytest.mark.parametrize(
    ("plan", "words"),
    [
        (lambda: slab(fluid("left") + fluid("right", h=50.0)), "different conditions"),
        (lambda: slab(fluid("left") + fluid("right", coolant=-20.0)), "different conditions"),
        (lambda: slab(""), "no stage cools"),
        (lambda: slab('[stages.surfaces.left]\nexchange = "flux"\nflux = "500 W/m2"\n'), "no stage cools"),
        (lambda: Plan.of(small("piece.start_temperature=-25 degC")), "thawing"),
        (lambda: Plan.of(load(CASES / "slab_neumann.toml")), "has no aim"),
        (lambda: Plan.of(load(CASES / "fluted_bar.toml")), "a shape from a mesh file"),
    ],
)
def test_where_no_method_applies_the_reason_is_said(plan: Any, words: str) -> None:
    (found,) = estimates(plan())
    assert (found["time_s"], found["in_range"]) == (None, False)
    assert words in found["remarks"][0]


def test_a_coolant_that_is_too_warm_for_the_aim_is_said_by_each_method() -> None:
    found = by_hand(Plan.of(small("stages.freeze.surfaces.outside.coolant=-10 degC")))
    assert found["Pham"]["time_s"] is None
    assert "has to be above coolant" in found["Pham"]["remarks"][0]
    assert found["Plank"]["time_s"] > 0


def test_a_coolant_that_changes_counts_with_its_mean() -> None:
    ramp = '{ time = { unit = "min", values = [0, 10] }, value = { unit = "degC", values = [-18, -26] } }'
    text = SMALL.replace('coolant = "-22 degC"', f"coolant = {ramp}")
    slower = ramp.replace("degC", "W/m2/K").replace("-18, -26", "300, 200")
    text = text.replace('h = "250 W/m2/K"', f"h = {slower}")
    changing, steady = Plan.of(small(text=text)), Plan.of(small())
    assert cooling_of(changing).coolant == pytest.approx(-22.0)
    assert by_hand(changing)["Pham"]["time_s"] == pytest.approx(by_hand(steady)["Pham"]["time_s"])
    assert any("means over the stage" in remark for remark in by_hand(changing)["Pham"]["remarks"])


def test_of_several_stages_the_longest_that_reaches_the_aim_counts() -> None:
    text = SMALL.split("[[stages]]")[0]
    for name, lasts, coolant in (("chill", 30, -5), ("freeze", 20, -30), ("air", 5, -35)):
        text += f'[[stages]]\nname = "{name}"\nlasts = "{lasts} min"\n{fluid("outside", coolant=coolant)}'
    plan = Plan.of(loads(text + '[aim]\nreach = "-12 degC"\n'))
    assert cooling_of(plan).stage == "freeze"
    assert "of stage freeze alone" in by_hand(plan)["Pham"]["remarks"]


def test_radiation_counts_as_a_film_beside_the_air() -> None:
    plan = Plan.of(load(CASES / "tube_at_home.toml"))
    cooling = cooling_of(plan)
    # 4 eps sigma T3 at 255 K is 3.8 eps W/m2/K, and the air of the case comes on top.
    exchange = plan.case.stages[0].surfaces["side"]
    air, emissivity = exchange.h.at(0.0), exchange.emissivity  # type: ignore[attr-defined]
    assert cooling.h == pytest.approx(air + 3.77 * emissivity, rel=0.02)


def test_the_core_of_any_shape_lies_as_deep_as_its_outside_is_far() -> None:
    for name, deep in (("workshop_bar", 11e-3), ("fluted_bar", 12.6e-3)):
        plan = Plan.of(load(CASES / f"{name}.toml"))
        assert depth(plan, cooling_of(plan)) == pytest.approx(deep, rel=5e-3)


def test_resistances_are_film_wall_and_half_the_half_thickness() -> None:
    plan = Plan.of(load(CASES / "workshop_bar.toml"))
    found = resistances(plan, cooling_of(plan))
    k = float(plan.body.materials["product"].curve.conductivity(-15.0))
    assert list(found) == ["product", "wall", "coolant film"]
    assert found == pytest.approx(
        {"product": 0.011 / (2 * k), "wall": 0.8e-3 / 16.0, "coolant film": 1.0 / 250.0}
    )
    # The wall of a mesh file is told by its volume; through its middle line it is as thick as drawn.
    mesh = Plan.of(load(CASES / "fluted_bar.toml"))
    assert resistances(mesh, cooling_of(mesh))["wall"] == pytest.approx(0.8e-3 / 16.0, rel=0.04)


def test_a_surface_that_is_held_has_no_film() -> None:
    said = outlook(load(CASES / "slab_neumann.toml"))
    assert said["biot"] is None
    assert said["resistances_m2K_per_W"]["coolant film"] == 0.0
    assert said["depth_m"] == pytest.approx(0.080)


def test_the_time_of_a_run_grows_with_its_nodes_and_stages() -> None:
    coarse, fine = (
        Plan.of(load(CASES / "workshop_bar.toml", (f"shape.cell={c}",))) for c in ("1 mm", "0.3 mm")
    )
    assert seconds(fine) > 3 * seconds(coarse) - 1.5
    assert 0.2 < seconds(coarse) < 3.0


def test_nothing_is_marched(monkeypatch: pytest.MonkeyPatch) -> None:
    from fem.heat.problem import HeatProblem

    def begin(*_: object) -> None:
        raise AssertionError("a problem of heat in time was set up")

    monkeypatch.setattr(HeatProblem, "__init__", begin)
    assert outlook(load(CASES / "workshop_bar.toml"))["mesh"]["nodes"] > 1000


def test_a_thawing_case_is_no_mistake() -> None:
    said = outlook(small("piece.start_temperature=-25 degC"))
    assert said["resistances_m2K_per_W"] == {}
    with pytest.raises(NoMethod, match="thawing"):
        cooling_of(Plan.of(small("piece.start_temperature=-25 degC")))
    assert np.isfinite(said["effort"]["seconds"])
