"""Similarity in zones of constant properties: how all the closed forms are solved.

With eta = r / (2 sqrt t) every zone holds T = T_ref - g (C(eta / a) / C(eta_ref / a) - 1), where
a2 = k / (rho c) and C is erfc in the plane and E1 of the square about a line. What is left are
the positions of the fronts, found from the balance of heat at each.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from math import pi, sqrt
from typing import Protocol

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.optimize import brentq
from scipy.special import erfcx, exp1

from fem.exact.material import Step

Array = NDArray[np.float64]


class Kernel(Protocol):
    """The solution of the heat equation that a zone is made of, safe from underflow."""

    def log(self, z: ArrayLike) -> Array:
        """Return ln C(z)."""

    def ratio(self, z: ArrayLike) -> Array:
        """Return -dC/dz / C."""


class Plane:
    """C = erfc(z)."""

    def log(self, z: ArrayLike) -> Array:
        """Return ln erfc(z)."""
        return np.asarray(np.log(erfcx(z)) - np.square(z))

    def ratio(self, z: ArrayLike) -> Array:
        """Return -dC/dz / C."""
        return np.asarray(2.0 / sqrt(pi) / erfcx(z))


class Line:
    """C = E1(z2)."""

    def log(self, z: ArrayLike) -> Array:
        """Return ln E1(z2)."""
        return np.asarray(-np.square(z) - np.log(self._inverse(z)))

    def ratio(self, z: ArrayLike) -> Array:
        """Return -dC/dz / C."""
        return np.asarray(2.0 / np.asarray(z) * self._inverse(z))

    @staticmethod
    def _inverse(z: ArrayLike) -> Array:
        """Return exp(-z2) / E1(z2)."""
        z2 = np.square(np.asarray(z, dtype=float))
        # E1 underflows near 700; the head of its continued fraction is right to 1e-10 from 600 on.
        near = np.minimum(z2, 600.0)
        head = z2 + 1.0 / (1.0 + 1.0 / (z2 + 2.0))
        return np.where(z2 < 600.0, np.exp(-near) / exp1(near), head)


@dataclass(frozen=True, eq=False)
class Zones:
    """A solved problem; everything per zone, from the cold side out.

    Parameters
    ----------
    kernel
        Plane or line.
    fronts
        eta where each zone but the last ends [m/s^0.5], rising, shape (n - 1,).
    k
        Conductivity [W/m/K], shape (n,).
    a
        Root of the diffusivity [m/s^0.5], shape (n,).
    gain
        g [K], shape (n,).
    level
        Temperature at the reference: the zone's warm front, for the last its cold one [degC].
    log_reference
        ln C there, shape (n,).

    """

    kernel: Kernel
    fronts: Array
    k: Array
    a: Array
    gain: Array
    level: Array
    log_reference: Array

    def temperature(self, eta: Array) -> Array:
        """Return T [degC] at eta [m/s^0.5], any shape."""
        i = np.searchsorted(self.fronts, eta, side="left")
        spread = np.expm1(self.kernel.log(eta / self.a[i]) - self.log_reference[i])
        return np.asarray(self.level[i] - self.gain[i] * spread)

    def slope_flux(self, eta: Array) -> Array:
        """Return k dT/deta [W s^0.5/m2] at eta [m/s^0.5], any shape."""
        i = np.searchsorted(self.fronts, eta, side="left")
        z = eta / self.a[i]
        fall = self.kernel.ratio(z) * np.exp(self.kernel.log(z) - self.log_reference[i])
        return np.asarray(self.k[i] * self.gain[i] / self.a[i] * fall)


def solve(
    kernel: Kernel, steps: tuple[Step, ...], start: float, first_gain: Callable[[float], float]
) -> Zones:
    """Place the fronts so that heat balances at each.

    Parameters
    ----------
    kernel
        Plane or line.
    steps
        Zones from cold to warm, the last one unbounded.
    start
        Temperature far away and at the beginning [degC].
    first_gain
        g of the coldest zone [K] from its z = eta / a at the first front.

    """
    k = np.array([step.conductivity for step in steps])
    a = np.sqrt(k / [step.capacity for step in steps])
    ends = [step.end for step in steps[:-1]]
    last = len(ends)

    def gain(i: int, inner: float, outer: float) -> float:
        """Return g of zone i between its two fronts, referred to the outer one."""
        drop = float(kernel.log(inner / a[i]) - kernel.log(outer / a[i]))
        # Rounding may leave a thin zone far out no drop at all; the search then needs a large g.
        drop = max(drop, 1e-18)
        # The form that does not overflow, however thick the zone.
        return (ends[i] - ends[i - 1]) * float(np.exp(-drop) / -np.expm1(-drop))

    def leaving(i: int, inner: float) -> tuple[float, tuple[float, ...]]:
        """Return k dT/deta at the cold side of zone i, and the fronts beyond it."""
        ratio = k[i] / a[i] * float(kernel.ratio(inner / a[i]))
        if i == last:
            return ratio * (start - ends[-1]), ()
        outer = _root(lambda eta: excess(i, gain(i, inner, eta), eta), inner, a[i])
        return ratio * (gain(i, inner, outer) + ends[i] - ends[i - 1]), (outer, *leaving(i + 1, outer)[1])

    def excess(i: int, g: float, eta: float) -> float:
        """Return what zone i carries off at its warm side, less what comes from there."""
        carried = k[i] / a[i] * g * float(kernel.ratio(eta / a[i]))
        return carried - leaving(i + 1, eta)[0] - 2.0 * eta * steps[i].latent

    first = _root(lambda eta: excess(0, first_gain(eta / a[0]), eta), 0.0, a[0])
    fronts = (first, *leaving(1, first)[1])
    gains = [gain(i, fronts[i - 1], fronts[i]) for i in range(1, last)]
    reference = np.array([*fronts, fronts[-1]]) / a
    return Zones(
        kernel=kernel,
        fronts=np.array(fronts),
        k=k,
        a=a,
        gain=np.array([first_gain(first / a[0]), *gains, start - ends[-1]]),
        level=np.array([*ends, ends[-1]]),
        log_reference=kernel.log(reference),
    )


def _root(excess: Callable[[float], float], low: float, scale: float) -> float:
    """Root beyond `low` of a function that falls from +infinity there to below 0.

    Bracketed outwards from `scale`: far off, the fronts beyond stand where all but nothing is left.
    """
    near = far = 0.1 * scale
    while excess(low + near) < 0:
        near /= 4.0
    while excess(low + far) > 0:
        far *= 2.0
    if near == far:
        return low + near
    return float(brentq(excess, low + near, low + far, xtol=1e-60, rtol=8.9e-16, maxiter=500))
