from __future__ import annotations

import numpy as np
import pytest

from fem.curve import Curve
from fem.watch.fronts import Fronts
from fem.watch.level import frozen_share
from fem.watch.product import Product
from fem.watch.schedule import Level, Ray
from tests.pieces import MIX, WATER, bar_body, material, slab_body

ACROSS = Ray.model_validate({"from": ["0 mm", "2 mm"], "to": ["20 mm", "2 mm"]})
BACK = Ray.model_validate({"from": ["20 mm", "2 mm"], "to": ["0 mm", "2 mm"]})


FREEZING_POINT = Level("freezing point")


def fronts(body, level: Level = FREEZING_POINT, **rays: Ray) -> Fronts:
    return Fronts(Product(body), level, rays or {"across": ACROSS})


def half_frozen(body, position: float, start: float = -10.0) -> tuple[np.ndarray, np.ndarray]:
    """Enthalpies of a slab whose ice ends at a depth: each node as frozen as its own stretch is."""
    curve = body.materials["product"].curve
    x = body.domain.points[0]
    cell = 1e-3
    frozen = np.clip((position - (x - cell / 2)) / cell, 0.0, 1.0)
    frozen = np.where(x == 0.0, np.clip(position / (cell / 2), 0.0, 1.0), frozen)
    low, high = curve.enthalpy(-5e-4), curve.enthalpy(5e-4)
    u = high - frozen * (high - low)
    u = np.where(frozen == 1.0, curve.enthalpy(np.minimum(start * (1 - x / position), -1e-2)), u)
    return u, body.temperature(u)


@pytest.mark.parametrize("position", [0.2e-3, 3.0e-3, 3.2e-3, 3.5e-3, 3.8e-3, 12.34e-3])
def test_a_sharp_front_lies_where_the_frozen_heat_says_between_nodes_too(position: float) -> None:
    body = slab_body()
    u, T = half_frozen(body, position)
    assert fronts(body).see(0.0, u, T)["across"][0] == pytest.approx(position, abs=2e-6)


@pytest.mark.parametrize("position", [3.2e-3, 12.34e-3])
def test_from_the_other_end_the_distance_counts_from_there(position: float) -> None:
    body = slab_body()
    u, T = half_frozen(body, position)
    assert fronts(body, back=BACK).see(0.0, u, T)["back"][0] == pytest.approx(0.02 - position, abs=2e-6)


def test_the_nearest_of_several_places_is_taken() -> None:
    body = slab_body()
    u, _ = half_frozen(body, 12.34e-3)
    x = body.domain.points[0]
    u = np.where(x < 2.5e-3, body.materials["product"].curve.enthalpy(3.0), u)
    T = body.temperature(u)
    assert fronts(body).see(0.0, u, T)["across"][0] == pytest.approx(2.5e-3, abs=0.5e-3)
    assert fronts(body, back=BACK).see(0.0, u, T)["back"][0] == pytest.approx(20e-3 - 12.34e-3, abs=2e-6)


@pytest.mark.parametrize("T", [-5.0, 5.0])
def test_no_front_where_all_is_frozen_or_nothing_is(T: float) -> None:
    body = slab_body()
    u = np.full(body.size, float(body.materials["product"].curve.enthalpy(T)))
    assert fronts(body).see(0.0, u, body.temperature(u))["across"] == (None, None)


def test_an_isotherm_is_found_between_nodes() -> None:
    body = slab_body(mix=MIX)
    x = body.domain.points[0]
    T = -10.0 + 700.0 * x
    u = body.materials["product"].curve.enthalpy(T)
    assert fronts(body, Level("temperature", -3.0)).see(0.0, u, T)["across"][0] == pytest.approx(
        0.01, abs=2e-5
    )


def test_a_share_of_ice_is_where_the_material_holds_it() -> None:
    body = slab_body(mix=MIX)
    mix = body.materials["product"]
    T = -10.0 + 700.0 * body.domain.points[0]
    position = fronts(body, Level("ice", 0.3)).see(0.0, mix.curve.enthalpy(T), T)["across"][0]
    assert position is not None
    # A millimetre of cell holds 0.7 K, over which the conductivity bends the profile slightly.
    assert float(mix.ice(-10.0 + 700.0 * position)) == pytest.approx(0.3, abs=0.01)


def test_the_speed_is_that_since_the_last_row() -> None:
    body = slab_body()
    watcher = fronts(body)
    watcher.see(10.0, *half_frozen(body, 3.0e-3))
    assert watcher.see(12.0, *half_frozen(body, 3.6e-3))["across"][1] == pytest.approx(0.3e-3, rel=1e-2)


def test_a_ray_through_the_wall_counts_from_its_first_point_and_sees_only_product() -> None:
    body = bar_body(cell="1 mm")
    ray = Ray.model_validate({"from": ["11.8 mm", "0 mm"], "to": ["0 mm", "0 mm"]})
    x = np.abs(body.domain.points[0])
    T = -20.0 + 1000.0 * (11.8e-3 - x)
    u = body.enthalpy_at(T, np.arange(body.size))
    position = fronts(body, Level("temperature", -12.0), flat=ray).see(0.0, u, T)["flat"][0]
    assert position == pytest.approx(8e-3, abs=2e-6)
    wall_only = fronts(body, Level("temperature", -19.9), flat=ray).see(0.0, u, T)["flat"]
    assert wall_only == (None, None)


def test_a_ray_beside_the_piece_is_refused() -> None:
    ray = Ray.model_validate({"from": ["10.9 mm", "24.9 mm"], "to": ["11.5 mm", "25.5 mm"]})
    with pytest.raises(ValueError, match='ray "off"'):
        fronts(bar_body(), off=ray)


def test_a_narrow_melting_is_a_jump_and_a_recipe_is_not() -> None:
    assert frozen_share(material(WATER).curve, 0.0).sharp
    assert not frozen_share(material(MIX).curve, material(MIX).freezing_point).sharp
    rows = Curve.from_enthalpy([-30, -1.000001, -1, 20], [0, 5e7, 3e8, 3.8e8], [2, 2, 0.5, 0.5])
    assert frozen_share(rows, -1.0).sharp
    assert not frozen_share(rows, -3.0).sharp
