"""Total freezing time in the limit of small Stefan number, exact for any shape.

With the liquid at its freezing point and Ste -> 0 the last liquid goes after
rho L phi_max / (k (T_f - T_c)), where -lap(phi) = 1 in the body and k dphi/dn + h phi = 0 on its
surface (Baiocchi's transform; value from memory, derivation re-checked). All functions return
phi_max [m2]. Biot numbers are h times the first length over k; infinite is a wall held at T_c.
"""

from __future__ import annotations

from collections.abc import Callable
from math import inf, pi

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import brentq
from scipy.special import j0, j1, jn_zeros

Array = NDArray[np.float64]

# Terms fall as exp(-n pi times the ratio of the sides, at least 1 over the shortest).
_TERMS = 40


def freezing_time(phi: float, latent: float, conductivity: float, step: float) -> float:
    """Return the time until the last liquid is gone [s].

    Parameters
    ----------
    phi
        Largest value of the potential [m2].
    latent
        Latent heat per volume, rho L [J/m3].
    conductivity
        Of the frozen product [W/m/K].
    step
        T_f - T_c, freezing point less coolant or wall [K].

    Raises
    ------
    ValueError
        Where a value is not above 0.

    """
    _positive(phi=phi, latent=latent, conductivity=conductivity, step=step)
    return latent * phi / (conductivity * step)


def slab(half: float, biot: float = inf) -> float:
    """Return phi of a slab frozen from both sides, `half` its half thickness [m]."""
    _positive(half=half, biot=biot)
    return half**2 * (1 / 2 + 1 / biot)


def cylinder(radius: float, biot: float = inf) -> float:
    """Return phi of a long cylinder; `radius` in m."""
    _positive(radius=radius, biot=biot)
    return radius**2 * (1 / 4 + 1 / (2 * biot))


def sphere(radius: float, biot: float = inf) -> float:
    """Return phi of a sphere; `radius` in m."""
    _positive(radius=radius, biot=biot)
    return radius**2 * (1 / 6 + 1 / (3 * biot))


def ellipse(a: float, b: float) -> float:
    """Return phi of a long elliptic rod, semi-axes in m, wall held cold."""
    _positive(a=a, b=b)
    return 0.5 / (a**-2 + b**-2)


def ellipsoid(a: float, b: float, c: float) -> float:
    """Return phi of an ellipsoid, semi-axes in m, wall held cold."""
    _positive(a=a, b=b, c=c)
    return 0.5 / (a**-2 + b**-2 + c**-2)


def triangle(side: float) -> float:
    """Return phi of a long equilateral triangular rod, `side` in m, wall held cold."""
    _positive(side=side)
    return side**2 / 36


def rectangle(a: float, b: float, biot: float = inf) -> float:
    """Return phi of a long bar 2a by 2b with one heat transfer coefficient all round.

    Parameters
    ----------
    a, b
        Half sides [m].
    biot
        h a / k [-].

    Raises
    ------
    ValueError
        Where a value is not above 0.

    """
    _positive(a=a, b=b, biot=biot)
    if b < a:
        a, b, biot = b, a, biot * b / a
    mu, weight = _cosines(biot)
    return slab(a, biot) - a**2 * float(np.sum(weight / mu**2 * _closing(mu, b / a, mu / biot)))


def finite_cylinder(radius: float, half_height: float, biot: float = inf) -> float:
    """Return phi of a cylinder with flat ends, one heat transfer coefficient all round.

    Parameters
    ----------
    radius, half_height
        [m]; the half height a fifth of the radius or more, for the series to have closed.
    biot
        h times the radius over k [-].

    Raises
    ------
    ValueError
        Where a value is not above 0, or the cylinder is flatter than a fifth.

    """
    _positive(radius=radius, half_height=half_height, biot=biot)
    ratio = half_height / radius
    if ratio < 0.2:
        raise ValueError(f"half height has to be a fifth of the radius or more, got {ratio:g} of it")
    mu = _bessel_roots(biot)
    weight = 2.0 * j1(mu) / (mu * (j0(mu) ** 2 + j1(mu) ** 2))
    rest = float(np.sum(weight / mu**2 * _closing(mu, ratio, mu / biot)))
    return cylinder(radius, biot) - radius**2 * rest


def brick(a: float, b: float, c: float, biot: float = inf) -> float:
    """Return phi of a brick 2a by 2b by 2c with one heat transfer coefficient all round.

    Parameters
    ----------
    a, b, c
        Half sides [m].
    biot
        h a / k [-].

    Raises
    ------
    ValueError
        Where a value is not above 0.

    """
    _positive(a=a, b=b, c=c, biot=biot)
    h = biot / a
    a, b, c = sorted((a, b, c))
    mu, weight_a = _cosines(h * a)
    nu, weight_b = _cosines(h * b)
    gamma2 = (mu[:, None] / a) ** 2 + (nu[None, :] / b) ** 2
    gamma = np.sqrt(gamma2)
    rest = weight_a[:, None] * weight_b[None, :] / gamma2 * _closing(gamma, c, gamma / h)
    return rectangle(a, b, h * a) - float(np.sum(rest))


def _closing(mu: Array, length: float, slip: Array) -> Array:
    """1 / (cosh z + slip sinh z) with z = mu length: what an end takes off, without overflow."""
    z = mu * length
    return np.asarray(2.0 * np.exp(-z) / ((1.0 + slip) + (1.0 - slip) * np.exp(-2.0 * z)))


def _cosines(biot: float) -> tuple[Array, Array]:
    """Roots of mu tan mu = Bi, and the weights of the cosines whose sum is 1."""
    n: Array = np.arange(_TERMS, dtype=float)
    if np.isinf(biot):
        mu = (n + 0.5) * pi
    else:
        mu = np.array([_root(lambda m: m * np.sin(m) - biot * np.cos(m), i * pi, (i + 0.5) * pi) for i in n])
    return mu, np.asarray(2.0 * np.sin(mu) / (mu + np.sin(mu) * np.cos(mu)))


def _bessel_roots(biot: float) -> Array:
    """Roots of mu J1(mu) = Bi J0(mu)."""
    zeros = jn_zeros(0, _TERMS)
    if np.isinf(biot):
        return np.asarray(zeros)
    lows = np.concatenate([[0.0], jn_zeros(1, _TERMS - 1)])
    return np.array(
        [_root(lambda m: m * j1(m) - biot * j0(m), low, high) for low, high in zip(lows, zeros, strict=True)]
    )


def _root(excess: Callable[[float], float], low: float, high: float) -> float:
    return float(brentq(excess, low, high, xtol=1e-15, rtol=8.9e-16))


def _positive(**values: float) -> None:
    for name, value in values.items():
        if not value > 0:
            raise ValueError(f"{name} has to be above 0, got {value:g}")
