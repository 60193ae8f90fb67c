from __future__ import annotations

import math

import numpy as np
import pytest

from fem.exact import quasi_steady as exact
from fem.heat.body import Body
from fem.heat.exchange import EXCHANGES
from fem.heat.quasi_steady import Film, NeverFreezes, QuasiSteady
from fem.mesh.build import build
from fem.mesh.shape import Bar, Ring, Rod, Slab
from tests.pieces import STEEL, WATER, bar_body, material, small

# A piece 2 cm thick, so that the half smallest dimension is 1 cm.
HALF = 0.01
T_F, T_C = 0.0, -10.0


def body_of(shape: Bar | Slab | Rod | Ring) -> Body:
    length = None if isinstance(shape, (Rod, Ring)) else 0.1
    return Body(build(shape, length), {region: material(WATER) for region in shape.regions()})


def rod_of_sides(width: float, cell: float) -> Bar:
    return Bar.model_validate(
        {"thickness": f"{2 * HALF} m", "width": f"{2 * HALF * width} m", "cell": f"{cell} m"}
    )


def round_rod(height: float, cell: float) -> Rod:
    return Rod.model_validate({"radius": f"{HALF} m", "height": f"{height} m", "cell": f"{cell} m"})


def factor(body: Body, surfaces: tuple[str, ...], biot: float = math.inf, k: float = 2.2) -> float:
    """Return k phi_max over the half smallest dimension squared [-]."""
    film = Film(biot * k / HALF, T_C)
    films = dict.fromkeys(surfaces, film)
    return k * QuasiSteady.of(body, films, dict.fromkeys(body.materials, k), T_F).phi / HALF**2


# The digits: computed from the series of each problem, independently of the program.
SHAPES = {
    "square rod, held": (lambda c: rod_of_sides(1.0, c), ("outside",), math.inf, 0.29468541),
    "rod 1 x 2, held": (lambda c: rod_of_sides(2.0, c), ("outside",), math.inf, 0.45548732),
    "square rod, Bi = 1": (lambda c: rod_of_sides(1.0, c), ("outside",), 1.0, 0.8216849),
    "rod 1 x 2, Bi = 1": (lambda c: rod_of_sides(2.0, c), ("outside",), 1.0, 1.2098261),
    # Half of a cylinder as high as wide: its middle plane is insulated.
    "cylinder H = D, held": (lambda c: round_rod(HALF, c), ("side", "top"), math.inf, 0.20066348),
    "cylinder H = D, Bi = 1": (lambda c: round_rod(HALF, c), ("side", "top"), 1.0, 0.5550066),
    "cylinder H = 2 D, Bi = 10": (lambda c: round_rod(2 * HALF, c), ("side", "top"), 10.0, 0.2930708),
    "long cylinder, held": (lambda c: round_rod(2e-3, c), ("side",), math.inf, 0.25),
    "long cylinder, Bi = 0.1": (lambda c: round_rod(2e-3, c), ("side",), 0.1, 5.25),
}


@pytest.mark.parametrize("name", SHAPES)
def test_the_potential_has_its_published_digits_and_comes_to_them_at_second_order(name: str) -> None:
    shape, surfaces, biot, digits = SHAPES[name]
    errors = [abs(factor(body_of(shape(HALF / n)), surfaces, biot) / digits - 1.0) for n in (8, 16, 32)]
    assert errors[-1] < 5e-3
    rates = np.diff(-np.log2(errors))
    # Second order; on the axis, where the area goes to 0, h2 log h, which shows as 1.8.
    assert np.all((rates > 1.75) & (rates < 2.2)), (errors, rates)


@pytest.mark.parametrize("biot", [0.5, math.inf])
def test_a_slab_is_exact_at_its_nodes(biot: float) -> None:
    slab = Slab.model_validate({"thickness": "20 mm", "width": "2 mm", "cell": "1 mm"})
    ours = factor(body_of(slab), ("left", "right"), biot)
    assert ours == pytest.approx(exact.slab(HALF, biot) / HALF**2, rel=1e-9)


