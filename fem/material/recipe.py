"""`kind = "recipe"`: a mix described by what is in it."""

from __future__ import annotations

from typing import Literal

import numpy as np
from numpy.typing import NDArray
from pydantic import BaseModel, ConfigDict, field_validator, model_validator

from fem.curve import Curve
from fem.errors import Problem, Refused
from fem.material import components
from fem.material.conductivity import LAWS, maxwell_eucken, parallel
from fem.material.freezing import Solution
from fem.material.material import Material
from fem.quantity import Density, Factor, Share, Temperature

Array = NDArray[np.float64]

SUGARS = ("sucrose", "glucose", "fructose")
SOLIDS = (*SUGARS, "fat", "protein", "fibre", "ash")

POURED = 4.0
"""Temperature at which the density is computed [degC]: a mix as it is filled (common practice)."""

LEAST_SUGAR = 0.4
"""Sugar below which a recipe is refused [%]: less is a fraction typed as a percentage, or water."""

NEAREST_FREEZING_POINT = -0.01
"""Freezing point above which a recipe is refused [degC]; 0.2 % sugar."""

MOST_AIR = 70.0
"""Share of air above which a recipe is refused [%]: more is foam, or an overrun typed as a share."""

_COLDEST, _WARMEST = -80.0, 60.0  # first and last row [degC]; the end slopes go on beyond


class Recipe(BaseModel):
    """A water-ice mix: mass shares of its solids; the rest is water.

    Parameters
    ----------
    sucrose
        By mass of the mix [%].
    glucose, fructose
        By mass of the mix [%], such as "2.4 %"; invert sugar is both in equal parts.
    fat, protein, fibre, ash
        By mass of the mix [%], such as "1 %"; does not lower the freezing point.
    air
        By volume of the product as poured [%], such as "20 %"; an overrun of 25 % is 20 % air.
    freezing_point
        As measured [degC], such as "-1.6 degC"; so many moles are taken as dissolved that ice first
        appears there. Give it where salts, acids or alcohol lower it too; computed from the sugars
        if left out.
    density
        Density of the product as poured, air included [kg/m3]; computed if left out.
    conductivity_law
        How ice and solution share the heat: "levy", or one of the bounds "solution continuous"
        and "ice continuous".
    conductivity_factor
        Multiplies the conductivity at every temperature [-].
    ice_ends
        Below it no more ice forms [degC]: the solution left has become too stiff. About -32 to
        -34 degC for sucrose (value from memory), such as "-33 degC".

    """

    model_config = ConfigDict(frozen=True, extra="forbid")

    kind: Literal["recipe"] = "recipe"
    sucrose: Share = 0.0
    glucose: Share = 0.0
    fructose: Share = 0.0
    fat: Share = 0.0
    protein: Share = 0.0
    fibre: Share = 0.0
    ash: Share = 0.0
    air: Share = 0.0
    freezing_point: Temperature | None = None
    density: Density | None = None
    conductivity_law: Literal["levy", "solution continuous", "ice continuous"] = "levy"
    conductivity_factor: Factor = 1.0
    ice_ends: Temperature = -33.0

    @field_validator("freezing_point", "ice_ends")
    @classmethod
    def _below_zero(cls, T: float | None) -> float | None:
        if T is not None and T >= 0.0:
            raise ValueError(f"must be below 0 degC, got {T:.4g} degC")
        return T

    @field_validator("freezing_point")
    @classmethod
    def _not_water(cls, T: float | None) -> float | None:
        if T is not None and T > NEAREST_FREEZING_POINT:
            raise ValueError(
                f"must be at most {NEAREST_FREEZING_POINT:.4g} degC, got {T:.4g} degC; "
                'what freezes so near 0 degC is water: use kind = "melting"'
            )
        return T

    @field_validator("air")
    @classmethod
    def _not_foam(cls, air: float) -> float:
        if air > MOST_AIR:
            raise ValueError(
                f"must be at most {MOST_AIR:.4g} % of the volume, got {air:.4g} %; "
                "air is the share of the product's volume: an overrun of 100 % is 50 % air"
            )
        return air

    @model_validator(mode="after")
    def _makes_a_mix(self) -> Recipe:
        shares = {name: getattr(self, name) for name in SOLIDS if getattr(self, name)}
        listed = " + ".join(f"{name} {share:.4g} %" for name, share in shares.items())
        total, sugar = sum(shares.values()), sum(getattr(self, name) for name in SUGARS)
        if total >= 100.0:
            largest = max(shares, key=lambda name: shares[name])
            message = (
                f"{listed} make {total:.4g} % by mass; together they must stay below 100 %, the rest is water"
            )
            raise Refused([Problem(largest, message)])
        if sugar == 0.0 and self.freezing_point is None:
            message = (
                "has no sugar and no freezing_point; give sucrose, glucose or fructose by mass, or a "
                'freezing_point. Pure water melts at one temperature: use kind = "melting"'
            )
            raise Refused([Problem("", message)])
        if 0.0 < sugar < LEAST_SUGAR and self.freezing_point is None:
            name = next(name for name in SUGARS if getattr(self, name))
            raise Refused([Problem(name, _too_little(name, getattr(self, name), sugar))])
        if (T_f := self._solution().freezing_point) <= self.ice_ends + 0.1:
            key = "ice_ends" if self.freezing_point is None else "freezing_point"
            message = (
                f"ice would first appear at {T_f:.4g} degC, but no ice forms below ice_ends = "
                f"{self.ice_ends:.4g} degC; the mix would never freeze"
            )
            raise Refused([Problem(key, message)])
        return self

    def build(self) -> Material:
        """Return the material: enthalpy, conductivity and ice on rows between -80 and 60 degC."""
        solution = self._solution()
        T_f = solution.freezing_point
        computed = self._poured_density()
        density = self.density or computed
        T = _rows(T_f, self.ice_ends)
        ice = solution.ice(T, self.ice_ends)
        h = self._enthalpy(T, ice)
        k = self._conductivity(T, ice)
        rows = slice(None, int(np.searchsorted(T, T_f)) + 1)
        return Material(
            kind=self.kind,
            curve=Curve.from_enthalpy(T, density * h, k),
            density=density,
            range=components.RANGE,
            freezes=True,
            freezing_point=T_f,
            ice_rows=(T, ice),
            latent_rows=(T[rows], density * _latent(T[rows], ice[rows])),
            cautions=self._cautions(T_f, density, computed),
        )

    def _shares(self) -> dict[str, float]:
        return {name: getattr(self, name) / 100.0 for name in SOLIDS if getattr(self, name) > 0.0}

    def _water(self) -> float:
        return 1.0 - sum(self._shares().values())

    def _solution(self) -> Solution:
        sugars = {name: share for name, share in self._shares().items() if name in SUGARS}
        solution = Solution.of_sugars(sugars, self._water())
        return solution if self.freezing_point is None else solution.freezing_at(self.freezing_point)

    def _poured_density(self) -> float:
        volume = self._water() / components.water_density(POURED)
        for name, share in self._shares().items():
            volume += share / components.SOLIDS[name].density_at(POURED)
        return float((1.0 - self.air / 100.0) / volume)

    def _enthalpy(self, T: Array, ice: Array) -> Array:
        """Enthalpy per mass [J/kg]: a function of state, for each part is; mixing gives no heat."""
        h = (self._water() - ice) * components.water_enthalpy(T) + ice * components.ice_enthalpy(T)
        for name, share in self._shares().items():
            h = h + share * components.SOLIDS[name].enthalpy_at(T)
        return h

    def _conductivity(self, T: Array, ice: Array) -> Array:
        """Conductivity [W/m/K]: water and solids side by side, ice among them, air in all of it."""
        volumes = [(self._water() - ice) / components.water_density(T)]
        conductivities = [components.water_conductivity(T)]
        for name, share in self._shares().items():
            volumes.append(share / components.SOLIDS[name].density_at(T))
            conductivities.append(components.SOLIDS[name].conductivity_at(T))
        unfrozen = np.sum(volumes, axis=0)
        solution = parallel(np.array(volumes) / unfrozen, conductivities)
        ice_volume = ice / components.ice_density(T)
        law = LAWS[self.conductivity_law]
        k = law(solution, components.ice_conductivity(T), ice_volume / (ice_volume + unfrozen))
        # The air's share of the volume is taken as poured: freezing swells the rest by 6 to 8 %.
        k = maxwell_eucken(k, components.AIR_CONDUCTIVITY, self.air / 100.0)
        return self.conductivity_factor * k

    def _cautions(self, T_f: float, density: float, computed: float) -> tuple[str, ...]:
        said = []
        if abs(density / computed - 1.0) > 0.05:
            said.append(
                f"density {density:.4g} kg/m3 is {100 * (density / computed - 1):+.0f} % off the "
                f"{computed:.4g} kg/m3 that the recipe makes"
            )
        sugar = self.sucrose + self.glucose + self.fructose
        if sugar > 42.0:
            said.append(
                f"{sugar:.4g} % sugar: the freezing curve was compared with handbook values up to 42 % only"
            )
        return tuple(said)


