"""Similarity solution and travelling wave for any curve: digits, heat balance, known limits.

Digits: computed from the stated equations, independently of this code.
"""

from __future__ import annotations

import time
from math import nan

import numpy as np
import pytest

from fem.curve import Curve
from fem.exact import Neumann, RangeFreezing, SharpFreezing, Similarity, ThreeZone, TravellingWave

RHO, T_F = 1080.0, -1.6
WATER = SharpFreezing(k_s=2.2, c_s=2050, k_l=0.56, c_l=4200, rho=1000, latent_heat=334e3, T_m=0)
RANGE = RangeFreezing(2.0, 2000, 1.2, 3000, 0.55, 3900, 1050, 270e3, -8, -2, share=0.2)
PLACES = np.array([1, 2, 4, 6, 8, 10, 15, 20, 30, 40]) / 1e3

# Tw, T0, eta of T_f, wall flux times sqrt t, T at PLACES after 600 s.
STEPS = [
    (
        -25,
        5,
        2.7282221125e-04,
        79453.190626,
        (
            -23.205417,
            -21.40614,
            -17.800127,
            -14.195219,
            -10.605385,
            -7.049522,
            -0.319133,
            2.486015,
            4.631644,
            4.969988,
        ),
    ),
    (
        -35,
        2,
        3.3223933365e-04,
        97341.159305,
        (
            -32.83358,
            -30.66469,
            -26.328284,
            -22.008332,
            -17.722492,
            -13.489421,
            -3.397874,
            -0.033735,
            1.702012,
            1.975722,
        ),
    ),
]


def enthalpy(T):
    below = np.minimum(T, T_F)
    return np.where(
        T >= T_F, RHO * 3600 * (T - T_F), RHO * (2300 * (T - T_F) - 334000 * 0.78 * (1 - T_F / below))
    )


def conductivity(T):
    below = np.minimum(T, T_F)
    return np.where(T >= T_F, 0.5, 0.5 + 1.4 * (1 - T_F / below))


@pytest.mark.parametrize(("wall", "start", "eta", "flux", "temperatures"), STEPS)
def test_a_gradual_curve_has_the_digits_computed_elsewhere(wall, start, eta, flux, temperatures):
    exact = Similarity(enthalpy, conductivity, wall, start, (T_F,))
    assert exact.front(T_F, 0.25) == pytest.approx(eta, rel=1e-9)
    assert exact.wall_flux(1.0) == pytest.approx(flux, rel=1e-9)
    assert exact.temperature(PLACES, 600.0) == pytest.approx(temperatures, abs=1e-6)


def test_more_steps_change_nothing_that_matters():
    coarse, fine = (Similarity(enthalpy, conductivity, -25, 5, (T_F,), steps=n) for n in (100, 800))
    assert coarse.front(T_F, 1.0) == pytest.approx(fine.front(T_F, 1.0), rel=1e-8)
    assert coarse.temperature(PLACES, 600.0) == pytest.approx(fine.temperature(PLACES, 600.0), abs=1e-6)


@pytest.mark.parametrize(
    "known",
    [
        Neumann(WATER, -20, 5),
        Neumann(WATER, -20, 0),
        ThreeZone(RANGE, -30, 5),
        ThreeZone(RANGE, -30, -2 + 1e-9),
        Neumann(WATER, -196, 20),
    ],
)
def test_table_rows_with_jumps_give_the_closed_forms(known):
    """Jumps of latent heat and conductivity a microkelvin wide; also no superheat at all."""
    curve = Curve.from_enthalpy(*known.material.rows(-200, 25))
    exact = Similarity(curve.enthalpy, curve.conductivity, known.T_w, known.T_0, curve.T)
    assert exact.wall_flux(1.0) == pytest.approx(float(known.wall_flux(1.0)), rel=1e-7)
    assert exact.temperature(PLACES, 600.0) == pytest.approx(known.temperature(PLACES, 600.0), abs=2e-6)
    first = known.material.steps()[0].end
    if first < known.T_0:
        assert exact.front(first, 0.25) == pytest.approx(known.zones.fronts[0], rel=1e-7)


def test_a_table_of_many_rows_is_solved_in_a_moment():
    T = np.concatenate([np.linspace(-40, T_F, 1500), np.linspace(T_F, 20, 200)[1:]])
    curve = Curve.from_enthalpy(T, enthalpy(T), conductivity(T))
    begin = time.perf_counter()
    exact = Similarity(curve.enthalpy, curve.conductivity, -25, 5, curve.T)
    assert time.perf_counter() - begin < 1.0
    # A chord lies above the curve by the square of its length: 1e-5 is the table's, not the march's.
    assert exact.front(T_F, 0.25) == pytest.approx(2.7282221125e-04, rel=1e-5)