def test_sides_of_different_films_add_up_as_resistances_of_a_slab_do() -> None:
    slab = Slab.model_validate({"thickness": "20 mm", "width": "2 mm", "cell": "0.1 mm"})
    k, h = 2.2, (400.0, 25.0)
    films = {"left": Film(h[0], T_C), "right": Film(h[1], T_C)}
    found = QuasiSteady.of(body_of(slab), films, {"product": k}, T_F)
    # -k phi'' = 1 with a film on either side: the vertex of a parabola.
    D = 2 * HALF
    q = (D / h[1] + D * D / (2 * k)) / (1 / h[0] + 1 / h[1] + D / k)
    assert found.phi == pytest.approx(q / h[0] + q * q / (2 * k), rel=1e-4)


def test_a_mould_wall_counts_as_the_resistance_that_it_is() -> None:
    """A bar so wide that it is flat: wall and film in series, 1/U = 1/h + d/k_w."""
    k, k_w, h, wall, D = 2.2, 0.35, 250.0, 2e-3, 40e-3
    shape = Bar.model_validate(
        {"thickness": f"{D} m", "width": "400 mm", "wall": f"{wall} m", "cell": "2.5 mm"}
    )
    body = Body(build(shape, 0.1), {"product": material(WATER), "wall": material(STEEL)})
    found = QuasiSteady.of(body, {"outside": Film(h, T_C)}, {"product": k, "wall": k_w}, T_F)
    U = 1.0 / (1.0 / h + wall / k_w)
    assert found.phi == pytest.approx(exact.slab(D / 2, U * D / 2 / k) / k, rel=2e-3)
    assert body.domain.points[0, found.node] == pytest.approx(0.0, abs=1e-12)


def test_a_ring_about_an_insulated_hole() -> None:
    """A ring of product about an insulated hole, closed in the radius and its logarithm."""
    k, h = 2.2, 300.0
    ring = Ring.model_validate({"inner": "4 mm", "outer": "14 mm", "height": "2 mm", "cell": "0.25 mm"})
    found = QuasiSteady.of(body_of(ring), {"outside": Film(h, T_C)}, {"product": k}, T_F)
    a, b = 4e-3, 14e-3
    closed = (b * b - a * a) / (2 * b * h) + ((b * b - a * a) / 4 - a * a / 2 * math.log(b / a)) / k
    assert found.phi == pytest.approx(closed, rel=5e-4)


def test_two_coolants_meet_where_the_two_fronts_of_a_slab_do() -> None:
    """Fronts from two walls at different temperatures: each goes as the root of its own difference."""
    slab = Slab.model_validate({"thickness": "20 mm", "width": "2 mm", "cell": "0.1 mm"})
    k, latent, cold, mild = 2.2, 3.34e8, -20.0, -5.0
    films = {"left": Film(math.inf, cold), "right": Film(math.inf, mild)}
    found = QuasiSteady.of(body_of(slab), films, {"product": k}, T_F)
    depth = [math.sqrt(-2.0 * k * T / latent) for T in (cold, mild)]
    assert found.time(latent, T_F) == pytest.approx((20e-3 / sum(depth)) ** 2, rel=1e-3)


def test_a_flux_takes_heat_off_beside_a_coolant() -> None:
    slab = Slab.model_validate({"thickness": "20 mm", "width": "2 mm", "cell": "0.1 mm"})
    k, latent, h, flux = 2.2, 3.34e8, 200.0, 300.0
    films = {"left": Film(h, T_C), "right": Film(0.0, 0.0, flux)}
    found = QuasiSteady.of(body_of(slab), films, {"product": k}, T_F)

    def frozen(time: float) -> float:
        left = k * (math.sqrt(1 / h**2 + 2 * -T_C * time / (k * latent)) - 1 / h)
        return left + flux * time / latent - 20e-3

    time = found.time(latent, T_F)
    assert frozen(0.999 * time) < 0.0 < frozen(1.001 * time)


