"""Rows of temperature for solutions that are marched along a material's curves."""

from __future__ import annotations

from collections.abc import Callable, Iterable

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]
Law = Callable[[Array], Array]

# The march ends this share of the whole step short of the start; from there on constant
# properties, whose error the same share suppresses once more.
_TAIL = 1e-5
_TAIL_RATIO = 0.93


def nodes_between(enthalpy: Law, low: float, high: float, breaks: Iterable[float], steps: int) -> Array:
    """Temperatures to march through: every break, and fine in both T and H.

    Parameters
    ----------
    enthalpy
        H [J/m3] of an array of temperatures [degC].
    low, high
        Where the rows begin, and the start that they end a little short of [degC].
    breaks
        Temperatures that have to be among the rows [degC]; those outside are left out.
    steps
        Rise of T, and of H, from row to row is at most the whole over this.

    Raises
    ------
    ValueError
        If the enthalpy does not rise from `low` to `high`.

    """
    end = high - _TAIL * (high - low)
    graded = high - (high - low) * np.geomspace(1.0, _TAIL, 2 + int(np.log(_TAIL) / np.log(_TAIL_RATIO)))
    marks = np.array([b for b in breaks if low < b < end], dtype=float)
    T = np.unique(np.concatenate([graded[1:-1], marks, [low, end]]))
    H = enthalpy(T)
    span_T, span_H = high - low, float(enthalpy(np.array([high]))[0]) - float(H[0])
    if not (np.isfinite(span_H) and span_H > 0):
        raise ValueError("enthalpy has to be finite and to rise with temperature")
    for _ in range(60):
        share = np.maximum(np.diff(T) / span_T, np.diff(H) / span_H)
        # A stretch at the resolution of floating point is left as it is.
        wide = (share > 1.0 / steps) & (np.diff(T) > 1e-12 * np.abs(T).max())
        if not np.any(wide):
            break
        T = np.sort(np.concatenate([T, ((T[:-1] + T[1:]) / 2.0)[wide]]))
        H = enthalpy(T)
    return T