def test_heat_that_left_is_heat_that_is_missing():
    exact = Similarity(enthalpy, conductivity, -25, 5, (T_F,))
    t, points, weights = 600.0, *np.polynomial.legendre.leggauss(20)
    kink = float(exact.front(T_F, t))
    marks = np.concatenate([np.linspace(0, kink, 30), np.linspace(kink, 0.12, 60)[1:]])
    width = np.diff(marks)[:, None]
    x = marks[:-1, None] + width * (points + 1) / 2
    lost = np.sum(weights * width / 2 * (enthalpy(5.0) - enthalpy(exact.temperature(x, t))))
    assert lost == pytest.approx(2 * float(exact.wall_flux(t)) * t, rel=1e-8)


def test_front_and_temperature_are_inverse_from_wall_to_start():
    exact = Similarity(enthalpy, conductivity, -25, 5, (T_F,))
    for level in (-25.0, -24.0, -12.0, -2.0, T_F, 0.0, 4.9, 4.9999, 5 - 1e-6):
        assert exact.temperature(exact.front(level, 600.0), 600.0) == pytest.approx(level, abs=1e-7)


@pytest.mark.parametrize(
    ("wall", "start"), [(5.0, 5.0), (6.0, 5.0), (nan, 5.0), (-300.0, 5.0), (-25.0, float("inf"))]
)
def test_similarity_refuses_temperatures_out_of_order(wall, start):
    with pytest.raises(ValueError, match="T_0"):
        Similarity(enthalpy, conductivity, wall, start, (T_F,))


def test_similarity_refuses_curves_of_no_material():
    with pytest.raises(ValueError, match="rise"):
        Similarity(lambda T: -enthalpy(T), conductivity, -25, 5)
    with pytest.raises(ValueError, match="rise"):
        Similarity(lambda T: enthalpy(T) + 3e8 * np.exp(-((T + 12.0) ** 2)), conductivity, -25, 5)
    with pytest.raises(ValueError, match="conductivity"):
        Similarity(enthalpy, lambda T: np.where(T < -10, -1.0, 1.0), -25, 5)


def test_similarity_refuses_levels_places_and_times_it_does_not_have():
    exact = Similarity(enthalpy, conductivity, -25, 5, (T_F,))
    for level in (-25.1, 5.0, nan):
        with pytest.raises(ValueError, match="level"):
            exact.front(level, 1.0)
    with pytest.raises(ValueError, match="time"):
        exact.temperature(1e-3, 0.0)
    with pytest.raises(ValueError, match="time"):
        exact.wall_flux(0.0)
    with pytest.raises(ValueError, match="distance"):
        exact.temperature(-1e-3, 1.0)


def wave(**change):
    given = {"T_f": T_F, "T_0": 2.0, "speed": 0.02 / 3600, "coldest": -30.0, "breaks": (T_F,)}
    return TravellingWave(enthalpy, conductivity, **(given | change))


def test_travelling_wave_has_the_digits_computed_elsewhere():
    T = [-2, -3, -5, -10, -15, -20, -25]
    behind = [1.186842, 2.767172, 5.341991, 11.129393, 16.540416, 21.701011, 26.653291]
    assert wave().distance(T) * 1e3 == pytest.approx(behind, abs=1e-6)
    assert wave().distance(-10.0) / (0.02 / 3600) == pytest.approx(2003.2908, abs=1e-4)


def test_travelling_wave_carries_off_the_heat_of_what_it_has_passed():
    exact, d = wave(), 1e-6
    for behind in (-2e-3, 2e-3, 15e-3):
        slope = (exact.temperature(behind - d) - exact.temperature(behind + d)) / (2 * d)
        T = float(exact.temperature(behind))
        passed = 0.02 / 3600 * (enthalpy(2.0) - enthalpy(T))
        assert conductivity(T) * slope == pytest.approx(passed, rel=1e-6)


def test_travelling_wave_tends_to_the_start_ahead():
    exact = wave()
    assert exact.temperature(-0.1) == pytest.approx(2.0, abs=0.06)
    # Ahead the liquid is a plain exponential: k T' = V rho c (T_0 - T).
    rate = 0.02 / 3600 * RHO * 3600 / 0.5
    ahead = np.array([0.0, -0.01, -0.05, -0.3, -0.5])
    assert exact.temperature(ahead) == pytest.approx(2.0 - (2.0 - T_F) * np.exp(rate * ahead), abs=1e-7)


@pytest.mark.parametrize(
    "change", [{"T_0": T_F}, {"coldest": 0.0}, {"speed": 0.0}, {"speed": nan}, {"T_0": T_F + 1e-6}]
)
def test_travelling_wave_refuses_what_cannot_travel(change):
    with pytest.raises(ValueError, match=r"T_0|speed"):
        wave(**change)


def test_travelling_wave_says_when_it_was_not_solved_that_far():
    with pytest.raises(ValueError, match="coldest"):
        wave().temperature(0.1)
    with pytest.raises(ValueError, match="T has"):
        wave().distance(-31.0)
