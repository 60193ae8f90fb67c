from __future__ import annotations

import numpy as np
import pytest
from scipy.integrate import quad

from fem.material.components import GAS_CONSTANT, MOLAR_MASS, latent_heat
from fem.material.freezing import Solution, ln_ice_activity


def sugars(**percent: float) -> Solution:
    shares = {name: value / 100.0 for name, value in percent.items()}
    return Solution.of_sugars(shares, 1.0 - sum(shares.values()))


def test_12_percent_sucrose_freezes_at_the_published_temperature() -> None:
    # -0.77 degC: The Science of Ice Cream, p. 25.
    assert sugars(sucrose=12).freezing_point == pytest.approx(-0.77, abs=0.005)


# Freezing point depression by sucrose and by glucose: Norrish against the ice activity of
# Murphy and Koop 2005, computed apart from this code.
@pytest.mark.parametrize(
    ("percent", "sucrose", "glucose"),
    [
        (5, 0.291, 0.549), (10, 0.625, 1.169), (15, 1.012, 1.876), (20, 1.463, 2.687), (25, 1.994, 3.624),
        (30, 2.627, 4.719), (35, 3.390, 6.010), (40, 4.323, 7.551), (45, 5.482, 9.416), (50, 6.950, 11.709),
    ],
)  # fmt: skip
def test_freezing_points_of_one_sugar(percent: float, sucrose: float, glucose: float) -> None:
    assert sugars(sucrose=percent).freezing_point == pytest.approx(-sucrose, abs=0.005)
    assert sugars(glucose=percent).freezing_point == pytest.approx(-glucose, abs=0.005)
    half = {"glucose": percent / 2, "fructose": percent / 2}
    assert sugars(**half).freezing_point == pytest.approx(-glucose, abs=0.005)


# The handbook's freezing point depression of sucrose, value from memory.
@pytest.mark.parametrize(
    ("percent", "depression"),
    [
        (5, 0.29), (10, 0.63), (12, 0.77), (14, 0.93), (16, 1.10), (18, 1.27), (20, 1.47), (22, 1.67),
        (24, 1.89), (26, 2.12), (28, 2.37), (30, 2.64), (32, 2.94),
    ],
)  # fmt: skip
def test_freezing_points_of_the_handbook(percent: float, depression: float) -> None:
    assert sugars(sucrose=percent).freezing_point == pytest.approx(-depression, abs=0.05)


# Ice by mass of mix, computed apart from this code from the same law.
@pytest.mark.parametrize(
    ("mix", "T", "ice"),
    [
        ({"sucrose": 15}, [-2, -3, -4, -6, -10, -15, -20, -30],
         [0.4012, 0.5393, 0.6092, 0.6802, 0.7390, 0.7699, 0.7862, 0.8034]),
        ({"sucrose": 25}, [-2, -2.5, -3, -5, -8, -12, -18, -25],
         [0.0020, 0.1398, 0.2322, 0.4193, 0.5277, 0.5904, 0.6345, 0.6606]),
        ({"sucrose": 14, "glucose": 4}, [-2, -3, -5, -8, -12, -18, -30],
         [0.1899, 0.3877, 0.5476, 0.6395, 0.6921, 0.7287, 0.7598]),
        ({"sucrose": 18}, [-2, -3, -5, -10, -18, -30], [0.28, 0.45, 0.58, 0.69, 0.74, 0.76]),
        ({"sucrose": 15.4, "glucose": 3.3, "fructose": 3.3}, [-2, -3, -5, -10, -18, -30],
         [0.00, 0.23, 0.43, 0.59, 0.67, 0.71]),
        ({"sucrose": 14, "glucose": 7, "fructose": 7}, [-3, -5, -10, -18, -30],
         [0.00, 0.23, 0.46, 0.56, 0.62]),
    ],
)  # fmt: skip
def test_ice_by_the_lever_rule(mix: dict[str, float], T: list[float], ice: list[float]) -> None:
    np.testing.assert_allclose(sugars(**mix).ice(np.array(T), -33.0), ice, atol=0.01)


def test_ice_activity_is_the_integral_of_the_latent_heat() -> None:
    for T in (-0.01, -1.0, -10.0, -35.0, -60.0):
        integral, _ = quad(lambda t: float(latent_heat(t)) / (t + 273.15) ** 2, 0.0, T)
        # At -36 degC the latent heat has a kink, which costs digits below it.
        rel = 1e-12 if T > -36.0 else 1e-4
        assert ln_ice_activity(T) == pytest.approx(MOLAR_MASS["water"] / GAS_CONSTANT * integral, rel=rel)


def test_activities_agree_wherever_there_is_ice() -> None:
    solution = sugars(sucrose=10, fructose=8)
    T = np.array([-1.9, -5.0, -12.0, -30.0])
    left = (solution.water - solution.ice(T, -33.0)) / MOLAR_MASS["water"]
    x = solution.solute / (solution.solute + left)
    np.testing.assert_allclose(np.log(1 - x) - (solution.norrish * x) ** 2, ln_ice_activity(T), rtol=1e-12)


def test_a_stated_freezing_point_is_met_exactly() -> None:
    for start in (sugars(sucrose=12), Solution.of_sugars({}, 0.85)):
        solution = start.freezing_at(-2.5)
        assert solution.freezing_point == pytest.approx(-2.5, abs=1e-11)
        assert solution.ice(-2.5, -33.0) == pytest.approx(0.0, abs=1e-11)
        assert solution.ice(-2.6, -33.0) > 0.02


def test_ice_ends_where_told() -> None:
    solution = sugars(sucrose=18)
    assert solution.ice(-60.0, -33.0) == solution.ice(-33.0, -33.0)
    assert solution.ice(-32.0, -33.0) < solution.ice(-33.0, -33.0)
    assert np.all(solution.ice(np.array([solution.freezing_point, -1.0, 0.0, 20.0]), -33.0) == 0.0)
