"""What passes a surface: heat flux out of the product for each kind of exchange.

A new exchange is a class with its fields and `flux`, and an entry in `EXCHANGES`::

    class Spray(Exchange):
        exchange: Literal["spray"] = "spray"
        water: Annotated[Signal, signal(TEMPERATURE)]

        def flux(self, T: Array, clock: float) -> tuple[Array, Array]:
            return 800.0 * (T - self.water.at(clock)), np.full_like(T, 800.0)
"""

from __future__ import annotations

from abc import ABC, abstractmethod
from typing import Annotated, Literal, Self

import numpy as np
from pydantic import BaseModel, ConfigDict, Field, model_validator

from fem.curve import Array
from fem.errors import Problem, Refused
from fem.quantity import ABSOLUTE_ZERO, COEFFICIENT, FLUX, TEMPERATURE, Emissivity
from fem.signal import Signal, signal

STEFAN_BOLTZMANN = 5.670374419e-8
"""[W/m2/K4]; CODATA 2018, value from memory."""

# From still air in a crowded freezer, 3 to 5, to fast brine, 1250, and water sprays, 500 to 1500:
# laminar plate and cylinder estimates, sprays from memory.
H_RANGE = (3.0, 2000.0)
# Calcium chloride brine, the coldest bath of the trade, is used to about -40 degC (common
# practice, no source); demoulding water is far below 60 degC.
COOLANT_RANGE = (-45.0, 60.0)

Conductance = Annotated[Signal, signal(COEFFICIENT)]
Degrees = Annotated[Signal, signal(TEMPERATURE)]


class Exchange(BaseModel, ABC):
    """How one surface exchanges heat during one stage.

    Temperatures are in degC, the clock is that of the stage [s], and heat that leaves the
    product is positive.
    """

    model_config = ConfigDict(frozen=True, extra="forbid")

    exchange: str

    @abstractmethod
    def flux(self, T: Array, clock: float) -> tuple[Array, Array]:
        """Return the heat flux at surface temperatures.

        Parameters
        ----------
        T
            Surface temperature [degC], any shape.
        clock
            Time since the stage began [s].

        Returns
        -------
        Flux leaving the product [W/m2] and its derivative with respect to `T` [W/m2/K], both of
        the shape of `T`.

        """

    def environment(self, clock: float) -> float | None:
        """Return the temperature that the surface is driven to [degC]; None where there is none."""
        return None

    def coefficient(self, clock: float) -> float | None:
        """Return the heat transfer coefficient [W/m2/K]; None where there is none."""
        return None

    def knots(self) -> Array:
        """Return the clocks at which a value changes its slope [s], rising; steps land on them."""
        return np.unique(np.concatenate([np.zeros(0), *(s.knots for s in self._signals().values())]))

    def cautions(self) -> list[str]:
        """Return sentences about values far outside the trade's range; empty where all is usual."""
        said = []
        values = self._signals()
        if "h" in values:
            said += _outside("h", values["h"], H_RANGE, "W/m2/K", "crowded still air to fast brine or spray")
        for name in ("coolant", "temperature", "air"):
            if name in values:
                said += _outside(name, values[name], COOLANT_RANGE, "degC", "cold brine to warm water")
        return said

    def _signals(self) -> dict[str, Signal]:
        fields = {name: getattr(self, name) for name in type(self).model_fields}
        return {name: value for name, value in fields.items() if isinstance(value, Signal)}


class Fluid(Exchange):
    """A fluid that flows past: flux = h (T - coolant).

    Parameters
    ----------
    h
        Heat transfer coefficient [W/m2/K].
    coolant
        Temperature of the fluid [degC].

    """

    exchange: Literal["fluid"] = "fluid"
    h: Conductance
    coolant: Degrees

    def flux(self, T: Array, clock: float) -> tuple[Array, Array]:
        """Return flux [W/m2] and its derivative [W/m2/K] at surface temperatures [degC]."""
        h = self.h.at(clock)
        return h * (T - self.coolant.at(clock)), np.full_like(T, h)

    def environment(self, clock: float) -> float:
        """Return the coolant's temperature [degC]."""
        return self.coolant.at(clock)

    def coefficient(self, clock: float) -> float:
        """Return h [W/m2/K]."""
        return self.h.at(clock)


