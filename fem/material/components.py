"""Properties of what a mix is made of: liquid water, ice, sugars and other solids, air.

All correlations take degC. Water below 0 degC is supercooled liquid, as it is in the
concentrated solution between ice crystals. Enthalpies are 0 for liquid water at 0 degC.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.polynomial.polynomial import polyint, polyval
from numpy.typing import ArrayLike, NDArray

Array = NDArray[np.float64]

RANGE = (-40.0, 60.0)
"""Temperatures between which the correlations together hold [degC]."""

LATENT_HEAT_0 = 333.43e3
"""Latent heat of ice at 0 degC [J/kg]; IAPWS-95 and IAPWS-06 give 333.427 kJ/kg."""

KELVIN = 273.15
GAS_CONSTANT = 8.314462618
"""[J/mol/K]; SI, exact to the digits given."""

MOLAR_MASS = {"water": 18.01528e-3, "sucrose": 342.297e-3, "glucose": 180.156e-3, "fructose": 180.156e-3}
"""[kg/mol]; from the standard atomic masses."""

AIR_CONDUCTIVITY = 0.024
"""Conductivity of still air near 0 degC [W/m/K]; value from memory."""

# Coefficients of rising powers of T. Water and ice are least-squares fits to the IAPWS releases
# (IAPWS-95 above 0 degC, IAPWS G12-15 for supercooled water, IAPWS R10-06 for ice, all at
# 1 atm); `_SUPERCOOLED` is where the fit ends and below which the value is held.
_SUPERCOOLED = -36.0
_WATER_HEAT_CAPACITY_WARM = (4219.0, -2.922204, 6.740830e-2, -4.751861e-4)
_WATER_HEAT_CAPACITY_COLD = (
    4219.0, -1.015548, 1.131254, 1.403400e-1, 9.755881e-3, 2.985827e-4, 3.673140e-6,
)  # fmt: skip
_WATER_DENSITY_WARM = (999.84, 5.269005e-2, -7.280515e-3, 2.988093e-5)
_WATER_DENSITY_COLD = (999.84, 1.823162e-1, 5.658720e-3, 5.862400e-4)
_WATER_CONDUCTIVITY = (0.556748, 2.288317e-3, -1.214426e-5)
_ICE_HEAT_CAPACITY = (2097.044, 7.423318, 2.704327e-3)
_ICE_DENSITY = (916.7032, -0.1491251, -2.781309e-4)
_ICE_CONDUCTIVITY = (1.16 * 1.91, -1.16 * 8.66e-3, 1.16 * 2.97e-5)


def water_heat_capacity(T: ArrayLike) -> Array:
    """Heat capacity of liquid water [J/kg/K], supercooled below 0 degC.

    Fit to IAPWS-95 within 0.04 % from 0 to 60 degC and to IAPWS G12-15 within 0.1 % down to
    -36 degC; held below.
    """
    T = np.asarray(T, dtype=float)
    cold = polyval(np.clip(T, _SUPERCOOLED, 0.0), _WATER_HEAT_CAPACITY_COLD)
    return np.asarray(np.where(T < 0.0, cold, polyval(T, _WATER_HEAT_CAPACITY_WARM)))


def water_enthalpy(T: ArrayLike) -> Array:
    """Enthalpy of liquid water over that at 0 degC [J/kg]: the integral of its heat capacity."""
    T = np.asarray(T, dtype=float)
    held = np.clip(T, _SUPERCOOLED, 0.0)
    cold = polyval(held, polyint(_WATER_HEAT_CAPACITY_COLD))
    beyond = np.minimum(T - _SUPERCOOLED, 0.0) * polyval(_SUPERCOOLED, _WATER_HEAT_CAPACITY_COLD)
    return np.asarray(np.where(T < 0.0, cold + beyond, polyval(T, polyint(_WATER_HEAT_CAPACITY_WARM))))


def water_density(T: ArrayLike) -> Array:
    """Density of liquid water [kg/m3].

    Fit to IAPWS-95 within 0.01 % from 0 to 60 degC and to IAPWS G12-15 within 0.1 % down to
    -36 degC; held below.
    """
    T = np.asarray(T, dtype=float)
    cold = polyval(np.clip(T, _SUPERCOOLED, 0.0), _WATER_DENSITY_COLD)
    return np.asarray(np.where(T < 0.0, cold, polyval(T, _WATER_DENSITY_WARM)))


def water_conductivity(T: ArrayLike) -> Array:
    """Conductivity of liquid water [W/m/K].

    Fit to the IAPWS release on conductivity within 0.2 % from 0 to 60 degC; below 0 degC it goes
    straight on with the slope it has there, which nothing has checked.
    """
    T = np.asarray(T, dtype=float)
    below = _WATER_CONDUCTIVITY[1] * np.minimum(T, 0.0)
    return np.asarray(below + polyval(np.maximum(T, 0.0), _WATER_CONDUCTIVITY))


def ice_heat_capacity(T: ArrayLike) -> Array:
    """Heat capacity of ice [J/kg/K]: fit to IAPWS R10-06 within 0.03 % from -90 to 0 degC."""
    return np.asarray(polyval(np.asarray(T, dtype=float), _ICE_HEAT_CAPACITY))


def ice_enthalpy(T: ArrayLike) -> Array:
    """Enthalpy of ice over that of liquid water at 0 degC [J/kg]: -333.43e3 at 0 degC."""
    T = np.asarray(T, dtype=float)
    return np.asarray(polyval(T, polyint(_ICE_HEAT_CAPACITY)) - LATENT_HEAT_0)


def ice_density(T: ArrayLike) -> Array:
    """Density of ice [kg/m3]: fit to IAPWS R10-06 within 0.003 % from -90 to 0 degC."""
    return np.asarray(polyval(np.asarray(T, dtype=float), _ICE_DENSITY))


def ice_conductivity(T: ArrayLike) -> Array:
    """Conductivity of ice [W/m/K], ``1.16 (1.91 - 8.66e-3 T + 2.97e-5 T2)``.

    Fukusako 1990, value from memory; about -150 to 0 degC. Fits of other authors lie up to 6 %
    lower at 0 degC and agree within 2 % below -40 degC.
    """
    return np.asarray(polyval(np.asarray(T, dtype=float), _ICE_CONDUCTIVITY))


def latent_heat(T: ArrayLike) -> Array:
    """Heat that a kilogram of water gives up on turning to ice at T [J/kg].

    The difference of the two enthalpies above, so that the heat of any path is the same:
    333.43e3 at 0 degC, 311.6e3 at -10 degC, 288.2e3 at -20 degC.
    """
    return np.asarray(water_enthalpy(T) - ice_enthalpy(T))


@dataclass(frozen=True)
class Solid:
    """One sort of solids; coefficients of rising powers of T [degC].

    Parameters
    ----------
    heat_capacity
        [J/kg/K].
    density
        [kg/m3].
    conductivity
        [W/m/K].

    """

    heat_capacity: tuple[float, float, float]
    density: tuple[float, float]
    conductivity: tuple[float, float, float]

    def enthalpy_at(self, T: ArrayLike) -> Array:
        """Enthalpy over that at 0 degC [J/kg]."""
        return np.asarray(polyval(np.asarray(T, dtype=float), polyint(self.heat_capacity)))

    def density_at(self, T: ArrayLike) -> Array:
        """Density [kg/m3]."""
        return np.asarray(polyval(np.asarray(T, dtype=float), self.density))

    def conductivity_at(self, T: ArrayLike) -> Array:
        """Conductivity [W/m/K]."""
        return np.asarray(polyval(np.asarray(T, dtype=float), self.conductivity))


_CARBOHYDRATE = Solid((1548.8, 1.9625, -5.9399e-3), (1599.1, -0.31046), (0.20141, 1.3874e-3, -4.3312e-6))

SOLIDS = {
    "sucrose": _CARBOHYDRATE,
    "glucose": _CARBOHYDRATE,
    "fructose": _CARBOHYDRATE,
    "fat": Solid((1984.2, 1.4733, -4.8008e-3), (925.59, -0.41757), (0.18071, -2.7604e-4, -1.7749e-7)),
    "protein": Solid((2008.2, 1.2089, -1.3129e-3), (1329.9, -0.5184), (0.17881, 1.1958e-3, -2.7178e-6)),
    "fibre": Solid((1845.9, 1.8306, -4.6509e-3), (1311.5, -0.36589), (0.18331, 1.2497e-3, -3.1683e-6)),
    "ash": Solid((1092.6, 1.8896, -3.6817e-3), (2423.8, -0.28063), (0.32962, 1.4011e-3, -2.9069e-6)),
}
"""Choi and Okos 1986, -40 to 150 degC, values from memory; the three sugars are carbohydrate."""
