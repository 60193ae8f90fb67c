"""Water and ice against the IAPWS releases, as the `iapws` package has them."""

from __future__ import annotations

import numpy as np
import pytest
from iapws import IAPWS95, _iapws

from fem.material import components

P = 0.101325  # MPa

pytestmark = pytest.mark.filterwarnings("ignore:Metastable ice")  # 0 degC is 2.5 mK above melting at 1 atm


def ice(T: float) -> dict[str, float]:
    return _iapws._Ice(T + 273.15, P)


def supercooled(T: float) -> dict[str, float]:
    return _iapws._Supercooled(T + 273.15, P)


@pytest.mark.parametrize("T", [0.0, -5.0, -10.0, -20.0, -40.0, -60.0])
def test_ice(T: float) -> None:
    exact = ice(T)
    assert components.ice_heat_capacity(T) == pytest.approx(1e3 * exact["cp"], rel=1e-3)
    assert components.ice_density(T) == pytest.approx(exact["rho"], rel=1e-4)
    rise = components.ice_enthalpy(T) - components.ice_enthalpy(-80.0)
    assert rise == pytest.approx(1e3 * (exact["h"] - ice(-80.0)["h"]), rel=1e-3)


@pytest.mark.parametrize("T", [0.01, 4.0, 10.0, 20.0, 40.0, 60.0])
def test_water(T: float) -> None:
    exact = IAPWS95(T=T + 273.15, P=P)
    assert components.water_heat_capacity(T) == pytest.approx(1e3 * exact.cp, rel=1e-3)
    assert components.water_density(T) == pytest.approx(exact.rho, rel=2e-4)
    assert components.water_conductivity(T) == pytest.approx(exact.k, rel=3e-3)
    rise = components.water_enthalpy(T) - components.water_enthalpy(30.0)
    assert rise == pytest.approx(1e3 * (exact.h - IAPWS95(T=303.15, P=P).h), rel=1e-3)


@pytest.mark.parametrize("T", [0.0, -5.0, -10.0, -20.0, -30.0, -36.0])
def test_supercooled_water(T: float) -> None:
    exact = supercooled(T)
    assert components.water_heat_capacity(T) == pytest.approx(1e3 * exact["cp"], rel=1.5e-3)
    assert components.water_density(T) == pytest.approx(exact["rho"], rel=1.5e-3)


def test_latent_heat_at_0_degc() -> None:
    # 333.427 kJ/kg: IAPWS-95 and R10-06 at 0 degC and 1 atm.
    h_water = IAPWS95(T=273.155, P=P).h - IAPWS95(T=273.155, P=P).cp * 0.005
    assert components.latent_heat(0.0) == pytest.approx(1e3 * (h_water - ice(0.0)["h"]), rel=1e-3)
    assert components.latent_heat(0.0) == pytest.approx(333427.0, rel=1e-3)


@pytest.mark.parametrize("T", [-5.0, -10.0, -20.0, -30.0])
def test_latent_heat_when_supercooled(T: float) -> None:
    # From the Gibbs energies and entropies, which do not use our heat capacities. The package
    # returns the Gibbs energy of supercooled water over R T_LL, 461.523087 J/kg/K times
    # 228.2 K; its enthalpy, which adds the two unscaled, is no integral of its own cp.
    water, solid = supercooled(T), ice(T)
    scale = 461.523087 * 228.2
    h_water = water["g"] * scale + (T + 273.15) * 1e3 * water["s"]
    assert components.latent_heat(T) == pytest.approx(h_water - 1e3 * solid["h"], rel=1.5e-3)


@pytest.mark.parametrize(
    ("T", "k"),
    [(0.0, 2.2156), (-5.0, 2.2667), (-10.0, 2.3195), (-20.0, 2.4303), (-40.0, 2.6725), (-150.0, 4.4976)],
)
def test_ice_conductivity_digits(T: float, k: float) -> None:
    # Fukusako 1990, formula from memory; the digits were computed apart from this code.
    assert components.ice_conductivity(T) == pytest.approx(k, abs=1e-4)


@pytest.mark.parametrize(
    ("name", "T", "k", "rho", "c"),
    [
        ("protein", -20.0, 0.15381, 1340.268, 1.98350),
        ("fat", -20.0, 0.18616, 933.941, 1.95281),
        ("sucrose", -20.0, 0.17193, 1605.309, 1.50717),
        ("fructose", 20.0, 0.22743, 1592.891, 1.58567),
        ("fibre", 20.0, 0.20704, 1304.182, 1.88065),
        ("ash", 20.0, 0.35648, 2418.187, 1.12892),
    ],
)
def test_solids_digits(name: str, T: float, k: float, rho: float, c: float) -> None:
    # Choi and Okos 1986, formulas from memory; the digits were computed apart from this code.
    solid = components.SOLIDS[name]
    assert solid.conductivity_at(T) == pytest.approx(k, abs=1e-5)
    assert solid.density_at(T) == pytest.approx(rho, abs=1e-3)
    slope = (solid.enthalpy_at(T + 0.01) - solid.enthalpy_at(T - 0.01)) / 0.02
    assert slope == pytest.approx(1e3 * c, abs=1e-2)


def test_enthalpies_are_integrals_of_the_heat_capacities() -> None:
    T = np.linspace(-75.0, 55.0, 53)
    for h, c in (
        (components.water_enthalpy, components.water_heat_capacity),
        (components.ice_enthalpy, components.ice_heat_capacity),
    ):
        slope = (h(T + 1e-3) - h(T - 1e-3)) / 2e-3
        np.testing.assert_allclose(slope, c(T), rtol=1e-5)
    assert components.water_enthalpy(0.0) == 0.0
