"""Conductivity of a mix from those of its parts: laws of mixing, all by volume."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from numpy.typing import ArrayLike, NDArray

Array = NDArray[np.float64]


def parallel(shares: ArrayLike, conductivities: ArrayLike) -> Array:
    """Conductivity of parts that lie side by side along the heat: the mean by volume.

    Parameters
    ----------
    shares
        Volume shares, summing to 1 along the first axis, shape (parts, ...).
    conductivities
        Of the parts [W/m/K], same shape.

    Returns
    -------
    [W/m/K], shape (...).

    """
    return np.asarray(np.sum(np.asarray(shares) * np.asarray(conductivities), axis=0))


def maxwell_eucken(continuous: ArrayLike, dispersed: ArrayLike, share: ArrayLike) -> Array:
    """Conductivity of small spheres dispersed in a continuous phase.

    Maxwell 1873, Eucken 1940 (value from memory). Exact for few, far-apart spheres, and a bound
    (Hashin and Shtrikman 1962, value from memory) for any isotropic mix of the two.

    Parameters
    ----------
    continuous, dispersed
        Conductivities of the phases [W/m/K].
    share
        Volume of the dispersed phase over the whole [-].

    Returns
    -------
    [W/m/K], shape of the arguments broadcast.

    """
    c, d, v = (np.asarray(x, dtype=float) for x in (continuous, dispersed, share))
    return np.asarray(c * (2.0 * c + d - 2.0 * v * (c - d)) / (2.0 * c + d + v * (c - d)))


def levy(solution: ArrayLike, ice: ArrayLike, share: ArrayLike) -> Array:
    """Conductivity of a mix of two phases neither of which is the continuous one.

    Levy 1981 (value from memory): the law of Maxwell and Eucken with the dispersed share so
    changed that the answer is the same whichever phase is called dispersed.

    Parameters
    ----------
    solution, ice
        Conductivities [W/m/K], not equal.
    share
        Volume of ice over the whole [-].

    Returns
    -------
    [W/m/K], shape of the arguments broadcast; between the two laws of `maxwell_eucken`.

    """
    k_s, k_i, v = (np.asarray(x, dtype=float) for x in (solution, ice, share))
    ratio = k_i / k_s
    sigma = (ratio - 1.0) ** 2 / ((ratio + 1.0) ** 2 + ratio / 2.0)
    a = 2.0 / sigma - 1.0 + 2.0 * v
    dispersed = 0.5 * (a - np.sqrt(a * a - 8.0 * v / sigma))
    return np.asarray(
        k_s * (2.0 + ratio + 2.0 * (ratio - 1.0) * dispersed) / (2.0 + ratio - (ratio - 1.0) * dispersed)
    )


def _solution_continuous(solution: ArrayLike, ice: ArrayLike, share: ArrayLike) -> Array:
    return maxwell_eucken(solution, ice, share)


def _ice_continuous(solution: ArrayLike, ice: ArrayLike, share: ArrayLike) -> Array:
    return maxwell_eucken(ice, solution, 1.0 - np.asarray(share, dtype=float))


LAWS: dict[str, Callable[[ArrayLike, ArrayLike, ArrayLike], Array]] = {
    "levy": levy,
    "solution continuous": _solution_continuous,
    "ice continuous": _ice_continuous,
}
"""Laws by their word in the case file; each takes (solution, ice, volume share of ice)."""
