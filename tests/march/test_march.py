"""The march runs problems that have nothing to do with heat."""

from __future__ import annotations

import itertools

import numpy as np
import pytest

from fem.errors import RunFailure
from fem.march.control import Control
from fem.march.march import _forecast, march
from fem.march.newton import Effort
from fem.march.step import Moment, Step, begin
from tests.march.tanks import START, Decay, Look


def steps(
    control: Control, landings=(), end: float = 2.0, stop=None, problem=None
) -> tuple[list[Step], Effort]:
    problem, effort = problem or Decay(), Effort()
    start = begin(problem, 0.0, START, np.zeros(1))
    return list(march(problem, start, end, landings, control, effort, stop)), effort


def test_the_error_falls_with_the_square_of_a_fixed_step() -> None:
    errors = []
    for size in (0.1, 0.05, 0.025):
        loose = Control(tolerance=1e9, stop_mean=1e-18, stop_worst=1e-18, first_step=size, largest_step=size)
        done, _ = steps(loose)
        errors.append(np.abs(done[-1].after.u - Decay.exact(2.0)).max())
    orders = np.log2(np.array(errors[:-1]) / errors[1:])
    assert np.all(np.abs(orders - 2.0) < 0.2), orders


def test_tighter_tolerances_give_smaller_errors() -> None:
    errors = [
        np.abs(steps(Control(tolerance=t))[0][-1].after.u - Decay.exact(2.0)).max()
        for t in (1e-2, 1e-3, 1e-4)
    ]
    assert errors[0] > 3 * errors[1] > 9 * errors[2]


def test_every_landing_is_the_exact_end_of_a_step() -> None:
    landings = [0.1, 1 / 3, 0.5000001, 1.9999]
    ends = {step.after.time for step in steps(Control(tolerance=1e-3), landings)[0]}
    assert {*landings, 2.0} <= ends


def test_steps_join_without_a_gap() -> None:
    done, effort = steps(Control(tolerance=1e-3), [0.7])
    assert all(a.after is b.before for a, b in itertools.pairwise(done))
    assert effort.steps == len(done)


def test_what_left_and_what_is_stored_add_up_to_rounding_however_loose_the_iteration() -> None:
    done, _ = steps(Control(tolerance=1e-1, stop_mean=1e3, stop_worst=1e3))
    last = done[-1].after
    assert last.stored.sum() + last.carried.sum() == pytest.approx(START.sum(), rel=1e-14)


def test_a_stop_cuts_the_last_step_where_it_says() -> None:
    def stop(step: Step) -> float | None:
        return 0.777 if step.after.time >= 0.777 else None

    done, _ = steps(Control(tolerance=1e-4), stop=stop)
    assert done[-1].after.time == 0.777
    np.testing.assert_allclose(done[-1].after.u, Decay.exact(0.777), rtol=1e-3)
    last = done[-1].after
    assert last.stored.sum() + last.carried.sum() == pytest.approx(START.sum(), rel=1e-12)


def test_between_its_ends_a_step_is_as_exact_as_at_them() -> None:
    done, _ = steps(Control(tolerance=1e-4))
    times = np.linspace(0.2, 1.9, 40)
    worst = 0.0
    for t in times:
        step = next(s for s in done if s.before.time <= t <= s.after.time)
        worst = max(worst, np.abs(step.at(t)[0] - Decay.exact(t)).max())
    assert worst < 3 * max(np.abs(s.after.u - Decay.exact(s.after.time)).max() for s in done)


def test_a_march_that_cannot_go_on_says_so_and_keeps_its_last_state() -> None:
    class Stuck(Decay):
        def correct(self, look: Look, g: float, residual: np.ndarray) -> np.ndarray:
            if look.u.sum() < 2.0:
                raise ArithmeticError("singular")
            return super().correct(look, g, residual)

    taken = []
    problem = Stuck()
    steps_taken = march(problem, begin(problem, 0.0, START, np.zeros(1)), 2.0, [], Control(1e-3), Effort())

    def take_all() -> None:
        for step in steps_taken:
            taken.append(step)

    with pytest.raises(RunFailure, match="did not converge") as failure:
        take_all()
    assert failure.value.time == taken[-1].after.time > 0.3
    assert failure.value.causes


def moments(value, times) -> list[Moment]:
    none = np.zeros(0)
    return [Moment(t, np.array([value(t)]), none, none, none, none, np.array([0.0]), None) for t in times]


def test_a_parabola_in_time_is_foreseen_exactly_whatever_the_steps() -> None:
    history = moments(lambda t: 3.0 + 2.0 * t + 0.1 * t * t, (0.0, 1.0, 3.0))
    start, guess, share = _forecast(history, 4.5)
    assert guess[0] == pytest.approx(3.0 + 9.0 + 0.1 * 4.5**2)
    assert start[0] == pytest.approx(guess[0])
    assert 0.0 < share < 0.5


def test_the_iteration_starts_no_further_from_the_line_than_half_its_rise() -> None:
    history = moments({0.0: 0.0, 1.0: 0.0, 2.0: 1.0}.__getitem__, (0.0, 1.0, 2.0))
    start, guess, _ = _forecast(history, 3.0)
    assert guess[0] == pytest.approx(3.0)
    assert start[0] == pytest.approx(2.5)
