from __future__ import annotations

import numpy as np
import pytest

from fem.march.step import Moment, Step
from fem.watch.arrival import Arrival


def step(a: float, b: float) -> Step:
    """One unknown that cools as t cubed, over 10 s: the cubic between the ends is exact."""

    def moment(t: float, u: float) -> Moment:
        one = np.array([u])
        return Moment(t, one, one, np.zeros(0), one, np.zeros(0), np.array([-3e-3 * t * t]), None)

    return Step(moment(10.0, 4.0 - 1.0), moment(20.0, 4.0 - 8.0), earlier=10.0)


def measure(u: np.ndarray) -> float:
    return float(u[0])


def test_a_crossing_inside_a_long_step_is_found_to_a_tenth_of_a_second() -> None:
    arrival = Arrival(measure, 0.0, below=True)
    arrival.see(step(10.0, 20.0))
    assert arrival.time == pytest.approx(4000.0 ** (1 / 3), abs=1e-3)


def test_the_state_at_the_crossing_has_met_the_aim() -> None:
    arrival = Arrival(measure, -2.718281828, below=True)
    time = arrival.within(step(10.0, 20.0))
    assert time is not None
    assert arrival.lag(step(10.0, 20.0).at(time)[0]) <= 0.0


def test_an_aim_that_is_not_met_has_no_time() -> None:
    assert Arrival(measure, -5.0, below=True).within(step(10.0, 20.0)) is None
    assert Arrival(measure, 5.0, below=False).within(step(10.0, 20.0)) is None


def test_an_aim_met_before_is_met_at_the_start_of_the_step() -> None:
    assert Arrival(measure, 3.5, below=True).within(step(10.0, 20.0)) == 10.0


def test_only_the_first_crossing_counts() -> None:
    arrival = Arrival(measure, 0.0, below=True)
    arrival.time = 3.0
    arrival.see(step(10.0, 20.0))
    assert arrival.time == 3.0
