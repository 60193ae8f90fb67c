"""Freezing of a half space for any enthalpy and conductivity curve: to rounding, not closed.

With eta = x / (2 sqrt t) the heat equation becomes (k T')' + 2 eta H' T' = 0. It is marched in
temperature from the wall outwards, with eta and p = k T' + 2 eta (H - H_0) as unknowns: the slope
of H is never asked for, so a jump 1e-6 K wide is a stretch like any other, and every curve is
evaluated once, before the search for the wall flux begins.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass, field
from math import inf, pi, sqrt

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.interpolate import CubicHermiteSpline
from scipy.optimize import brentq
from scipy.special import erfcinv, erfcx

from fem.exact.grid import Law, nodes_between
from fem.exact.material import ABSOLUTE_ZERO

Array = NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class Similarity:
    """Exact solution for any H(T) and k(T) under a wall that steps to its temperature.

    Parameters
    ----------
    enthalpy
        H [J/m3] of an array of temperatures [degC]; rising, jumps as short stretches.
    conductivity
        k [W/m/K] likewise.
    T_w
        Wall [degC].
    T_0
        Start [degC], above the wall.
    breaks
        Temperatures where either curve has a kink: all rows of a table, or the freezing point.
    steps
        Stretches that the temperature and the enthalpy are each cut into at least.

    Raises
    ------
    ValueError
        Where the start is not above the wall, the enthalpy does not rise, the conductivity is
        not above 0, or either is not finite.

    """

    enthalpy: Law
    conductivity: Law
    T_w: float
    T_0: float
    breaks: Iterable[float] = ()
    steps: int = 400
    _path: _Path = field(init=False, repr=False)

    def __post_init__(self) -> None:
        if not ABSOLUTE_ZERO <= self.T_w < self.T_0 < inf:
            raise ValueError(f"T_0 has to be above T_w = {self.T_w:g} degC, got {self.T_0:g} degC")
        grid = _Grid.build(self)
        low, high = grid.guess()
        flux = float(np.exp(brentq(lambda log: grid.miss(np.exp(log)), low, high, xtol=1e-14, rtol=1e-14)))
        object.__setattr__(self, "_path", grid.path(flux))

    def front(self, level: float, t: ArrayLike) -> Array:
        """Return the distance from the wall [m] where T is `level` [degC], at times [s].

        Raises
        ------
        ValueError
            If `level` does not lie from the wall's temperature to below the start.

        """
        if not self.T_w <= level < self.T_0:
            raise ValueError(
                f"level has to lie from {self.T_w:g} to below {self.T_0:g} degC, got {level:g} degC"
            )
        t = np.asarray(t, dtype=float)
        if not np.all(t >= 0):
            raise ValueError("time has to be 0 s or more")
        return np.asarray(2.0 * self._path.position(level) * np.sqrt(t))

    def temperature(self, x: ArrayLike, t: ArrayLike) -> Array:
        """Return T [degC] at distances from the wall [m] and times [s], broadcast together."""
        x, t = np.asarray(x, dtype=float), np.asarray(t, dtype=float)
        if not np.all(t > 0):
            raise ValueError("time has to be above 0 s: the wall steps at 0")
        if not np.all(x >= 0):
            raise ValueError("distance from the wall has to be 0 or more")
        return self._path.temperature(x / (2.0 * np.sqrt(t)))

    def wall_flux(self, t: ArrayLike) -> Array:
        """Return the flux leaving through the wall [W/m2] at times [s], any shape."""
        t = np.asarray(t, dtype=float)
        if not np.all(t > 0):
            raise ValueError("time has to be above 0 s: the wall steps at 0")
        return np.asarray(self._path.q[0] / (2.0 * np.sqrt(t)))


@dataclass(frozen=True, eq=False)
class _Grid:
    """Everything about the curves that the march needs, at nodes and midpoints.

    `below` is H_0 - H. Plain lists: the march is a scalar loop, several times faster on them.
    """

    T: Array
    T_0: float
    below: Array
    k: Array
    marching: list[tuple[float, float, float, float, float, float, float]]

    @classmethod
    def build(cls, law: Similarity) -> _Grid:
        T = nodes_between(law.enthalpy, law.T_w, law.T_0, law.breaks, law.steps)
        middle = (T[:-1] + T[1:]) / 2.0
        H_0 = float(law.enthalpy(np.array([law.T_0]))[0])
        below, below_middle = H_0 - law.enthalpy(T), H_0 - law.enthalpy(middle)
        k, k_middle = law.conductivity(T), law.conductivity(middle)
        if not (np.all(np.isfinite(below)) and np.all(below > 0) and np.all(np.diff(below) < 0)):
            raise ValueError("enthalpy has to be finite and to rise with temperature")
        if not (np.all(np.isfinite(k)) and np.all(k > 0) and np.all(k_middle > 0)):
            raise ValueError("conductivity has to be finite and above 0")
        columns = (np.diff(T), below[:-1], below_middle, below[1:], k[:-1], k_middle, k[1:])
        return cls(T, law.T_0, below, k, list(zip(*(c.tolist() for c in columns), strict=True)))

    def guess(self) -> tuple[float, float]:
        """Bracket the log of the wall flux."""
        # Scale of k dT/deta when all heat above the wall's is carried off by its conductivity.
        scale = float(np.log(np.sqrt(self.k[0] * self.below[0] * (self.T_0 - self.T[0]))))
        low, high = scale - 1.0, scale + 1.0
        while self.miss(np.exp(low)) > 0:
            low -= 1.0
        while self.miss(np.exp(high)) < 0:
            high += 1.0
        return low, high

    def miss(self, flux: float) -> float:
        """Return by how much of the whole step the far temperature overshoots the start."""
        eta, p = 0.0, float(flux)
        for reached, step in enumerate(self.marching):
            eta, p, q = _step(eta, p, step)
            if q <= 0.0:
                return float((self.T[reached] - self.T_0) / (self.T_0 - self.T[0]) - 1e-9)
        gap = self.T_0 - self.T[-1]
        reach = q / self.k[-1] * self._reach(eta)
        # Both the gap and the reach are tiny: their ratio keeps the bracketing in scale.
        return float(np.log(reach / gap))

    def _reach(self, eta: float) -> float:
        """Integral of exp(-(e2 - eta2) / a2) de from eta on [m/s^0.5]."""
        a = sqrt(self.k[-1] * (self.T_0 - self.T[-1]) / self.below[-1])
        return a * sqrt(pi) / 2.0 * float(erfcx(eta / a))

    def path(self, flux: float) -> _Path:
        """March once more and keep every node."""
        eta, p, kept = 0.0, flux, [(0.0, flux)]
        for step in self.marching:
            eta, p, q = _step(eta, p, step)
            kept.append((eta, q))
        at, q_at = np.array(kept).T
        a = sqrt(self.k[-1] * (self.T_0 - self.T[-1]) / self.below[-1])
        return _Path(at, self.T, q_at, self.k, self.T_0, a)


def _step(
    eta: float, p: float, step: tuple[float, float, float, float, float, float, float]
) -> tuple[float, float, float]:
    """One classical Runge-Kutta step in temperature; q <= 0 says that the flux ran out."""
    dT, b0, b1, b2, k0, k1, k2 = step
    q0 = p + 2.0 * eta * b0
    if q0 <= 0.0:
        return eta, p, q0
    s0 = k0 * dT / q0
    e, r = eta + 0.5 * s0, p - b0 * s0
    q1 = r + 2.0 * e * b1
    if q1 <= 0.0:
        return eta, p, q1
    s1 = k1 * dT / q1
    e, r = eta + 0.5 * s1, p - b1 * s1
    q2 = r + 2.0 * e * b1
    if q2 <= 0.0:
        return eta, p, q2
    s2 = k1 * dT / q2
    e, r = eta + s2, p - 2.0 * b1 * s2
    q3 = r + 2.0 * e * b2
    if q3 <= 0.0:
        return eta, p, q3
    s3 = k2 * dT / q3
    eta += (s0 + 2.0 * (s1 + s2) + s3) / 6.0
    p -= (b0 * s0 + 2.0 * b1 * (s1 + s2) + b2 * s3) / 3.0
    return eta, p, p + 2.0 * eta * b2


@dataclass(frozen=True, eq=False)
class _Path:
    """The solved profile at its nodes, and its tail of constant properties."""

    eta: Array
    T: Array
    q: Array
    k: Array
    T_0: float
    a: float

    def position(self, level: float) -> float:
        """Return eta where T is `level`."""
        if level <= self.T[-1]:
            return float(CubicHermiteSpline(self.T, self.eta, self.k / self.q)(level))
        share = (self.T_0 - level) / (self.T_0 - self.T[-1])
        return float(self.a * erfcinv(share * self._edge()))

    def temperature(self, eta: Array) -> Array:
        """Return T at eta, any shape."""
        inside = CubicHermiteSpline(self.eta, self.T, self.q / self.k)(np.minimum(eta, self.eta[-1]))
        z, edge = np.maximum(eta, self.eta[-1]) / self.a, self.eta[-1] / self.a
        fall = erfcx(z) / erfcx(edge) * np.exp(edge**2 - z**2)
        return np.where(eta > self.eta[-1], self.T_0 - (self.T_0 - self.T[-1]) * fall, inside)

    def _edge(self) -> float:
        z = self.eta[-1] / self.a
        return float(erfcx(z) * np.exp(-(z**2)))
