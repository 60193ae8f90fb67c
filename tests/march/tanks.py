"""Two tanks that drain into one another and out: a problem for the march that is not heat."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np


@dataclass
class Look:
    u: np.ndarray
    stored: np.ndarray
    stored_slope: np.ndarray
    rate: np.ndarray
    passed: np.ndarray


class Decay:
    """Two tanks that drain into one another and out: stored = u, exact by an eigenvalue each."""

    rates = np.array([[-1.0, 0.5], [0.5, -1.0]])
    free = np.array([True, True])

    def impose(self, time: float, u: np.ndarray) -> np.ndarray:
        return u

    def look(self, time: float, u: np.ndarray) -> Look:
        return Look(u, u, np.ones(2), self.rates @ u, np.array([0.5 * u.sum()]))

    def correct(self, look: Look, g: float, residual: np.ndarray) -> np.ndarray:
        return np.linalg.solve(np.eye(2) - g * self.rates, -residual)

    def settle(self, stored: np.ndarray, look: Look) -> np.ndarray:
        return stored

    def mean_size(self, amount: np.ndarray) -> float:
        return float(np.sqrt(np.mean(amount**2)))

    def worst_size(self, amount: np.ndarray, look: Look) -> float:
        return float(np.abs(amount).max())

    def fastest(self, rate: np.ndarray) -> float:
        return float(np.abs(rate).max())

    def smooth_size(self, amount: np.ndarray, before: Look, after: Look) -> float:
        return 0.0

    @staticmethod
    def exact(t: float) -> np.ndarray:
        return np.array(
            [1.5 * np.exp(-0.5 * t) + 0.5 * np.exp(-1.5 * t), 1.5 * np.exp(-0.5 * t) - 0.5 * np.exp(-1.5 * t)]
        )


START = np.array([2.0, 1.0])
