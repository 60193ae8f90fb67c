"""Neumann and three-zone solutions: digits, heat balance, bad input.

Digits: computed from the stated formulas, independently of this code, to 20 figures and more.
"""

from __future__ import annotations

from itertools import pairwise
from math import inf, nan

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from fem.exact import Neumann, RangeFreezing, SharpFreezing, ThreeZone

WATER = SharpFreezing(k_s=2.2, c_s=2050, k_l=0.56, c_l=4200, rho=1000, latent_heat=334e3, T_m=0)
GEL = SharpFreezing(k_s=1.65, c_s=1900, k_l=0.55, c_l=3710, rho=1000, latent_heat=209e3, T_m=-0.6)
LIGHT = SharpFreezing(k_s=2.2, c_s=2050, k_l=0.56, c_l=4200, rho=917, latent_heat=334e3, T_m=0)
WIDE = {
    "k_s": 2.0,
    "c_s": 2000,
    "k_m": 1.2,
    "c_m": 3000,
    "k_l": 0.55,
    "c_l": 3900,
    "rho": 1050,
    "latent_heat": 270e3,
    "T_s": -8,
    "T_l": -2,
}
NARROW = RangeFreezing(2.2, 2050, 1.38, 3125, 0.56, 4200, 1000, 334e3, -0.5, 0.0)
UNIFORM = RangeFreezing(1, 3000, 1, 3000, 1, 3000, 1000, 300e3, -10, -1)

# lambda, front [mm] and wall flux [W/m2] at 600 s, T at 2, 5, 10, 20 mm.
NEUMANN = {
    "water, one phase": (
        Neumann(WATER, -20, 0),
        (0.242900822656, 12.32732984, 3639.636094),
        (-16.692952, -11.7547856, -3.6678371, 0.0),
    ),
    "water from 5": (
        Neumann(WATER, -20, 5),
        (0.232073217621, 11.77782384, 3803.019626),
        (-16.5444984, -11.3846573, -2.93468511, 3.38190963),
    ),
    "water from 20": (
        Neumann(WATER, -20, 20),
        (0.204739391429, 10.39061944, 4293.838402),
        (-16.0985303, -10.2727588, -0.732230802, 14.4652814),
    ),
    "light water, -30": (
        Neumann(LIGHT, -30, 4),
        (0.285155175549, 15.1125107, 4485.921681),
        (-25.9238245, -19.8348916, -9.84887376, 1.94128194),
    ),
    "liquid nitrogen": (
        Neumann(WATER, -196, 0),
        (0.666102869882, 33.80503077, 14663.5793),
        (-182.676371, -162.781197, -130.200024, -69.2856569),
    ),
    "gel": (
        Neumann(GEL, -30, 10),
        (0.312919631551, 14.28576832, 3506.864194),
        (-25.7519733, -19.4154759, -9.08135668, 5.01050735),
    ),
}

# l1, l2 [m/s^0.5], T at 2, 6, 10, 15, 30 mm after 600 s.
THREE_ZONE = {
    "wide": (
        ThreeZone(RangeFreezing(**WIDE), -30, 5),
        (0.000231226211709, 0.000317104454243),
        (-26.0452136, -18.1907505, -10.4993228, -2.26732748, 4.42612898),
    ),
    "a fifth at the solidus": (
        ThreeZone(RangeFreezing(**WIDE, share=0.2), -30, 5),
        (0.000231837914611, 0.000326440798851),
        (-26.0552631, -18.2207588, -10.5488757, -2.54757044, 4.38939984),
    ),
    "narrow": (
        ThreeZone(NARROW, -20, 5),
        (0.000235248333273, 0.000245479261286),
        (-16.5594982, -9.72106366, -3.00876305, 1.55174412, 4.74094082),
    ),
    "no superheat": (
        ThreeZone(RangeFreezing(**WIDE), -30, -2 + 1e-9),
        (0.000245849087067, None),
        (-26.271492, -18.8664323, -11.6150798, -3.24047261, -2.00000494),
    ),
    "uniform": (
        ThreeZone(UNIFORM, -40, 10),
        (0.000168099428329, 0.000269037806036),
        (-32.5201974, -17.8558361, -5.15417249, 0.2218539, 7.11751222),
    ),
}


@pytest.mark.parametrize("name", NEUMANN)
def test_neumann_has_the_digits_computed_elsewhere(name):
    exact, (root, front, flux), temperatures = NEUMANN[name]
    assert exact.root == pytest.approx(root, rel=1e-11)
    assert exact.front(600.0) == pytest.approx(front / 1e3, rel=1e-9)
    assert exact.wall_flux(600.0) == pytest.approx(flux, rel=1e-9)
    found = exact.temperature(np.array([2, 5, 10, 20]) / 1e3, 600.0)
    assert found == pytest.approx(temperatures, abs=1e-6)


@pytest.mark.parametrize("name", THREE_ZONE)
def test_three_zones_have_the_digits_computed_elsewhere(name):
    exact, (solidus, liquidus), temperatures = THREE_ZONE[name]
    assert exact.solidus(0.25) == pytest.approx(solidus, rel=1e-10)
    if liquidus is not None:
        assert exact.liquidus(0.25) == pytest.approx(liquidus, rel=1e-10)
    found = exact.temperature(np.array([2, 6, 10, 15, 30]) / 1e3, 600.0)
    assert found == pytest.approx(temperatures, abs=2e-7)


