"""What the march needs to know of a problem: a handful of methods, none of them about heat."""

from __future__ import annotations

from typing import Any, Protocol

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]


class Look(Protocol):
    """A state looked at.

    Parameters
    ----------
    u
        Unknowns, shape (n,).
    stored
        Amount that each unknown holds, shape (n,).
    stored_slope
        Its derivative to the unknown, above 0, shape (n,).
    rate
        What reaches each unknown per second, shape (n,).
    passed
        What leaves per second, kept in separate accounts, shape (accounts,).

    """

    @property
    def u(self) -> Array: ...  # noqa: D102
    @property
    def stored(self) -> Array: ...  # noqa: D102
    @property
    def stored_slope(self) -> Array: ...  # noqa: D102
    @property
    def rate(self) -> Array: ...  # noqa: D102
    @property
    def passed(self) -> Array: ...  # noqa: D102


class Problem(Protocol):
    """``d stored(u) / dt = rate(t, u)``, one equation for each unknown that is free."""

    @property
    def free(self) -> NDArray[np.bool_]:
        """Unknowns that follow the equation; the others are imposed."""

    def impose(self, time: float, u: Array) -> Array:
        """Return `u` with the imposed unknowns set to what holds at `time` [s]."""

    def look(self, time: float, u: Array) -> Any:
        """Return a `Look` at the state."""

    def correct(self, look: Any, g: float, residual: Array) -> Array:
        """Return the Newton correction of `u` for ``stored - g rate - known`` with its residual.

        Raises
        ------
        ArithmeticError
            If the linear system cannot be solved.

        """

    def settle(self, stored: Array, look: Any) -> Array:
        """Return the `u` that holds exactly `stored`, near a look."""

    def mean_size(self, amount: Array) -> float:
        """Return how large an error of `stored` is on the whole, 1 for as large as can be."""

    def worst_size(self, amount: Array, look: Any) -> float:
        """Return how large an error of `stored` is in the terms of the unknown where it is largest."""

    def fastest(self, rate: Array) -> float:
        """Return the largest relative rate of change [1/s]."""

    def smooth_size(self, amount: Array, before: Any, after: Any) -> float:
        """Return how large an error is in the terms of the unknowns that changed smoothly."""