@pytest.mark.parametrize(
    ("films", "said"),
    [
        ({}, "no surface carries heat off"),
        ({"left": Film(0.0, 0.0, 100.0)}, "no surface carries heat off"),
        ({"left": Film(10.0, -5.0), "right": Film(10.0, 20.0)}, "never freezes"),
    ],
)
def test_what_never_freezes_through_is_refused_in_a_sentence(films: dict[str, Film], said: str) -> None:
    slab = Slab.model_validate({"thickness": "20 mm", "width": "2 mm", "cell": "1 mm"})
    with pytest.raises(NeverFreezes, match=said):
        QuasiSteady.of(body_of(slab), films, {"product": 2.2}, T_F)


def test_the_solver_of_the_march_is_left_as_good_as_it_was() -> None:
    body = bar_body()
    films = {"outside": Film(250.0, -22.0)}
    first, second = (QuasiSteady.of(body, films, {"product": 1.6, "wall": 16.0}, -1.5).phi for _ in range(2))
    assert first == second


def exchange(kind: str, **keys: object) -> Film | None:
    return Film.of(EXCHANGES[kind].model_validate({"exchange": kind, **keys}), 600.0)


def test_films_of_exchanges() -> None:
    assert exchange("insulated") is None
    assert exchange("fluid", h="250 W/m2/K", coolant="-22 degC") == Film(250.0, -22.0)
    assert exchange("fixed", temperature="-22 degC") == Film(math.inf, -22.0)
    assert exchange("flux", flux="500 W/m2") == Film(0.0, 0.0, 500.0)
    radiant = exchange("radiant", emissivity="0.9", surroundings="-18 degC")
    # Slope of the fourth power at the surroundings, constant of Stefan and Boltzmann (CODATA 2018).
    assert radiant.h == pytest.approx(0.9 * 4 * 5.670374419e-8 * 255.15**3, rel=1e-9)
    ramp = {"time": {"unit": "s", "values": [0, 600]}, "value": {"unit": "degC", "values": [-20, -30]}}
    changing = exchange("fluid", h="250 W/m2/K", coolant=ramp)
    assert changing.coolant == pytest.approx(-25.0)
    assert not changing.steady


NEARLY_STEADY = """
schema = 1
title = "Water at its freezing point, Ste = 0.01"
[piece]
section = "plane"
length = "100 mm"
start_temperature = "0 degC"
[shape]
form = "bar"
thickness = "20 mm"
width = "30 mm"
corner = "4 mm"
wall = "1 mm"
cell = "1 mm"
[regions]
product = "water"
wall = "plastic"
[materials.water]
kind = "melting"
melting_point = "0 degC"
latent_heat = "334 kJ/kg"
density = "1000 kg/m3"
solid = { conductivity = "2.2 W/m/K", heat_capacity = "2050 J/kg/K" }
liquid = { conductivity = "0.56 W/m/K", heat_capacity = "4200 J/kg/K" }
[materials.plastic]
kind = "plain"
density = "905 kg/m3"
heat_capacity = "1800 J/kg/K"
conductivity = "0.22 W/m/K"
[[stages]]
name = "freeze"
lasts = "60 h"
until = "slowest <= -0.01 degC"
[stages.surfaces.outside]
exchange = "fluid"
h = "400 W/m2/K"
coolant = "-1.6293 degC"
[watch]
every = "1 h"
frames = "10 h"
[aim]
reach = "-0.01 degC"
"""


def test_a_run_at_a_small_stefan_number_takes_the_limit() -> None:
    """Ste = c (T_f - T_c) / L = 0.01: at most 1 % above the limit, whatever the shape."""
    from fem.plan import Plan
    from fem.run import run

    case = small(text=NEARLY_STEADY)
    plan = Plan.of(case)
    film = Film.of(case.stages[0].surfaces["outside"], 3600.0)
    found = QuasiSteady.of(plan.body, {"outside": film}, {"product": 2.2, "wall": 0.22}, 0.0)
    limit = found.time(334e6, 0.0)
    summary = run(case, ranges=False, numerical_error=False).summary
    assert limit < summary["aim"]["time_s"] < 1.01 * limit
    estimate = next(e for e in summary["estimates"] if e["method"] == "Poisson")
    assert estimate["limit_s"] == pytest.approx(limit, rel=1e-9)
    assert estimate["ratio"] == pytest.approx(1.0, abs=0.01)
