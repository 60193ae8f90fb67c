from __future__ import annotations

import json
import math

import numpy as np
import pytest
from click.testing import CliRunner

from fem.case.read import load, loads
from fem.cli import rimefront
from fem.exact import InwardFreezing, Neumann
from fem.march.control import ACCURACIES
from fem.mesh.build import build
from fem.mesh.level import coarse_cells
from fem.mesh.shape import Bar, MeshShape
from fem.run import run
from fem.series.refine import Refined, extrapolate, refine
from fem.series.truth import plane
from fem.series.truth import texts as exact
from tests.conftest import CASES
from tests.pieces import SMALL, small

STANDARD = 'accuracy = "standard"'


def text(*args: object, **keys: object) -> str:
    return exact.text(*args, **keys).replace('accuracy = "tight"', STANDARD)  # type: ignore[arg-type]


def number(numbers: tuple[Refined, ...], name: str) -> Refined:
    return next(n for n in numbers if n.quantity.startswith(name))


def wall(material: str, front: str, cell: float) -> str:
    """A half space that freezes from a wall at -25 degC, from +5 degC."""
    return text(
        'section = "plane"\nlength = "1 m"\nstart_temperature = "5 degC"',
        f'form = "slab"\nthickness = "40 mm"\nwidth = "2 mm"\ncell = ["{cell} m", "2 mm"]',
        material,
        {"left": 'exchange = "fixed"\ntemperature = "-25 degC"'},
        240.0,
        f'front = "{front}"\n[watch.rays]\ndepth = {{ from = ["0 mm", "1 mm"], to = ["36 mm", "1 mm"] }}',
    )


def judged_fronts(case: str) -> list[tuple[float, Refined]]:
    found = [n for n in refine(loads(case)).numbers if n.quantity.startswith("front on depth at ")]
    assert len(found) == 3
    return [(float(n.quantity.split()[-2]), n) for n in found]


def test_the_error_of_neumanns_front_is_within_what_is_stated() -> None:
    # Carslaw & Jaeger 1959, section 11.2 (form from memory).
    law = Neumann(exact.WATER, -25.0, 5.0)
    for time, n in judged_fronts(wall(exact.melting(exact.WATER), "freezing point", 0.5e-3)):
        true = 1e3 * float(law.front(np.array([time]))[0])
        assert abs(n.value - true) <= n.error, n
        assert abs(n.as_run - true) <= n.as_run_error, n
        assert n.error < 0.02 * true


def test_the_error_of_a_recipes_front_is_within_what_is_stated() -> None:
    """The similarity solution for the recipe's own curves."""
    mix = loads(wall(plane.RECIPE, "-6 degC", 1e-3)).materials["material"].build()
    from fem.exact import Similarity

    law = Similarity(mix.curve.enthalpy, mix.curve.conductivity, -25.0, 5.0, breaks=mix.curve.T)
    for time, n in judged_fronts(wall(plane.RECIPE, "-6 degC", 0.5e-3)):
        true = 1e3 * float(law.front(-6.0, np.array([time]))[0])
        assert abs(n.value - true) <= n.error, n
        assert abs(n.as_run - true) <= n.as_run_error, n
        assert n.error < 0.03 * true


@pytest.mark.parametrize("ste", [0.1, 0.2, 0.5])
def test_the_error_of_a_cylinders_total_time_is_within_what_is_stated(ste: float) -> None:
    """Front-fixing solution of the one-phase cylinder; at Ste = 0.2 tau = 1.408660."""
    radius, water = 0.02, exact.WATER
    total = InwardFreezing("cylinder", ste).total * radius**2 * water.rho * water.c_s / water.k_s
    T_w = -ste * water.latent_heat / water.c_s
    case = text(
        'section = "axisymmetric"\nstart_temperature = "0 degC"',
        f'form = "rod"\nradius = "{radius} m"\nheight = "2 mm"\ncell = ["0.5 mm", "2 mm"]',
        exact.melting(water),
        {"side": f'exchange = "fixed"\ntemperature = "{T_w} degC"'},
        1.2 * total,
        "",
        '[aim]\nreach = "-0.01 degC"',
    )
    n = number(refine(loads(case)).numbers, "time to the aim")
    assert abs(n.value - total) <= n.error, (n, total)
    assert abs(n.as_run - total) <= n.as_run_error
    assert n.error < 0.02 * total


def test_a_small_bar_is_refined_in_cells_and_steps_together() -> None:
    case = small("shape.cell=0.75 mm")
    found = refine(case)
    coarse, middle, fine = found.levels
    assert coarse.nodes < middle.nodes / 2 < fine.nodes / 4
    assert coarse.steps < middle.steps < fine.steps
    assert [level.cell_m[0] / fine.cell_m[0] for level in found.levels] == pytest.approx([4, 2, 1])
    assert coarse.tolerance / middle.tolerance == pytest.approx(8)
    time = number(found.numbers, "time to the aim")
    assert time.as_run == pytest.approx(run(case, numerical_error=False).summary["aim"]["time_s"], rel=1e-9)
    assert 0.0 < time.error < 0.01 * time.value
    assert {n.quantity.split(" at ")[0] for n in found.numbers} == {
        "time to the aim",
        "front on flat",
        "heat removed",
    }


