"""A freezing front at constant speed: the steady profile for any enthalpy and conductivity curve."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.interpolate import CubicHermiteSpline

from fem.exact.grid import Law, nodes_between

Array = NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class TravellingWave:
    """A front at constant speed into liquid: the steady profile behind and ahead of it.

    For a mesh impose `temperature` at the wall as it falls behind the front.

    Parameters
    ----------
    enthalpy, conductivity
        As for `Similarity`.
    T_f
        Temperature whose surface is called the front [degC].
    T_0
        Far ahead [degC], above `T_f`.
    speed
        Of the front [m/s], above 0.
    coldest
        Lowest temperature that will be asked for [degC], below `T_f`.
    breaks
        Temperatures where either curve has a kink.

    Raises
    ------
    ValueError
        Where the temperatures are not in order, the speed is not above 0 or the curves are not
        those of a material.

    """

    enthalpy: Law
    conductivity: Law
    T_f: float
    T_0: float
    speed: float
    coldest: float
    breaks: Iterable[float] = ()
    _nodes: Array = field(init=False, repr=False)
    _behind: Array = field(init=False, repr=False)

    def __post_init__(self) -> None:
        if not self.coldest < self.T_f < self.T_0:
            raise ValueError(
                f"coldest, T_f and T_0 have to rise, got {self.coldest:g}, {self.T_f:g}, {self.T_0:g} degC"
            )
        if not (self.speed > 0 and np.isfinite(self.speed)):
            raise ValueError(f"speed has to be above 0, got {self.speed:g} m/s")
        marks = (*self.breaks, self.T_f)
        T = nodes_between(self.enthalpy, self.coldest, self.T_0, marks, 400)
        if self.T_f not in T:
            raise ValueError(f"T_0 has to be further above T_f, got {self.T_0 - self.T_f:g} K")
        points, weights = np.polynomial.legendre.leggauss(6)
        width = np.diff(T)[:, None]
        inside = T[:-1, None] + width * (points + 1.0) / 2.0
        H_0 = float(self.enthalpy(np.array([self.T_0]))[0])
        below, k = H_0 - self.enthalpy(inside), self.conductivity(inside)
        if not (np.all(below > 0) and np.all(k > 0)):
            raise ValueError("enthalpy has to rise with temperature and conductivity to be above 0")
        rate = k / (self.speed * below)
        parts = np.sum(rate * weights * width / 2.0, axis=1)
        distance = -np.concatenate([[0.0], np.cumsum(parts)])
        object.__setattr__(self, "_nodes", T)
        object.__setattr__(self, "_behind", distance - distance[np.searchsorted(T, self.T_f)])

    def distance(self, T: ArrayLike) -> Array:
        """Return how far behind the front [m] the temperature is `T` [degC]; ahead is negative."""
        T = np.asarray(T, dtype=float)
        if not (np.all(self.coldest <= T) and np.all(self._nodes[-1] >= T)):
            raise ValueError(f"T has to lie from {self.coldest:g} to below {self.T_0:g} degC")
        return np.asarray(CubicHermiteSpline(self._nodes, self._behind, -1.0 / self._slope())(T))

    def temperature(self, behind: ArrayLike) -> Array:
        """Return T [degC] at distances behind the front [m], negative ahead of it."""
        behind = np.asarray(behind, dtype=float)
        if not np.all(behind <= self._behind[0]):
            raise ValueError(f"colder than {self.coldest:g} degC there; lower `coldest`")
        slope = self._slope()
        spline = CubicHermiteSpline(self._behind[::-1], self._nodes[::-1], -slope[::-1])
        end, T_end = self._behind[-1], self._nodes[-1]
        inside = spline(np.maximum(behind, end))
        # Beyond the last row the properties are constant and the approach exponential.
        rate = slope[-1] / (self.T_0 - T_end)
        ahead = self.T_0 - (self.T_0 - T_end) * np.exp(rate * np.minimum(behind - end, 0.0))
        return np.where(behind < end, ahead, inside)

    def _slope(self) -> Array:
        """-dT/d(behind) at the nodes [K/m]."""
        H_0 = float(self.enthalpy(np.array([self.T_0]))[0])
        return np.asarray(self.speed * (H_0 - self.enthalpy(self._nodes)) / self.conductivity(self._nodes))