@pytest.mark.parametrize("exact", [case[0] for case in (NEUMANN | THREE_ZONE).values()])
def test_heat_that_left_is_heat_that_is_missing(exact):
    t = 600.0
    fronts = 2.0 * exact.zones.fronts * np.sqrt(t)
    far = fronts[-1] + 16.0 * exact.zones.a.max() * np.sqrt(t)
    marks = np.concatenate([[0.0], fronts, np.linspace(fronts[-1], far, 40)[1:]])
    missing = 0.0
    for low, high in pairwise(marks):
        x, weight = gauss(low, high)
        missing += np.sum(
            weight * (enthalpy(exact.material, exact.T_0) - enthalpy(exact.material, exact.temperature(x, t)))
        )
    # The flux falls as 1 / sqrt t, so what left is twice the flux now times the time.
    assert missing == pytest.approx(2.0 * float(exact.wall_flux(t)) * t, rel=1e-8)


@pytest.mark.parametrize("exact", [case[0] for case in (NEUMANN | THREE_ZONE).values()])
def test_heat_balances_at_every_front(exact):
    fronts, zones = exact.zones.fronts, exact.zones
    inner = zones.slope_flux(fronts)
    outer = zones.slope_flux(fronts * (1 + 1e-12))
    latent = np.array([step.latent for step in exact.material.steps()[:-1]])
    assert inner - outer == pytest.approx(2.0 * fronts * latent, abs=1e-8 * inner.max())


def test_temperature_is_continuous_at_the_fronts_and_holds_the_wall():
    for exact in (NEUMANN["gel"][0], THREE_ZONE["wide"][0]):
        fronts = 2.0 * exact.zones.fronts
        ends = [step.end for step in exact.material.steps()[:-1]]
        assert exact.temperature(fronts * (1 - 1e-12), 1.0) == pytest.approx(ends, abs=1e-8)
        assert exact.temperature(fronts * (1 + 1e-12), 1.0) == pytest.approx(ends, abs=1e-8)
        assert exact.temperature(0.0, 1.0) == pytest.approx(exact.T_w, abs=1e-12)
        assert exact.temperature(10.0, 1.0) == pytest.approx(exact.T_0, abs=1e-12)


def test_places_and_times_broadcast():
    exact = NEUMANN["gel"][0]
    assert exact.temperature(np.zeros((3, 1)) + 1e-3, np.ones(4)).shape == (3, 4)
    assert exact.wall_flux([1.0, 4.0]) == pytest.approx(exact.wall_flux(1.0) * np.array([1.0, 0.5]))
    assert exact.front(0.0) == 0.0


@settings(max_examples=60, deadline=None)
@given(
    wall=st.floats(-200, -9.01),
    superheat=st.floats(1e-6, 60),
    width=st.floats(1e-3, 7),
    latent=st.floats(1e3, 4e5),
    share=st.floats(0, 0.95),
    k_l=st.floats(0.05, 5),
)
def test_fronts_are_in_order_and_heat_flows_outwards(wall, superheat, width, latent, share, k_l):
    material = RangeFreezing(2.0, 2000, 1.2, 3000, k_l, 3900, 1050, latent, -2 - width, -2, share)
    exact = ThreeZone(material, wall, -2 + superheat)
    first, second = exact.zones.fronts
    assert 0 < first < second
    T = exact.temperature(np.linspace(0, 5 * second, 200), 1.0)
    assert np.all(np.diff(T) >= -1e-9)
    assert T[0] == pytest.approx(wall, abs=1e-8)


@pytest.mark.parametrize(
    ("wall", "start"),
    [(0.0, 5.0), (1.0, 5.0), (-20.0, -1e-3), (nan, 5.0), (-20.0, nan), (-300.0, 5.0), (-20.0, inf)],
)
def test_neumann_refuses_temperatures_out_of_order(wall, start):
    with pytest.raises(ValueError, match="T_m"):
        Neumann(WATER, wall, start)


@pytest.mark.parametrize(("wall", "start"), [(-8.0, 5.0), (-30.0, -2.0), (nan, 5.0), (-30.0, inf)])
def test_three_zone_refuses_temperatures_out_of_order(wall, start):
    with pytest.raises(ValueError, match=r"T_[sl]"):
        ThreeZone(RangeFreezing(**WIDE), wall, start)


def test_places_and_times_outside_the_half_space_are_refused():
    exact = NEUMANN["gel"][0]
    with pytest.raises(ValueError, match="time"):
        exact.temperature(1e-3, 0.0)
    with pytest.raises(ValueError, match="distance"):
        exact.temperature(-1e-3, 1.0)
    with pytest.raises(ValueError, match="time"):
        exact.front(-1.0)


def gauss(low, high):
    points, weights = np.polynomial.legendre.leggauss(24)
    return low + (high - low) * (points + 1) / 2, weights * (high - low) / 2


def enthalpy(material, T):
    """H [J/m3] by the definition of the zones: the last one's line is 0 at 0 degC."""
    T = np.asarray(T, dtype=float)
    *below, liquid = material.steps()
    H = liquid.capacity * T
    top = H
    for step, above in zip(reversed(below), reversed([*below[1:], liquid]), strict=True):
        at_end = top + above.capacity * (step.end - T) - step.latent
        top = at_end - step.capacity * (step.end - T)
        H = np.where(step.end > T, top, H)
    return H
