"""Growth of ice into supercooled water, and the corner of two cold walls."""

from __future__ import annotations

from math import pi, sqrt

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.optimize import brentq
from scipy.special import erfcx, exp1

Array = NDArray[np.float64]

SHAPES = ("plane", "cylinder", "sphere")

# Constants of the corner, both walls cold, equal properties of solid and liquid, for
# L / (c (T_f - T_w)) = 0.25 and (T_0 - T_f) / (T_f - T_w) = 0.3: lambda, C, m. Value from memory.
CORNER = (0.70766, 0.159, 5.02)


def frank_root(shape: str, supercooling: float) -> float:
    """Return eta in R = 2 eta sqrt(alpha_l t) of ice that grows into supercooled water.

    The ice is all at the melting temperature, densities are equal, nothing limits the growth
    but the heat that the water carries off.

    Parameters
    ----------
    shape
        "plane", "cylinder" or "sphere".
    supercooling
        c_l (T_m - T_far) / L [-], above 0 and below 1: from 1 on no such growth exists.

    Raises
    ------
    ValueError
        If the shape is not one of the three or the supercooling outside its range.

    References
    ----------
    Frank 1950 (form from memory).

    """
    if shape not in SHAPES:
        raise ValueError(f'no shape "{shape}" (there is: {", ".join(SHAPES)})')
    if not 0.0 < supercooling < 1.0:
        raise ValueError(f"supercooling has to be above 0 and below 1, got {supercooling:g}")

    def excess(log: float) -> float:
        return _frank(shape, float(np.exp(log))) - supercooling

    # At eta = 20 the three stand at 0.9988, 0.9975 and 0.9963.
    high = np.log(20.0)
    if excess(high) < 0:
        raise ValueError(f"supercooling is too near 1 to be solved for, got {supercooling:g}")
    return float(np.exp(brentq(excess, -40.0, high, xtol=1e-14, rtol=8.9e-16)))


def _frank(shape: str, eta: float) -> float:
    plane = sqrt(pi) * eta * float(erfcx(eta))
    if shape == "plane":
        return plane
    if shape == "cylinder":
        return eta**2 * float(np.exp(eta**2) * exp1(eta**2))
    return 2.0 * eta**2 * (1.0 - plane)


def recalescence(heat_capacity: float, supercooling: float, latent_heat: float) -> float:
    """Return the ice formed when supercooled water warms itself to its melting temperature [-].

    Parameters
    ----------
    heat_capacity
        Of the liquid [J/kg/K], taken as constant.
    supercooling
        Below the melting temperature [K].
    latent_heat
        [J/kg].

    Raises
    ------
    ValueError
        Where a value is not above 0, or all would freeze before the melting temperature is reached.

    """
    if not (heat_capacity > 0 and supercooling > 0 and latent_heat > 0):
        raise ValueError("heat capacity, supercooling and latent heat have to be above 0")
    ice = heat_capacity * supercooling / latent_heat
    if ice >= 1.0:
        raise ValueError(f"all freezes below the melting temperature ({ice:g} times the latent heat)")
    return ice


def corner_front(x: ArrayLike, constants: tuple[float, float, float] = CORNER) -> Array:
    """Return y of the front in a corner at `x`, both over 2 sqrt(alpha t), from either wall.

    Parameters
    ----------
    x
        Distance from one wall [-], any shape, above lambda.
    constants
        lambda, C and m of y = (lambda^m + C / (x^m - lambda^m))^(1/m).

    Raises
    ------
    ValueError
        If `x` is not above lambda: no front is that near a wall.

    References
    ----------
    Rathjen and Jiji 1971 (form and constants from memory).

    """
    lam, C, m = constants
    x = np.asarray(x, dtype=float)
    if not np.all(x > lam):
        raise ValueError(f"x has to be above lambda = {lam:g}")
    return np.asarray((lam**m + C / (x**m - lam**m)) ** (1.0 / m))


def corner_diagonal(constants: tuple[float, float, float] = CORNER) -> float:
    """Return x = y of the front on the corner's diagonal, over 2 sqrt(alpha t)."""
    lam, C, m = constants
    return float((lam**m + sqrt(C)) ** (1.0 / m))
