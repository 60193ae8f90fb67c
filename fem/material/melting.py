"""`kind = "melting"`: a pure substance that freezes at one temperature."""

from __future__ import annotations

from typing import Literal

import numpy as np
from pydantic import BaseModel, ConfigDict, model_validator

from fem.curve import Curve
from fem.errors import Problem, Refused
from fem.material.material import Material
from fem.quantity import (
    ABSOLUTE_ZERO,
    TEMPERATURE,
    Conductivity,
    Density,
    Difference,
    HeatCapacity,
    LatentHeat,
    Temperature,
)

LEAST_RANGE = 1e-7
"""Narrowest melting range [K]: below it the enthalpy does not resolve the temperature."""

_REACH = 100.0  # how far the outer rows lie beyond the range [K]; they only carry the end slopes


class Phase(BaseModel):
    """What the solid, or the liquid, conducts and stores.

    Parameters
    ----------
    conductivity
        Conductivity [W/m/K], such as "2.2 W/m/K".
    heat_capacity
        Heat capacity [J/kg/K], such as "2050 J/kg/K".

    """

    model_config = ConfigDict(frozen=True, extra="forbid")

    conductivity: Conductivity
    heat_capacity: HeatCapacity


class Melting(BaseModel):
    """A substance with one melting point and constant properties on either side of it.

    Parameters
    ----------
    melting_point
        Temperature at which it melts [degC], such as "0 degC"; a start at this temperature is liquid.
    latent_heat
        Latent heat [J/kg], beyond the sensible heat of the range.
    melting_range
        Width over which it melts, centred on the melting point [K], such as "0.5 K"; linear within.
    density
        Density of both phases [kg/m3].
    solid
        Properties below the melting range.
    liquid
        Properties above the melting range.

    """

    model_config = ConfigDict(frozen=True, extra="forbid")

    kind: Literal["melting"] = "melting"
    melting_point: Temperature
    latent_heat: LatentHeat
    melting_range: Difference = 0.001
    density: Density
    solid: Phase
    liquid: Phase

    @model_validator(mode="after")
    def _range_resolved(self) -> Melting:
        if self.melting_range < LEAST_RANGE:
            message = f"must be at least {LEAST_RANGE:.4g} K, got {self.melting_range:.4g} K"
            raise Refused([Problem("melting_range", message)])
        if self.melting_point - self.melting_range / 2.0 <= ABSOLUTE_ZERO:
            message = f"{self.melting_range:.4g} K about {self.melting_point:.4g} degC reaches absolute zero"
            raise Refused([Problem("melting_range", message)])
        return self

    def build(self) -> Material:
        """Return the material; enthalpy 0 at 0 degC on the line of the liquid."""
        half = self.melting_range / 2.0
        low, high = self.melting_point - half, self.melting_point + half
        solid, liquid = self.density * self.solid.heat_capacity, self.density * self.liquid.heat_capacity
        latent = self.density * self.latent_heat
        top = liquid * high
        bottom = top - latent - (solid + liquid) / 2.0 * (high - low)
        k_s, k_l = self.solid.conductivity, self.liquid.conductivity
        curve = Curve.from_enthalpy(
            [low - _REACH, low, high, high + _REACH],
            [bottom - solid * _REACH, bottom, top, top + liquid * _REACH],
            [k_s, k_s, k_l, k_l],
        )
        rows = np.array([low, high])
        return Material(
            kind=self.kind,
            curve=curve,
            density=self.density,
            range=(ABSOLUTE_ZERO, float(TEMPERATURE.most or np.inf)),
            freezes=True,
            freezing_point=self.melting_point,
            melting_point=self.melting_point,
            melting_range=self.melting_range,
            ice_rows=(rows, np.array([1.0, 0.0])),
            latent_rows=(rows, np.array([latent, 0.0])),
        )
