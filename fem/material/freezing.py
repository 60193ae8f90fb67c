"""The freezing curve: how much ice stands with a sugar solution at a temperature.

Ice and solution are at rest with each other where the activity of the water equals that of
ice. Only water freezes, so the solution left is the more concentrated the more ice there is
(the lever rule).
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from fem.material.components import GAS_CONSTANT, KELVIN, MOLAR_MASS, latent_heat

Array = NDArray[np.float64]

NORRISH = {"sucrose": 6.47, "glucose": 2.25, "fructose": 2.25}
"""Norrish's constants K [-] of ``ln a_w = ln x_w - K x_s2``; values from memory."""

_NODES, _WEIGHTS = np.polynomial.legendre.leggauss(12)


def ln_ice_activity(T: ArrayLike) -> Array:
    """Logarithm of the activity of water that stands with ice, 0 at 0 degC.

    ``(M / R) * integral from 0 degC to T of L / T2``, with the latent heat that the enthalpies
    use, so that heat and equilibrium agree. Gauss quadrature of 12 points, exact to rounding.

    Parameters
    ----------
    T
        Temperature [degC], 0 or below, any shape.

    Returns
    -------
    ln a_ice [-], shape of `T`.

    """
    T = np.asarray(T, dtype=float)
    half = T[..., None] / 2.0
    t = half * (1.0 + _NODES)
    integral = np.sum(_WEIGHTS * half * latent_heat(t) / (t + KELVIN) ** 2, axis=-1)
    return np.asarray(MOLAR_MASS["water"] / GAS_CONSTANT * integral)


@dataclass(frozen=True)
class Solution:
    """Sugars dissolved in water, per kilogram of product.

    Parameters
    ----------
    water
        Mass of water [kg/kg].
    solute
        Amount dissolved [mol/kg].
    norrish
        sum over the solutes of sqrt(K_i) times their share of the solute [-]; 0 is ideal.

    """

    water: float
    solute: float
    norrish: float

    @classmethod
    def of_sugars(cls, sugars: Mapping[str, float], water: float) -> Solution:
        """Build from mass shares of sugars and of water, both per mass of product [kg/kg]."""
        moles = {name: share / MOLAR_MASS[name] for name, share in sugars.items()}
        solute = sum(moles.values())
        weighted = sum(np.sqrt(NORRISH[name]) * amount for name, amount in moles.items())
        return cls(water, solute, float(weighted / solute) if solute else 0.0)

    def freezing_at(self, T_f: float) -> Solution:
        """Return the same mixture with so much dissolved that ice first appears at `T_f` [degC]."""
        x = float(self.solute_fraction(T_f))
        return Solution(self.water, self.water / MOLAR_MASS["water"] * x / (1.0 - x), self.norrish)

    @property
    def freezing_point(self) -> float:
        """Where ice first appears [degC]."""
        x = self.solute / (self.solute + self.water / MOLAR_MASS["water"])
        wanted = np.log1p(-x) - (self.norrish * x) ** 2
        T = wanted / (MOLAR_MASS["water"] / GAS_CONSTANT * latent_heat(0.0) / KELVIN**2)
        for _ in range(50):
            slope = MOLAR_MASS["water"] / GAS_CONSTANT * latent_heat(T) / (T + KELVIN) ** 2
            step = (ln_ice_activity(T) - wanted) / slope
            T = T - step
            if abs(step) <= 4e-15 * abs(T):
                break
        return float(T)

    def solute_fraction(self, T: ArrayLike) -> Array:
        """Mole fraction of solute in the solution that stands with ice at T [-].

        Solves ``ln(1 - x) - (s x)2 = ln a_ice`` by Newton; the left side is concave and falls,
        so that after the first step the iterates come down to the root one-sidedly.
        """
        wanted = ln_ice_activity(np.asarray(T, dtype=float))
        x = np.asarray(-np.expm1(wanted))
        for _ in range(50):
            rest = np.log1p(-x) - (self.norrish * x) ** 2 - wanted
            step = rest / (-1.0 / (1.0 - x) - 2.0 * self.norrish**2 * x)
            x = x - step
            if np.all(np.abs(step) <= 4e-15 * x):
                break
        return np.asarray(x)

    def ice(self, T: ArrayLike, ends: float) -> Array:
        """Mass of ice per mass of product at T [-].

        Parameters
        ----------
        T
            Temperature [degC], any shape.
        ends
            Below this temperature no more ice forms [degC].

        Returns
        -------
        Ice share, shape of `T`; 0 at and above the freezing point.

        """
        T = np.asarray(T, dtype=float)
        cold = np.clip(T, ends, self.freezing_point)
        x = self.solute_fraction(cold)
        left = MOLAR_MASS["water"] * self.solute * (1.0 - x) / x
        share = np.clip(self.water - left, 0.0, self.water)
        # The freezing point comes from another inversion: its rounding must not leave ice there.
        return np.asarray(np.where(self.freezing_point > T, share, 0.0))
