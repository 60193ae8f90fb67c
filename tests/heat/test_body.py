from __future__ import annotations

import numpy as np
import pytest

from fem.heat import forms
from fem.heat.body import Body
from fem.heat.exchange import Fluid
from fem.heat.problem import HeatProblem
from fem.mesh.build import build
from tests.pieces import MIX, STEEL, WATER, bar, bar_body, material, ring, rod, slab


def test_lumped_volumes_fill_the_piece() -> None:
    shape = ring()
    domain = build(shape, None)
    volume = forms.volumes(domain, "product")
    assert volume.min() > 0
    assert volume.sum() == pytest.approx(shape.volumes()["product"], rel=1e-12)


def test_no_node_on_the_axis_is_without_volume() -> None:
    domain = build(rod(), None)
    assert forms.volumes(domain, "product")[domain.points[0] == 0].min() > 0


@pytest.mark.parametrize(
    ("shape", "length"), [(bar(wall=None), 0.08), (rod(), None), (ring(), None), (slab(), 1.0)]
)
def test_assembled_surfaces_equal_those_from_the_edges_alone(shape, length) -> None:
    domain = build(shape, length)
    for name in domain.surfaces:
        np.testing.assert_allclose(
            forms.exposure(domain, name), domain.edge_areas(name), rtol=1e-12, atol=1e-18
        )


@pytest.mark.parametrize("cell", ["0.2425 mm", "0.25 mm", "0.485 mm", "0.7 mm"])
def test_only_nodes_of_a_surface_are_exposed_by_it(cell: str) -> None:
    domain = build(slab(thickness="30 mm", width="2 mm", cell=cell), 1.0)
    exposed = forms.exposure(domain, "left") > 0
    np.testing.assert_array_equal(exposed, domain.points[0] == 0.0)


def test_conduction_between_nodes_creates_no_heat() -> None:
    body = bar_body()
    rng = np.random.default_rng(3)
    T = rng.uniform(-20, 5, body.size)
    u = body.enthalpy_at(T, np.arange(body.size))
    state = body.state(u)
    flow = body.conduction(state)
    assert abs(flow.sum()) < 1e-12 * np.abs(flow).sum()


def test_a_node_on_the_interface_holds_both_materials_at_one_temperature() -> None:
    body = bar_body()
    u = body.enthalpy_at(np.full(body.size, -7.0), np.arange(body.size))
    state = body.state(u)
    np.testing.assert_allclose(state.temperature, -7.0, rtol=1e-12)
    held, _ = body.stored(u, state)
    expected = sum(v.sum() * float(body.materials[r].curve.enthalpy(-7.0)) for r, v in body.volumes.items())
    assert held.sum() == pytest.approx(expected, rel=1e-12)
    assert sum(body.heat(u).values()) == pytest.approx(expected, rel=1e-12)


def test_regions_of_one_material_are_one_part() -> None:
    steel = material(STEEL)
    body = Body(build(bar(), 0.083), {"product": steel, "wall": steel})
    assert body.single
    product, wall = (float(body.heat(np.full(body.size, 2.0))[r]) for r in ("product", "wall"))
    assert product == pytest.approx(2.0 * body.volumes["product"].sum())
    assert wall == pytest.approx(2.0 * body.volumes["wall"].sum())


def test_steady_heat_through_two_layers_follows_their_resistances() -> None:
    # A slab of two materials cannot be meshed as a shape; a ring of the bar's wall can: far from
    # its corners the wall of a wide bar is plane.
    body = bar_body(mix=dict(STEEL, conductivity="0.5 W/m/K"), cell="1 mm")
    problem = HeatProblem(body, {"outside": Fluid(h="100 W/m2/K", coolant="-10 degC")}, 0.0, (-10.0, 0.0))
    u = body.enthalpy_at(np.zeros(body.size), np.arange(body.size))
    look = problem.look(0.0, u)
    assert look.passed[0] == pytest.approx(100.0 * 10.0 * body.exposures["outside"].sum(), rel=1e-12)


@pytest.mark.parametrize("mix", [MIX, WATER])
def test_the_jacobian_is_the_derivative_of_the_residual(mix: dict) -> None:
    body = bar_body(mix=mix)
    problem = HeatProblem(body, {"outside": Fluid(h="250 W/m2/K", coolant="-22 degC")}, 0.0, (-22.0, 4.0))
    rng = np.random.default_rng(5)
    T = -3.0 - 12.0 * np.hypot(*body.domain.points) / 0.028 + 0.0 * rng.uniform(size=body.size)
    u = body.enthalpy_at(T, np.arange(body.size))
    g = 3.0
    look = problem.look(0.0, u)
    step = 1e-4 * look.state.capacity * rng.normal(size=body.size)
    residuals = [v.stored - g * v.rate for v in (problem.look(0.0, u - step), problem.look(0.0, u + step))]
    change = (residuals[1] - residuals[0]) / 2.0
    recovered = problem.correct(look, g, -change)
    alone = np.delete(np.arange(body.size), body.parts[1].nodes)
    # Exact inside each part; along the interface the symmetric matrix is near, not exact.
    np.testing.assert_allclose(
        recovered[alone], step[alone], rtol=0.05, atol=0.05 * np.abs(step[alone]).max()
    )


def test_the_jacobian_of_one_material_is_exact() -> None:
    body = Body(build(bar(wall=None), 0.083), {"product": material(MIX)})
    problem = HeatProblem(body, {"outside": Fluid(h="250 W/m2/K", coolant="-22 degC")}, 0.0, (-22.0, 4.0))
    T = -3.0 - 12.0 * np.hypot(*body.domain.points) / 0.028
    u = body.enthalpy_at(T, np.arange(body.size))
    look = problem.look(0.0, u)
    step = 1e-5 * look.state.capacity * np.random.default_rng(5).normal(size=body.size)
    residuals = [v.stored - 3.0 * v.rate for v in (problem.look(0.0, u - step), problem.look(0.0, u + step))]
    recovered = problem.correct(look, 3.0, (residuals[0] - residuals[1]) / 2.0)
    np.testing.assert_allclose(recovered, step, rtol=1e-2, atol=1e-3 * np.abs(step).max())


def test_settling_finds_the_state_that_holds_an_amount_exactly() -> None:
    body = bar_body()
    problem = HeatProblem(body, {"outside": Fluid(h="250 W/m2/K", coolant="-22 degC")}, 0.0, (-22.0, 4.0))
    u = body.enthalpy_at(np.full(body.size, -1.5), np.arange(body.size))
    look = problem.look(0.0, u)
    wanted = look.stored * (1 + 1e-3 * np.sin(np.arange(body.size)))
    settled = problem.settle(wanted, look)
    np.testing.assert_allclose(body.stored(settled, body.state(settled))[0], wanted, rtol=1e-12)
