"""Materials that the exact solutions are written for, and the same as rows of a table."""

from __future__ import annotations

from dataclasses import dataclass, fields
from math import isfinite
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

ABSOLUTE_ZERO = -273.15


class Rows(NamedTuple):
    """A material as rows of a table; straight lines between, each jump a short row.

    Parameters
    ----------
    temperature
        Strictly rising [degC], shape (n,).
    enthalpy
        Strictly rising [J/m3], shape (n,); 0 for the liquid at 0 degC.
    conductivity
        [W/m/K], shape (n,).

    """

    temperature: Array
    enthalpy: Array
    conductivity: Array


class Step(NamedTuple):
    """One zone of constant properties and what is set free where it ends.

    Parameters
    ----------
    conductivity
        [W/m/K].
    capacity
        Heat capacity per volume, the latent heat of the zone's own range in it [J/m3/K].
    end
        Temperature where the zone ends [degC]; infinite for the liquid.
    latent
        Latent heat set free at that temperature alone [J/m3].

    """

    conductivity: float
    capacity: float
    end: float
    latent: float


@dataclass(frozen=True)
class SharpFreezing:
    """Freezes at one temperature; constant properties, one density.

    Parameters
    ----------
    k_s, k_l
        Conductivity of solid and liquid [W/m/K].
    c_s, c_l
        Heat capacity of solid and liquid [J/kg/K].
    rho
        Density of both [kg/m3].
    latent_heat
        [J/kg].
    T_m
        Melting temperature [degC].

    Raises
    ------
    ValueError
        Where a property is not above 0 or a value is not finite.

    """

    k_s: float
    c_s: float
    k_l: float
    c_l: float
    rho: float
    latent_heat: float
    T_m: float

    def __post_init__(self) -> None:
        _check(self, temperatures=("T_m",))

    @property
    def liquid_from(self) -> float:
        """Temperature above which nothing is frozen [degC]."""
        return self.T_m

    def steps(self) -> tuple[Step, ...]:
        """Return the zones from cold to warm."""
        return (
            Step(self.k_s, self.rho * self.c_s, self.T_m, self.rho * self.latent_heat),
            Step(self.k_l, self.rho * self.c_l, np.inf, 0.0),
        )

    def rows(self, low: float, high: float, width: float = 1e-6) -> Rows:
        """Return the material as rows from `low` to `high` [degC]; see `rows_of`."""
        return rows_of(self.steps(), low, high, width)


@dataclass(frozen=True)
class RangeFreezing:
    """Freezes over a range, the solid fraction a straight line of temperature in it.

    Parameters
    ----------
    k_s, k_m, k_l
        Conductivity of solid, freezing zone and liquid [W/m/K].
    c_s, c_m, c_l
        Heat capacity of the three [J/kg/K], that of the freezing zone without latent heat.
    rho
        Density of all [kg/m3].
    latent_heat
        [J/kg].
    T_s, T_l
        Solidus and liquidus [degC].
    share
        Part of the latent heat set free at the solidus alone [-], 0 to less than 1.

    Raises
    ------
    ValueError
        Where a property is not above 0, a value is not finite, the solidus is not below the
        liquidus or the share is outside its range.

    """

    k_s: float
    c_s: float
    k_m: float
    c_m: float
    k_l: float
    c_l: float
    rho: float
    latent_heat: float
    T_s: float
    T_l: float
    share: float = 0.0

    def __post_init__(self) -> None:
        _check(self, temperatures=("T_s", "T_l", "share"))
        if not self.T_s < self.T_l:
            raise ValueError(f"T_s has to be below T_l = {self.T_l:g} degC, got {self.T_s:g} degC")
        if not 0.0 <= self.share < 1.0:
            raise ValueError(f"share has to be 0 to less than 1, got {self.share:g}")

    @property
    def liquid_from(self) -> float:
        """Temperature above which nothing is frozen [degC]."""
        return self.T_l

    @property
    def effective_capacity(self) -> float:
        """Heat capacity of the freezing zone with its latent heat [J/kg/K]."""
        return self.c_m + (1.0 - self.share) * self.latent_heat / (self.T_l - self.T_s)

    def steps(self) -> tuple[Step, ...]:
        """Return the zones from cold to warm."""
        return (
            Step(self.k_s, self.rho * self.c_s, self.T_s, self.rho * self.share * self.latent_heat),
            Step(self.k_m, self.rho * self.effective_capacity, self.T_l, 0.0),
            Step(self.k_l, self.rho * self.c_l, np.inf, 0.0),
        )

    def rows(self, low: float, high: float, width: float = 1e-6) -> Rows:
        """Return the material as rows from `low` to `high` [degC]; see `rows_of`."""
        return rows_of(self.steps(), low, high, width)


def rows_of(steps: tuple[Step, ...], low: float, high: float, width: float) -> Rows:
    """Write zones as rows of a table.

    A jump of enthalpy or conductivity is a row of the given width that ends at the nominal
    temperature: liquid at exactly its melting temperature is still wholly liquid.

    Parameters
    ----------
    steps
        Zones from cold to warm.
    low, high
        Temperatures of the first and the last row [degC].
    width
        Width of a jump [K].

    Raises
    ------
    ValueError
        If a jump does not lie between `low` and `high`, or jumps overlap.

    """
    ends = [step.end for step in steps[:-1]]
    marks = [low, *(mark for end in ends for mark in (end - width, end)), high]
    if not (width > 0 and np.all(np.diff(marks) > 0)):
        raise ValueError(
            f"rows have to rise from {low:g} over every jump ({width:g} K wide, up to "
            f"{', '.join(f'{end:g}' for end in ends)}) to {high:g} degC"
        )
    T, H, k = [low], [0.0], [steps[0].conductivity]
    for step, following in zip(steps, (*steps[1:], None), strict=True):
        top = high if following is None else step.end - width
        T.append(top)
        H.append(H[-1] + step.capacity * (top - T[-2]))
        k.append(step.conductivity)
        if following is not None:
            # With the colder zone's own heat in the jump, H is exact everywhere outside it.
            T.append(step.end)
            H.append(H[-1] + step.latent + step.capacity * width)
            k.append(following.conductivity)
    liquid_at_0 = H[-1] - steps[-1].capacity * high
    return Rows(np.array(T), np.array(H) - liquid_at_0, np.array(k))


def _check(material: SharpFreezing | RangeFreezing, temperatures: tuple[str, ...]) -> None:
    for item in fields(material):
        value = getattr(material, item.name)
        if not isfinite(value):
            raise ValueError(f"{item.name} has to be finite, got {value}")
        if item.name not in temperatures and value <= 0:
            raise ValueError(f"{item.name} has to be above 0, got {value:g}")