def test_a_mesh_file_is_split_and_keeps_its_names() -> None:
    shape = load(CASES / "fluted_bar.toml").shape
    assert isinstance(shape, MeshShape)
    file, halves = (build(shape.model_copy(update={"split": n}), 0.1) for n in (0, 1))
    assert halves.mesh.t.shape[1] == 4 * file.mesh.t.shape[1]
    assert set(halves.regions) == set(file.regions)
    for region, area in file.areas.items():
        assert halves.areas[region] == pytest.approx(area, rel=1e-12)
    for surface in file.surfaces:
        assert len(np.unique(halves.surfaces[surface])) == 2 * len(file.surfaces[surface])
        assert halves.edge_areas(surface).sum() == pytest.approx(file.edge_areas(surface).sum(), rel=1e-12)
    assert halves.quality > 0.5 * file.quality


def test_cells_of_a_bar_halve_without_a_remainder() -> None:
    shape = Bar.model_validate({"thickness": "22 mm", "width": "50 mm", "corner": "6 mm", "cell": "0.8 mm"})
    across, along = coarse_cells(shape)
    assert across == along
    assert 22e-3 / 4 / across == pytest.approx(round(22e-3 / 4 / across))


# Judging three values.


def test_second_order_is_seen_and_taken_off() -> None:
    limit = extrapolate(*(10.0 + 0.3 * h**2 for h in (4.0, 2.0, 1.0)))
    assert limit.order == pytest.approx(2.0)
    assert limit.value == pytest.approx(10.0)
    assert limit.error == pytest.approx(1.25 * 0.3)


def test_an_order_beyond_two_is_not_used() -> None:
    limit = extrapolate(*(10.0 + 0.3 * h**3 for h in (4.0, 2.0, 1.0)))
    assert limit.order == pytest.approx(3.0)
    assert abs(limit.value - 10.0) <= limit.error
    assert limit.error == pytest.approx(1.25 * 0.3 * 7 / 3)


@pytest.mark.parametrize(
    ("values", "said"),
    [
        ((10.0, 11.0, 10.5), "do not go one way"),
        ((10.0, 10.0, 11.0), "do not go one way"),
        ((10.0, 11.0, 12.0), "0 would be seen"),
        ((10.0, 11.0, 13.0), "-1 would be seen"),
        ((10.0, 26.0, 27.0), "4 would be seen"),
    ],
)
def test_no_order_is_claimed_where_there_is_none(values: tuple[float, float, float], said: str) -> None:
    limit = extrapolate(*values)
    assert limit.order is None
    assert said in limit.why
    assert limit.value == values[-1]
    assert limit.error == pytest.approx(2.0 * (max(values) - min(values)))


def test_without_an_order_the_bound_holds_for_any_that_is_believed() -> None:
    for order in np.linspace(0.5, 3.5, 13):
        values = [5.0 + h**order for h in (4.0, 2.0, 1.0)]
        assert 2.0 * (max(values) - min(values)) >= abs(values[-1] - 5.0)


def test_levels_that_agree_state_the_least_error() -> None:
    limit = extrapolate(3.0, 3.0, 3.0, least=1e-3)
    assert (limit.order, limit.value, limit.error) == (None, 3.0, 1e-3)


# What a plain run says of its own error.


@pytest.mark.parametrize(
    ("name", "true"),
    [
        # Runs on cells of a third or a quarter with a 64th of the tolerance or less.
        ("tube_in_brine", 963.29),
        ("tube_in_blast", 2986.67),
        ("tube_at_home", 19270.6),
        ("workshop_bar", 1157.49),
        ("factory_bar", 410.82),
        ("fruit_bar", 1254.13),
        ("mould_swap", 2069.97),
    ],
)
def test_a_plain_run_states_an_error_that_covers_the_true_one(name: str, true: float) -> None:
    summary = run(load(CASES / f"{name}.toml"), ranges=False).summary
    time, stated = summary["aim"]["time_s"], summary["numerical_error"]
    assert abs(time - true) <= stated["time_s"] <= 5e-3 * time
    assert "twice as wide" in stated["how"]


def test_the_error_of_a_mesh_file_counts_its_cells() -> None:
    stated = run(load(CASES / "fluted_bar.toml"), ranges=False).summary
    refined = run(
        load(CASES / "fluted_bar.toml", ["shape.split=1", "stepping.tolerance=0.02 %"]),
        ranges=False,
        numerical_error=False,
    ).summary
    assert refined["numerical_error"] is None
    gap = abs(stated["aim"]["time_s"] - refined["aim"]["time_s"])
    assert gap <= stated["numerical_error"]["time_s"] <= 5e-3 * stated["aim"]["time_s"]


def test_where_no_aim_is_met_no_error_of_a_time_is_stated() -> None:
    summary = run(small("aim.reach=-21.9 degC"), ranges=False).summary
    assert summary["numerical_error"]["time_s"] is None
    assert summary["numerical_error"]["heat_removed_J"] > 0.0


def test_a_tolerance_of_its_own_takes_the_place_of_the_accuracys() -> None:
    assert small("stepping.tolerance=0.1 %").stepping.control().tolerance == pytest.approx(1e-3)
    assert small().stepping.control().tolerance == ACCURACIES["standard"].tolerance


def test_the_command_prints_a_table_and_json(tmp_path) -> None:
    path = tmp_path / "pop.toml"
    path.write_text(SMALL, encoding="utf-8")
    done = CliRunner().invoke(rimefront, ["refine", str(path), "--json"])
    assert done.exit_code == 0, done.output
    said = json.loads(done.stdout)
    assert said["numbers"][0]["quantity"] == "time to the aim"
    assert math.isfinite(said["numbers"][0]["error"])
    assert "off by at most" in done.stderr
