"""Freezing outwards from a line that draws a constant power: exact about an axis."""

from __future__ import annotations

from dataclasses import dataclass, field
from math import inf, pi

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.special import exp1

from fem.exact.material import RangeFreezing, SharpFreezing
from fem.exact.zones import Line, Zones, solve

Array = NDArray[np.float64]

# Stands for t = 0: every distance is then far beyond the last front and its flux underflows to 0.
_INSTANT = 1e-30


@dataclass(frozen=True)
class LineSink:
    """Cylindrical fronts about a line sink, sharp or with a freezing range.

    For a mesh take a ring from some r0 outwards, impose `flux` or `temperature` at r0 from
    t = 0 (r0 is liquid then, so no start profile is needed) and keep the rim beyond 6 sqrt(alpha_l t).

    Parameters
    ----------
    material
        `SharpFreezing` (one front) or `RangeFreezing` (solidus and liquidus).
    Q
        Power drawn by the line [W/m], above 0.
    T_0
        Start [degC]: at or above the melting temperature, or above the liquidus.

    Raises
    ------
    ValueError
        Where the power is not above 0 or the start is too cold.

    References
    ----------
    Carslaw and Jaeger, Conduction of Heat in Solids, 1959, section 11.6, after Paterson 1952;
    with a freezing range Ozisik and Uzzell 1979 (values from memory).

    """

    material: SharpFreezing | RangeFreezing
    Q: float
    T_0: float
    zones: Zones = field(init=False, repr=False, compare=False)

    def __post_init__(self) -> None:
        warm = self.material.liquid_from
        if not (self.Q > 0 and np.isfinite(self.Q)):
            raise ValueError(f"Q has to be above 0, got {self.Q:g} W/m")
        if isinstance(self.material, SharpFreezing) and not warm <= self.T_0 < inf:
            raise ValueError(f"T_0 has to be at or above T_m = {warm:g} degC, got {self.T_0:g} degC")
        if isinstance(self.material, RangeFreezing) and not warm < self.T_0 < inf:
            raise ValueError(f"T_0 has to be above T_l = {warm:g} degC, got {self.T_0:g} degC")
        steps = self.material.steps()
        scale = self.Q / (4.0 * pi * steps[0].conductivity)

        def first_gain(z: float) -> float:
            return scale * float(exp1(z * z))

        object.__setattr__(self, "zones", solve(Line(), steps, self.T_0, first_gain))

    @property
    def root(self) -> float:
        """Lambda in R = 2 lambda sqrt(alpha_s t), for the first front [-]."""
        return float(self.zones.fronts[0] / self.zones.a[0])

    def front(self, t: ArrayLike) -> Array:
        """Return the radius of the sharp front, or of the solidus, [m] at times [s], any shape."""
        return self._radius(0, t)

    def liquidus(self, t: ArrayLike) -> Array:
        """Return the radius of the last front [m] at times [s]; the sharp one is both."""
        return self._radius(-1, t)

    def temperature(self, r: ArrayLike, t: ArrayLike) -> Array:
        """Return T [degC] at radii [m], above 0, and times [s], 0 or more, broadcast together."""
        return self.zones.temperature(self._eta(r, t))

    def flux(self, r: ArrayLike, t: ArrayLike) -> Array:
        """Return k dT/dr [W/m2], towards the line +, at radii [m] and times [s] as `temperature`."""
        r = np.asarray(r, dtype=float)
        eta = self._eta(r, t)
        return np.asarray(self.zones.slope_flux(eta) * eta / r)

    def _radius(self, which: int, t: ArrayLike) -> Array:
        t = np.asarray(t, dtype=float)
        if not np.all(t >= 0):
            raise ValueError("time has to be 0 s or more")
        return np.asarray(2.0 * self.zones.fronts[which] * np.sqrt(t))

    def _eta(self, r: ArrayLike, t: ArrayLike) -> Array:
        r, t = np.asarray(r, dtype=float), np.asarray(t, dtype=float)
        if not np.all(r > 0):
            raise ValueError("radius has to be above 0: the line itself is infinitely cold")
        if not np.all(t >= 0):
            raise ValueError("time has to be 0 s or more")
        return np.asarray(r / (2.0 * np.sqrt(np.maximum(t, _INSTANT))))
