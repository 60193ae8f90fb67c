"""Freezing of a half space from a wall that is suddenly cold: exact."""

from __future__ import annotations

from dataclasses import dataclass, field
from math import inf

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.special import erf, erfc

from fem.exact.material import ABSOLUTE_ZERO, RangeFreezing, SharpFreezing
from fem.exact.zones import Plane, Zones, solve

Array = NDArray[np.float64]


@dataclass(frozen=True)
class Neumann:
    """One sharp front; with the liquid at its melting temperature, Stefan's one-phase case.

    Valid for a half space, one density, a wall that steps to its temperature and no convection.
    Keep the far end of a mesh beyond 6 sqrt(alpha_l t).

    Parameters
    ----------
    material
        Properties of solid and liquid.
    T_w
        Wall [degC], below the melting temperature.
    T_0
        Start [degC], at or above the melting temperature.

    Raises
    ------
    ValueError
        Where the wall is not between absolute zero and the melting temperature, or the start is
        below that.

    References
    ----------
    Carslaw and Jaeger, Conduction of Heat in Solids, 1959, section 11.2 (form from memory).

    """

    material: SharpFreezing
    T_w: float
    T_0: float
    zones: Zones = field(init=False, repr=False, compare=False)

    def __post_init__(self) -> None:
        m = self.material
        if not ABSOLUTE_ZERO <= self.T_w < m.T_m:
            raise ValueError(f"T_w has to be below T_m = {m.T_m:g} degC, got {self.T_w:g} degC")
        if not m.T_m <= self.T_0 < inf:
            raise ValueError(f"T_0 has to be at or above T_m = {m.T_m:g} degC, got {self.T_0:g} degC")
        object.__setattr__(self, "zones", _solve_plane(m, self.T_w, self.T_0))

    @property
    def root(self) -> float:
        """Lambda in s = 2 lambda sqrt(alpha_s t) [-]."""
        return float(self.zones.fronts[0] / self.zones.a[0])

    def front(self, t: ArrayLike) -> Array:
        """Return the distance of the front from the wall [m] at times [s], any shape."""
        return _distance(self.zones.fronts[0], t)

    def temperature(self, x: ArrayLike, t: ArrayLike) -> Array:
        """Return T [degC] at distances from the wall [m] and times [s], broadcast together."""
        return self.zones.temperature(_eta(x, t))

    def wall_flux(self, t: ArrayLike) -> Array:
        """Return the flux leaving through the wall [W/m2] at times [s], any shape."""
        return self.zones.slope_flux(_eta(0.0, t)) / (2.0 * np.sqrt(np.asarray(t, dtype=float)))


@dataclass(frozen=True)
class ThreeZone:
    """Solid, freezing zone and liquid, with a solidus and a liquidus front.

    Exact for a box-shaped heat capacity: a solver with that capacity has no smearing to excuse.
    With next to no superheat the liquidus lies far out where nothing happens; compare
    temperatures and the solidus then.

    Parameters
    ----------
    material
        Properties of the three zones.
    T_w
        Wall [degC], below the solidus.
    T_0
        Start [degC], above the liquidus (by as little as 1e-9 K).

    Raises
    ------
    ValueError
        Where the wall is not between absolute zero and the solidus, or the start not above the
        liquidus.

    References
    ----------
    Tien and Geiger 1967 give solutions of this type (value from memory).

    """

    material: RangeFreezing
    T_w: float
    T_0: float
    zones: Zones = field(init=False, repr=False, compare=False)

    def __post_init__(self) -> None:
        m = self.material
        if not ABSOLUTE_ZERO <= self.T_w < m.T_s:
            raise ValueError(f"T_w has to be below T_s = {m.T_s:g} degC, got {self.T_w:g} degC")
        if not m.T_l < self.T_0 < inf:
            raise ValueError(
                f"T_0 has to be above T_l = {m.T_l:g} degC (1e-9 K will do), got {self.T_0:g} degC"
            )
        object.__setattr__(self, "zones", _solve_plane(m, self.T_w, self.T_0))

    def solidus(self, t: ArrayLike) -> Array:
        """Return the distance of the solidus from the wall [m] at times [s], any shape."""
        return _distance(self.zones.fronts[0], t)

    def liquidus(self, t: ArrayLike) -> Array:
        """Return the distance of the liquidus from the wall [m] at times [s], any shape."""
        return _distance(self.zones.fronts[1], t)

    def temperature(self, x: ArrayLike, t: ArrayLike) -> Array:
        """Return T [degC] at distances from the wall [m] and times [s], broadcast together."""
        return self.zones.temperature(_eta(x, t))

    def wall_flux(self, t: ArrayLike) -> Array:
        """Return the flux leaving through the wall [W/m2] at times [s], any shape."""
        return self.zones.slope_flux(_eta(0.0, t)) / (2.0 * np.sqrt(np.asarray(t, dtype=float)))


def _solve_plane(material: SharpFreezing | RangeFreezing, T_w: float, T_0: float) -> Zones:
    steps = material.steps()

    def first_gain(z: float) -> float:
        return (steps[0].end - T_w) * float(erfc(z) / erf(z))

    return solve(Plane(), steps, T_0, first_gain)


def _eta(x: ArrayLike, t: ArrayLike) -> Array:
    x, t = np.asarray(x, dtype=float), np.asarray(t, dtype=float)
    if not np.all(t > 0):
        raise ValueError("time has to be above 0 s: the wall steps at 0")
    if not np.all(x >= 0):
        raise ValueError("distance from the wall has to be 0 or more")
    return np.asarray(x / (2.0 * np.sqrt(t)))


def _distance(eta: float, t: ArrayLike) -> Array:
    t = np.asarray(t, dtype=float)
    if not np.all(t >= 0):
        raise ValueError("time has to be 0 s or more")
    return np.asarray(2.0 * eta * np.sqrt(t))
