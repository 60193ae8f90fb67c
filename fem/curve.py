"""Enthalpy, temperature and conductivity of one material, tied together exactly.

Between rows the heat capacity and the conductivity are straight lines of temperature, so the
enthalpy and the Kirchhoff integral are parabolas: the enthalpy inverts in closed form, and the
integral needs no quadrature. Rows may lie as close as rounding allows. A jump in either curve
is a short row like any other; nothing is merged or smoothed.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

Array = NDArray[np.float64]

JUMP = 0.2
"""Heat released within this range can count as released at one temperature [K]."""


class State(NamedTuple):
    """What the solver needs at an enthalpy; all of one shape.

    Parameters
    ----------
    temperature
        [degC].
    kirchhoff
        Integral of k dT from 0 degC [W/m].
    capacity
        dH/dT [J/m3/K].
    conductivity
        [W/m/K].

    """

    temperature: Array
    kirchhoff: Array
    capacity: Array
    conductivity: Array


@dataclass(frozen=True, eq=False)
class Curve:
    """H(T), its exact inverse T(H), k(T) and the integral of k, for arrays of any shape.

    Built by `from_enthalpy` or `from_capacity`. Below the first and above the last row the
    capacity keeps its end value and the conductivity is held.

    Parameters
    ----------
    T
        Rows of temperature, strictly rising [degC], shape (n,).
    H
        Enthalpy at the rows, strictly rising [J/m3], shape (n,).
    c, c_slope
        Capacity at the start of each interval [J/m3/K] and its slope [J/m3/K2], shape (n + 1,):
        interval i lies between rows i - 1 and i, the outermost two are the extensions.
    k, k_slope
        Conductivity likewise [W/m/K], [W/m/K2], shape (n + 1,).
    theta
        Kirchhoff integral at the rows [W/m], 0 at 0 degC, shape (n,).

    """

    T: Array
    H: Array
    c: Array
    c_slope: Array
    k: Array
    k_slope: Array
    theta: Array

    def jumps(self, interval: int) -> bool:
        """Whether an interval, counted from its upper row, gives up heat as if at one temperature.

        It is at most `JUMP` wide and takes more heat than 20 K of its surroundings do.
        """
        first, last = self.T[interval - 1], self.T[interval]
        if last - first > JUMP:
            return False
        around = min(float(self.capacity(first - JUMP)), float(self.capacity(last + JUMP)))
        return bool(self.H[interval] - self.H[interval - 1] > 20.0 * around)

    @classmethod
    def from_enthalpy(cls, T: ArrayLike, H: ArrayLike, k: ArrayLike) -> Curve:
        """Build from rows of enthalpy: straight lines between, end slopes beyond.

        Parameters
        ----------
        T
            Temperature [degC], strictly rising, two rows or more.
        H
            Enthalpy [J/m3], strictly rising.
        k
            Conductivity at the rows [W/m/K], above 0.

        Raises
        ------
        ValueError
            Where the rows do not rise, are not finite or differ in number.

        """
        T, H, k = _rows(T, H, k)
        if len(T) < 2:
            raise ValueError("two rows at least are needed")
        if not np.all(np.diff(H) > 0):
            row = int(np.argmax(np.diff(H) <= 0))
            raise ValueError(f"enthalpy does not rise between {T[row]:.6g} and {T[row + 1]:.6g} degC")
        slope = np.diff(H) / np.diff(T)
        c = np.concatenate([slope[:1], slope, slope[-1:]])
        return cls._assemble(T, H, c, np.zeros_like(c), k)

    @classmethod
    def from_capacity(cls, T: ArrayLike, c: ArrayLike, k: ArrayLike) -> Curve:
        """Build from rows of heat capacity, straight lines between and held beyond; H(0 degC) = 0.

        Parameters
        ----------
        T
            Temperature [degC], strictly rising, one row or more.
        c
            Heat capacity [J/m3/K], above 0.
        k
            Conductivity [W/m/K], above 0.

        Raises
        ------
        ValueError
            Where the rows do not rise, are not finite or differ in number.

        """
        T, c, k = _rows(T, c, k)
        if not np.all(c > 0):
            raise ValueError("heat capacity has to be above 0 everywhere")
        H = np.concatenate([[0.0], np.cumsum(np.diff(T) * (c[:-1] + c[1:]) / 2)])
        start = np.concatenate([c[:1], c])
        slope = np.concatenate([[0.0], np.diff(c) / np.diff(T), [0.0]])
        raw = cls._assemble(T, H, start, slope, k)
        return cls._assemble(T, H - raw.enthalpy(0.0), start, slope, k)

    @classmethod
    def _assemble(cls, T: Array, H: Array, c: Array, c_slope: Array, k: Array) -> Curve:
        if not np.all(k > 0):
            raise ValueError("conductivity has to be above 0 everywhere")
        start = np.concatenate([k[:1], k])
        slope = np.concatenate([[0.0], np.diff(k) / np.diff(T), [0.0]])
        theta = np.concatenate([[0.0], np.cumsum(np.diff(T) * (k[:-1] + k[1:]) / 2)])
        raw = cls(T, H, c, c_slope, start, slope, theta)
        return cls(T, H, c, c_slope, start, slope, theta - raw.kirchhoff(0.0))

    def enthalpy(self, T: ArrayLike) -> Array:
        """Return H [J/m3] at temperatures [degC]."""
        T = np.asarray(T, dtype=float)
        i, row = self._interval(self.T, T)
        d = T - self.T[row]
        return np.asarray(self.H[row] + d * (self.c[i] + 0.5 * self.c_slope[i] * d))

    def temperature(self, H: ArrayLike) -> Array:
        """Return T [degC] at enthalpies [J/m3]; the exact inverse of `enthalpy`."""
        return self.at(H).temperature

    def conductivity(self, T: ArrayLike) -> Array:
        """Return k [W/m/K] at temperatures [degC]."""
        T = np.asarray(T, dtype=float)
        i, row = self._interval(self.T, T)
        return np.asarray(self.k[i] + self.k_slope[i] * (T - self.T[row]))

    def kirchhoff(self, T: ArrayLike) -> Array:
        """Return the integral of k dT from 0 degC [W/m] at temperatures [degC]."""
        T = np.asarray(T, dtype=float)
        i, row = self._interval(self.T, T)
        d = T - self.T[row]
        return np.asarray(self.theta[row] + d * (self.k[i] + 0.5 * self.k_slope[i] * d))

    def capacity(self, T: ArrayLike) -> Array:
        """Return dH/dT [J/m3/K] at temperatures [degC]."""
        T = np.asarray(T, dtype=float)
        i, row = self._interval(self.T, T)
        return np.asarray(self.c[i] + self.c_slope[i] * (T - self.T[row]))

    def at(self, H: ArrayLike) -> State:
        """Return temperature, Kirchhoff integral, capacity and conductivity at enthalpies [J/m3].

        One search serves all four: this is what each iteration of the solver calls.
        """
        H = np.asarray(H, dtype=float)
        i, row = self._interval(self.H, H)
        rise = H - self.H[row]
        c, c_slope = self.c[i], self.c_slope[i]
        # The root of c d + c_slope d2 / 2 = rise in the form that does not cancel.
        root = np.sqrt(np.maximum(c * c + 2.0 * c_slope * rise, 0.0))
        d = 2.0 * rise / (c + root)
        k, k_slope = self.k[i], self.k_slope[i]
        return State(
            temperature=np.asarray(self.T[row] + d),
            kirchhoff=np.asarray(self.theta[row] + d * (k + 0.5 * k_slope * d)),
            capacity=np.asarray(root),
            conductivity=np.asarray(k + k_slope * d),
        )

    @staticmethod
    def _interval(rows: Array, x: Array) -> tuple[NDArray[np.intp], NDArray[np.intp]]:
        """Return the interval of each value, and the row that its parabola starts from."""
        i = np.searchsorted(rows, x, side="right")
        return i, np.maximum(i - 1, 0)


def _rows(*columns: ArrayLike) -> list[Array]:
    rows = [np.atleast_1d(np.array(column, dtype=float)) for column in columns]
    if len({len(row) for row in rows}) != 1:
        raise ValueError(f"columns differ in length: {', '.join(str(len(row)) for row in rows)}")
    if not all(np.all(np.isfinite(row)) for row in rows):
        raise ValueError("every value has to be finite")
    if not np.all(np.diff(rows[0]) > 0):
        row = int(np.argmax(np.diff(rows[0]) <= 0))
        raise ValueError(f"temperature does not rise between rows {row + 1} and {row + 2}")
    return rows
