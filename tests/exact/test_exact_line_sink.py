"""Line sink, sharp and with a freezing range: digits, heat balance, bad input.

Digits: computed from the stated formulas, independently of this code.
"""

from __future__ import annotations

from itertools import pairwise
from math import nan, pi

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from fem.exact import LineSink, RangeFreezing, SharpFreezing

WATER = SharpFreezing(k_s=2.2, c_s=2050, k_l=0.56, c_l=4200, rho=1000, latent_heat=334e3, T_m=0)
RANGE = RangeFreezing(2.0, 2000, 1.2, 3000, 0.55, 3900, 1050, 270e3, -8, -2)
RADII = np.array([2, 4, 6, 10, 20]) / 1e3

# lambda, R(600 s) [mm], T at RADII after 600 s, flux at 2 mm.
SHARP = {
    "100 W/m from 5": (
        LineSink(WATER, 100, 5),
        (0.131781100247, 6.687952192, 7945.398124),
        (-8.6760509, -3.6784255, -0.77310942, 2.1301068, 4.5201231),
    ),
    "100 W/m, one phase": (
        LineSink(WATER, 100, 0),
        (0.147390710824, 7.480147196, 7945.398124),
        (-9.4702848, -4.4726594, -1.5673433, 0.0, 0.0),
    ),
    "50 W/m from 10": (
        LineSink(WATER, 50, 10),
        (0.0729362465534, 3.70154847, 3972.699062),
        (-2.2199364, 0.56601438, 3.4364596, 6.6527778, 9.4403086),
    ),
}


@pytest.mark.parametrize("name", SHARP)
def test_sharp_front_has_the_digits_computed_elsewhere(name):
    exact, (root, front, flux), temperatures = SHARP[name]
    assert exact.root == pytest.approx(root, rel=1e-11)
    assert exact.front(600.0) == pytest.approx(front / 1e3, rel=1e-9)
    assert exact.liquidus(600.0) == exact.front(600.0)
    assert exact.flux(2e-3, 600.0) == pytest.approx(flux, rel=1e-9)
    assert exact.temperature(RADII, 600.0) == pytest.approx(temperatures, abs=1e-6)


def test_freezing_range_has_the_digits_computed_elsewhere():
    exact = LineSink(RANGE, 100, 5)
    assert exact.front(0.25) == pytest.approx(9.45816764079e-5, rel=1e-10)
    assert exact.liquidus(0.25) == pytest.approx(0.000182060431638, rel=1e-10)
    assert exact.flux(2e-3, 600.0) == pytest.approx(7943.833275, rel=1e-9)
    found = exact.temperature(RADII, [[60.0], [600.0], [3600.0]])
    table = [
        (-4.4502134, 1.2542067, 3.7984559, 4.9239073, 4.999998),
        (-14.655561, -9.1605143, -4.9689296, -0.84876453, 4.0140115),
        (-21.778946, -16.266536, -13.045744, -8.9992451, -2.4727445),
    ]
    assert found == pytest.approx(np.array(table), abs=1e-6)


@pytest.mark.parametrize("exact", [*(case[0] for case in SHARP.values()), LineSink(RANGE, 100, 5)])
def test_heat_drawn_through_a_radius_is_heat_missing_beyond_it(exact):
    """From t = 0 on, where the radius is still liquid, through every zone that passes it."""
    r_0, t = 2e-3, 600.0
    passages = np.sort((r_0 / (2 * exact.zones.fronts)) ** 2)
    drawn = sum(
        np.sum(weight * 2 * pi * r_0 * exact.flux(r_0, time))
        for time, weight in pieces([1e-3, *passages, t], 24)
    )
    fronts = 2 * exact.zones.fronts * np.sqrt(t)
    far = fronts[-1] + 16 * exact.zones.a.max() * np.sqrt(t)
    missing = sum(
        np.sum(weight * 2 * pi * r * (enthalpy(exact, exact.T_0) - enthalpy(exact, exact.temperature(r, t))))
        for r, weight in pieces([r_0, *fronts, far], 24)
    )
    assert drawn == pytest.approx(missing, rel=1e-8)


def test_the_flux_is_that_of_the_temperature_in_every_zone():
    exact = LineSink(RANGE, 100, 5)
    k = np.array([2.0, 1.2, 0.55])
    r, d = np.array([3e-3, 7e-3, 15e-3]), 1e-7
    slope = (exact.temperature(r + d, 600.0) - exact.temperature(r - d, 600.0)) / (2 * d)
    assert exact.flux(r, 600.0) == pytest.approx(k * slope, rel=1e-6)


@settings(max_examples=60, deadline=None)
@given(Q=st.floats(5, 2000), superheat=st.floats(1e-9, 60), width=st.floats(1e-3, 10), k=st.floats(0.1, 5))
def test_heat_balances_at_both_fronts_however_strong_the_sink(Q, superheat, width, k):
    material = RangeFreezing(2.0, 2000, k, 3000, 0.55, 3900, 1050, 270e3, -2 - width, -2, share=0.2)
    exact = LineSink(material, Q, -2 + superheat)
    first, second = exact.zones.fronts
    assert 0 < first < second
    jump = exact.zones.slope_flux(np.array([first, first * (1 + 1e-13)]))
    assert jump[0] - jump[1] == pytest.approx(2 * first * 0.2 * 270e3 * 1050, abs=1e-6 * Q / first)
    at_second = exact.zones.slope_flux(np.array([second, second * (1 + 1e-13)]))
    assert at_second[0] == pytest.approx(at_second[1], abs=1e-6 * Q / second)


def test_it_holds_from_the_first_instant():
    exact = LineSink(RANGE, 100, 5)
    assert exact.temperature(2e-3, 0.0) == 5.0
    assert exact.flux(2e-3, 0.0) == 0.0
    assert np.all(np.diff(exact.flux(2e-3, np.linspace(0, 100, 300))) >= 0)


@pytest.mark.parametrize(
    ("material", "Q", "T_0", "word"),
    [
        (WATER, 0.0, 5.0, "Q"),
        (WATER, nan, 5.0, "Q"),
        (WATER, 100.0, -0.1, "T_m"),
        (RANGE, 100.0, -2.0, "T_l"),
        (RANGE, 100.0, nan, "T_l"),
    ],
)
def test_bad_input_is_refused(material, Q, T_0, word):
    with pytest.raises(ValueError, match=word):
        LineSink(material, Q, T_0)


@pytest.mark.parametrize(("r", "t"), [(0.0, 1.0), (-1e-3, 1.0), (1e-3, -1.0), (nan, 1.0)])
def test_places_and_times_that_do_not_exist_are_refused(r, t):
    with pytest.raises(ValueError, match=r"radius|time"):
        LineSink(WATER, 100, 5).temperature(r, t)


def pieces(marks, parts):
    """Gauss points and weights between marks, graded evenly in the logarithm."""
    points, weights = np.polynomial.legendre.leggauss(16)
    for low, high in pairwise(marks):
        cuts = np.geomspace(low, high, parts + 1)
        for a, b in pairwise(cuts):
            yield a + (b - a) * (points + 1) / 2, weights * (b - a) / 2


def enthalpy(exact, T):
    material = exact.material
    rows = material.rows(-200, 50, width=1e-9)
    return np.interp(T, rows.temperature, rows.enthalpy)
