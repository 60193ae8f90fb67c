"""Freezing inwards of a slab, cylinder or sphere with its wall held cold and liquid at T_m.

Lengths are over the half thickness or radius a, times over a2 / alpha_s, heat over latent heat
by Ste = c_s (T_m - T_w) / L.
"""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.integrate import solve_ivp
from scipy.interpolate import CubicSpline
from scipy.optimize import brentq
from scipy.special import erf

Array = NDArray[np.float64]

# Power of r in the area: what tells the three shapes apart.
POWERS = {"slab": 0, "cylinder": 1, "sphere": 2}

# Ice at the beginning (slab profile) and liquid at the end (quasi-steady) of the march, over a:
# ten times as much liquid moves the total by 2e-7, 20 points more by 1e-9.
_FIRST = 1e-3
_LAST = 1e-5
_POINTS = 28


def stefan_root(ste: float) -> float:
    """Root of sqrt(pi) lambda exp(lambda2) erf(lambda) = Ste, the one-phase plane front [-].

    Parameters
    ----------
    ste
        Stefan number [-], above 0.

    Raises
    ------
    ValueError
        If the Stefan number is not above 0.

    References
    ----------
    Carslaw and Jaeger, Conduction of Heat in Solids, 1959, section 11.2 (form from memory).

    """
    if not (ste > 0 and np.isfinite(ste)):
        raise ValueError(f"the Stefan number has to be above 0, got {ste:g}")

    def excess(log: float) -> float:
        lam = np.exp(log)
        return float(log + lam * lam + np.log(np.sqrt(np.pi) * erf(lam) / ste))

    return float(np.exp(brentq(excess, -50.0, 3.0, xtol=1e-15, rtol=8.9e-16)))


@dataclass(frozen=True)
class InwardFreezing:
    """Position of the front against time down to the middle, to about 1e-6 of the total time.

    The slab is closed: its two fronts do not feel each other. Cylinder and sphere are solved on
    a grid that is fixed to wall and front (Landau) in y = ln r / ln R, in which the profile stays
    smooth down to the smallest core: Chebyshev across the ice, marched in m = -ln R.

    Parameters
    ----------
    shape
        "slab", "cylinder" or "sphere".
    ste
        Stefan number of the solid [-], above 0; tested from 0.005 to 2.

    Raises
    ------
    ValueError
        If the shape is not one of the three or the Stefan number is not above 0.

    """

    shape: str
    ste: float
    _pace: CubicSpline = field(init=False, repr=False, compare=False)

    def __post_init__(self) -> None:
        if self.shape not in POWERS:
            raise ValueError(f'no shape "{self.shape}" (there is: {", ".join(POWERS)})')
        lam = stefan_root(self.ste)
        ice, tau = _march(POWERS[self.shape], self.ste, lam)
        # Time starts as the square of the ice; over that square it is smooth and nearly constant.
        pace = np.concatenate([[1.0 / (4.0 * lam**2)], tau[1:] / ice[1:] ** 2])
        object.__setattr__(self, "_pace", CubicSpline(ice, pace))

    @property
    def total(self) -> float:
        """Time until all is frozen, alpha_s t / a2 [-]."""
        return float(self._pace(1.0))

    def time(self, position: ArrayLike) -> Array:
        """Return alpha_s t / a2 when the front is at r / a = `position`, 1 to 0, any shape."""
        position = np.asarray(position, dtype=float)
        if not (np.all(position >= 0) and np.all(position <= 1)):
            raise ValueError("position of the front has to be 0 to 1")
        ice = 1.0 - position
        return np.asarray(self._pace(ice) * ice**2)

    def front(self, tau: ArrayLike) -> Array:
        """Return r / a of the front at alpha_s t / a2 = `tau`, 0 to `total`, any shape."""
        tau = np.asarray(tau, dtype=float)
        if not (np.all(tau >= 0) and np.all(tau <= self.total)):
            raise ValueError(f"time has to be 0 to {self.total:g}")
        fine = 1.0 - np.linspace(0.0, 1.0, 4001) ** 2
        return np.asarray(np.interp(tau, self.time(fine), fine))


def _march(power: int, ste: float, lam: float) -> tuple[Array, Array]:
    """Return thickness of the ice and time, from nothing to all."""
    if power == 0:
        ice = np.linspace(0.0, 1.0, 11)
        return ice, ice**2 / (4.0 * lam**2)
    D, y = _chebyshev(_POINTS)
    inside = slice(1, -1)

    def rate(m: float, state: Array) -> Array:
        """d/dm of T over the wall, 0 there (y = 0) and 1 at the front, and of tau; m = -ln R."""
        u = np.concatenate([[0.0], state[:-1], [1.0]])
        slope = D @ u
        spread = np.exp(-2.0 * m * (1.0 - y)) * (D @ slope / m - (power - 1) * slope)
        change = spread / (ste * slope[-1]) + y * slope / m
        return np.concatenate([change[inside], [m * np.exp(-2.0 * m) / (ste * slope[-1])]])

    span = (-np.log1p(-_FIRST), -np.log(_LAST))
    first = erf(lam * y) / erf(lam)
    begin = np.concatenate([first[inside], [_FIRST**2 / (4.0 * lam**2)]])
    run = solve_ivp(rate, span, begin, method="Radau", rtol=1e-8, atol=1e-11)
    if not run.success:
        raise ArithmeticError(f"the front stopped at R / a = {np.exp(-run.t[-1]):g}: {run.message}")
    # Near the middle the speed goes as 1 / R: the rest takes R / (2 speed), which is half of dtau/dm.
    rest = 0.5 * rate(run.t[-1], run.y[:, -1])[-1]
    ice = np.concatenate([[0.0], -np.expm1(-run.t), [1.0]])
    return ice, np.concatenate([[0.0], run.y[-1], [run.y[-1, -1] + rest]])


def _chebyshev(n: int) -> tuple[Array, Array]:
    """Differentiation matrix and points on 0 to 1 (Trefethen, Spectral Methods, value from memory)."""
    j = np.arange(n + 1)
    x = -np.cos(np.pi * j / n)
    c = np.where((j == 0) | (j == n), 2.0, 1.0) * (-1.0) ** j
    gap = x[:, None] - x[None, :] + np.eye(n + 1)
    D = np.outer(c, 1.0 / c) / gap
    D -= np.diag(D.sum(axis=1))
    return 2.0 * D, (x + 1.0) / 2.0