def _rows(T_f: float, ice_ends: float) -> Array:
    """Return temperatures [degC] on which straight lines miss T(H) by 1e-4 K at most.

    The freezing point and the end of ice are rows themselves.
    """
    # While ice forms the enthalpy bends like 1/T: rows equally spaced in the root of -T, a
    # hundredth apart, share the error evenly.
    root_f, root_end = np.sqrt(-T_f), np.sqrt(-ice_ends)
    freezing = -(np.linspace(root_end, root_f, 2 + int((root_end - root_f) / 0.01)) ** 2)
    freezing[0], freezing[-1] = ice_ends, T_f
    coldest = min(_COLDEST, ice_ends - 10.0)
    cold = np.linspace(coldest, ice_ends, 2 + int((ice_ends - coldest) / 0.25))
    warm = np.linspace(T_f, _WARMEST, 2 + int((_WARMEST - T_f) / 0.5))
    return np.concatenate([cold[:-1], freezing, warm[1:]])


def _latent(T: Array, ice: Array) -> Array:
    """Latent heat given up since the freezing point, the last row [J/kg]: the integral of L over ice."""
    L = components.latent_heat(T)
    parts = -np.diff(ice) * (L[:-1] + L[1:]) / 2.0
    return np.concatenate([np.cumsum(parts[::-1])[::-1], [0.0]])


def _too_little(name: str, share: float, sugar: float) -> str:
    text = f"{sugar:.4g} % sugar is less than the {LEAST_SUGAR:.4g} % a recipe needs"
    guess = f'{name} = "{100.0 * share:.4g} %"'
    return (
        f"{text}; most likely a fraction written as a percentage: {guess}? "
        'Water with so little sugar melts at one temperature: use kind = "melting"'
    )