class Fixed(Exchange):
    """A surface held at a temperature, as if h had no limit.

    Parameters
    ----------
    temperature
        Temperature of the surface itself [degC].

    """

    exchange: Literal["fixed"] = "fixed"
    temperature: Degrees

    def flux(self, T: Array, clock: float) -> tuple[Array, Array]:
        """Raise TypeError: the flux follows from the temperature, not the other way about."""
        raise TypeError("a fixed surface has no flux of its own; impose surface_temperature instead")

    def surface_temperature(self, clock: float) -> float:
        """Return the temperature to impose [degC]."""
        return self.temperature.at(clock)

    def environment(self, clock: float) -> float:
        """Return the temperature of the surface [degC]."""
        return self.temperature.at(clock)


class Flux(Exchange):
    """A heat flux that is known beforehand.

    Parameters
    ----------
    flux_out
        Heat flux, positive where it leaves the product [W/m2].

    """

    exchange: Literal["flux"] = "flux"
    flux_out: Annotated[Signal, signal(FLUX), Field(alias="flux")]

    def flux(self, T: Array, clock: float) -> tuple[Array, Array]:
        """Return flux [W/m2] and its derivative, 0, at surface temperatures [degC]."""
        return np.full_like(T, self.flux_out.at(clock)), np.zeros_like(T)


class Radiant(Exchange):
    """Radiation of a small surface in large surroundings, with or without air that flows past.

    flux = emissivity sigma (T^4 - surroundings^4) + h (T - air), fourth powers in kelvin.

    Parameters
    ----------
    emissivity
        Emissivity of the surface [-].
    surroundings
        Temperature of the walls around [degC], such as "-18 degC".
    h
        Heat transfer coefficient of the air, its convection only [W/m2/K], such as "5 W/m2/K";
        with `air` or not at all.
    air
        Temperature of the air [degC], such as "-18 degC"; with `h` or not at all.

    """

    exchange: Literal["radiant"] = "radiant"
    emissivity: Emissivity
    surroundings: Degrees
    h: Conductance | None = None
    air: Degrees | None = None

    @model_validator(mode="after")
    def _air_is_whole(self) -> Self:
        if self.h is not None and self.air is None:
            message = 'is missing: h needs the temperature of the air, such as "-18 degC"'
            raise Refused([Problem("air", message)])
        if self.air is not None and self.h is None:
            raise Refused([Problem("h", 'is missing: air needs its coefficient, such as "5 W/m2/K"')])
        return self

    def flux(self, T: Array, clock: float) -> tuple[Array, Array]:
        """Return flux [W/m2] and its derivative [W/m2/K] at surface temperatures [degC]."""
        strength = self.emissivity * STEFAN_BOLTZMANN
        kelvin = T - ABSOLUTE_ZERO
        walls = self.surroundings.at(clock) - ABSOLUTE_ZERO
        flux = strength * (kelvin**4 - walls**4)
        slope = 4.0 * strength * kelvin**3
        if self.h is not None and self.air is not None:
            h = self.h.at(clock)
            flux = flux + h * (T - self.air.at(clock))
            slope = slope + h
        return flux, slope

    def environment(self, clock: float) -> float:
        """Return the temperature at which radiation and air balance [degC]."""
        surroundings = self.surroundings.at(clock)
        if self.air is None:
            return surroundings
        # The flux rises and bends upwards with T: Newton from the warmer end comes down to the root.
        T = np.array(max(surroundings, self.air.at(clock)))
        for _ in range(8):
            flux, slope = self.flux(T, clock)
            T = T - flux / slope
        return float(T)

    def coefficient(self, clock: float) -> float:
        """Return the slope of the flux at the environment's temperature [W/m2/K]."""
        _, slope = self.flux(np.array(self.environment(clock)), clock)
        return float(slope)


class Insulated(Exchange):
    """No heat passes."""

    exchange: Literal["insulated"] = "insulated"

    def flux(self, T: Array, clock: float) -> tuple[Array, Array]:
        """Return 0 and 0, of the shape of `T`."""
        return np.zeros_like(T), np.zeros_like(T)


EXCHANGES: dict[str, type[Exchange]] = {
    "fluid": Fluid,
    "fixed": Fixed,
    "flux": Flux,
    "radiant": Radiant,
    "insulated": Insulated,
}


def _outside(name: str, values: Signal, usual: tuple[float, float], unit: str, span: str) -> list[str]:
    least, most = usual
    if values.least >= least and values.most <= most:
        return []
    extreme = values.least if values.least < least else values.most
    usual_range = f"{least:g} to {most:g} {unit} ({span})"
    return [f"{name} = {extreme:.4g} {unit} is far outside the trade's range, {usual_range}"]
