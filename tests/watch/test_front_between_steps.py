from __future__ import annotations

import numpy as np
import pytest

from fem.exact import Neumann, SharpFreezing
from fem.heat.exchange import Fixed
from fem.heat.problem import HeatProblem
from fem.march.control import Control
from fem.march.march import Effort, begin, march
from fem.watch.fronts import Fronts
from fem.watch.product import Product
from fem.watch.schedule import Level, Ray
from tests.pieces import WATER, slab_body

# The water of `WATER`; the front is judged from 5 to 15 mm, as in `rimefront verify`.
LAW = Neumann(
    SharpFreezing(k_s=2.2, c_s=2050.0, k_l=0.56, c_l=4200.0, rho=1000.0, latent_heat=334e3, T_m=0.0),
    -20.0,
    5.0,
)


@pytest.fixture(scope="module")
def errors() -> dict[str, list[float] | int]:
    # 80 mm: the far end lies beyond 6 sqrt(alpha t) of the liquid.
    body = slab_body(WATER, thickness="80 mm", width="2 mm", cell="0.5 mm")
    problem = HeatProblem(
        body,
        {"left": Fixed.model_validate({"exchange": "fixed", "temperature": "-20 degC"})},
        0.0,
        (-20.0, 5.0),
    )
    ray = Ray.model_validate({"from": ["0 mm", "1 mm"], "to": ["70 mm", "1 mm"]})
    fronts = Fronts(Product(body), Level("freezing point"), {"depth": ray})
    assert fronts.sharp
    speed = float(LAW.front(np.array([1.0]))[0])
    times = np.linspace((5e-3 / speed) ** 2, (15e-3 / speed) ** 2, 80)
    u = body.enthalpy_at(np.full(body.size, 5.0), np.arange(body.size))
    effort, found = Effort(), {"chord": [], "cubic": []}
    start = begin(problem, 0.0, u, np.zeros(1))
    for step in march(problem, start, float(times[-1]), [], Control(tolerance=1e-2), effort):
        for time in times[(times > step.before.time) & (times <= step.after.time)]:
            exact = float(LAW.front(np.array([time]))[0])
            for name, between in (("chord", step.chord(time)), ("cubic", step.at(time)[0])):
                position, _ = fronts.see(time, between, body.temperature(between))["depth"]
                found[name].append(abs(position / exact - 1.0))
    return {**found, "factorisations": effort.factorisations}


def test_a_front_between_steps_is_read_from_a_straight_line(errors) -> None:
    assert max(errors["chord"]) < 3e-3
    # What a cubic through slopes that go in stairs would say.
    assert max(errors["cubic"]) > 2.0 * max(errors["chord"])


def test_steps_do_not_follow_the_stairs_of_the_mesh(errors) -> None:
    # The front crosses 30 cells; resolving the stairs of each took 400 factorisations and more.
    assert errors["factorisations"] < 200
