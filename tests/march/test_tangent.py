"""Sensitivities of problems that have nothing to do with heat."""

from __future__ import annotations

import numpy as np
import pytest

from fem.march.control import Control
from fem.march.march import march
from fem.march.newton import Effort
from fem.march.step import begin
from fem.march.tangent import Tangents
from tests.march.tanks import START, Decay, Look


class VariedDecay(Decay):
    """The tanks' outflow as an input, beside the first tank's start."""

    def imposed(self, time: float, u: np.ndarray) -> np.ndarray:
        return np.zeros((2, 2))

    def varied(self, time: float, look: Look) -> tuple[np.ndarray, np.ndarray]:
        rate = np.zeros((2, 2))
        rate[:, 0] = -look.u
        return np.zeros((2, 2)), rate

    def tangent(self, look: Look, g: float, known: np.ndarray) -> np.ndarray:
        return np.linalg.solve(np.eye(2) - g * self.rates, known)

    def stored_change(self, look: Look, du: np.ndarray) -> np.ndarray:
        return du


@pytest.fixture
def carried() -> tuple[np.ndarray, float]:
    problem = VariedDecay()
    start = begin(problem, 0.0, START, np.zeros(1))
    tangents = Tangents(problem, start, np.array([[0.0, 1.0], [0.0, 0.0]]))
    for step in march(problem, start, 2.0, [], Control(tolerance=1e-6), Effort()):
        tangents.advance(step)
    return tangents.du, 2.0


def test_an_input_of_the_rate_is_followed(carried: tuple[np.ndarray, float]) -> None:
    # Outflow on top of both tanks multiplies the solution by exp(-p t): du/dp = -t u at p = 0.
    du, t = carried
    np.testing.assert_allclose(du[:, 0], -t * Decay.exact(t), rtol=2e-3)


def test_an_input_of_the_start_is_followed(carried: tuple[np.ndarray, float]) -> None:
    du, t = carried
    one = np.exp(-0.5 * t) / 2
    other = np.exp(-1.5 * t) / 2
    np.testing.assert_allclose(du[:, 1], [one + other, one - other], rtol=2e-3)
