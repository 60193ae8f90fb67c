"""Least squares on times at temperatures, and the refusal of what they cannot tell apart."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace

import numpy as np

from fem.curve import Array
from fem.errors import CaseError, Problem
from fem.plan import Plan
from fem.series.evidence import Evidence
from fem.series.passages import Level, passages
from fem.series.unknowns import Unknown

MARCH_ERROR = 1e-3
"""What a march's times are good for, as a share of themselves."""
MOST_MARCHES = 15
CLOSE = 0.1  # a step that is this share of its standard error is the last
MOST_CONDITION = 25.0
"""Above this the columns of the problem are so nearly parallel that they only fit errors."""
PLAUSIBLE = 20.0


Progress = Callable[[str], None]


@dataclass(frozen=True, eq=False)
class State:
    """Where a search stands: values and pours, and all that a march says of them."""

    values: Array
    pours: Array
    times: Array
    residuals: Array  # [s], the case's time less the log's
    jacobian: Array  # values first, then pours; shape (k, unknowns + pours)
    weights: Array  # 1 / standard deviation [1/s]
    step: Array

    @property
    def freedom(self) -> int:
        """Times less unknowns."""
        return len(self.residuals) - self.jacobian.shape[1]

    @property
    def scatter(self) -> float:
        """Misfit over what noise explains [-]."""
        chi2 = float(np.sum((self.weights * self.residuals) ** 2))
        return float(np.sqrt(chi2 / self.freedom))

    def settled(self, close: float) -> bool:
        """Whether the last step is lost in the errors of the unknowns, or in those of the march."""
        errors = np.sqrt(np.diag(self.covariance())) * max(self.scatter, 1.0)
        moved = np.abs(self.jacobian @ self.step) / self.times.max()
        return bool(np.all(np.abs(self.step) < close * errors) or np.all(moved < MARCH_ERROR))

    def half_widths(self) -> Array:
        """Return the half-widths that hold values and pours 19 times out of 20.

        From the residuals, by Student; and from an error of the march that all times share, which
        no residual shows.
        """
        from scipy.stats import t as student

        by_noise = student.ppf(0.975, self.freedom) * self.scatter * np.sqrt(np.diag(self.covariance()))
        weighted = self.weights[:, None] * self.jacobian
        shared = np.linalg.lstsq(weighted, self.weights * MARCH_ERROR * self.times, rcond=None)[0]
        return np.hypot(by_noise, student.ppf(0.975, np.inf) * shared)

    def covariance(self) -> Array:
        """Return the covariance of values and pours, as the weights have it."""
        weighted = self.weights[:, None] * self.jacobian
        return np.asarray(np.linalg.inv(weighted.T @ weighted))


class Search:
    """Gauss-Newton on the tangents that a march carries along.

    Parameters
    ----------
    plan
        The case made ready; it watches the points where the probes were.
    wanted
        What is fitted.
    seen
        What the logs say.
    progress
        Called with a sentence before each march.

    """

    def __init__(self, plan: Plan, wanted: Sequence[Unknown], seen: Evidence, progress: Progress):
        self.plan, self.wanted, self.seen, self.progress = plan, list(wanted), seen, progress
        self.marches = 0
        self.remarks: list[str] = []

    def run(self, close: float = CLOSE, values: Array | None = None, pours: Array | None = None) -> State:
        """Return the best state, one step of least squares past the last march."""
        fitting = values is None
        values = np.array([u.start for u in self.wanted]) if values is None else values
        pours = np.zeros(self.seen.pours) if pours is None else pours
        for _ in range(MOST_MARCHES):
            state = self._march(values, pours)
            if state is None:
                values = np.array(
                    [u.stepped(v, 0.33 * u.relative) for u, v in zip(self.wanted, values, strict=True)]
                )
                continue
            if fitting:
                if dropped := self._silent(state):
                    values = np.delete(values, dropped)
                    continue
                self._judge(state)
            values, pours = self._stepped(state)
            if state.settled(close):
                return replace(state, values=values, pours=pours)
        why = (
            f"the fit has not settled after {self.marches} marches: the case and the log have too little in "
            "common, look at both"
        )
        raise CaseError(self.plan.case.source, [Problem("--log", why)])

    def _march(self, values: Array, pours: Array) -> State | None:
        """March once; None where the case does not come down to the log's coldest level."""
        self.marches += 1
        said = ", ".join(f"{u.name} {u.kind.written(v)}" for u, v in zip(self.wanted, values, strict=True))
        self.progress(f"march {self.marches}: {said}")
        plan = self.plan
        for unknown, value in zip(self.wanted, values, strict=True):
            plan = unknown.put(plan, value)
        inputs = [entry for u in self.wanted for entry in u.inputs()]
        levels = [Level(at, T) for at, T in zip(self.seen.at, self.seen.temperatures, strict=True)]
        found = passages(plan, levels, inputs)
        if not np.all(np.isfinite(found.times)):
            if self.marches > 6:
                self._never_so_cold(found.times)
            return None
        owner = np.repeat(np.arange(len(self.wanted)), [len(u.keys) for u in self.wanted])
        slopes = np.column_stack([found.slopes[:, owner == i].sum(axis=1) for i in range(len(self.wanted))])
        jacobian = np.column_stack([slopes, self.seen.pour_columns])
        residuals = found.times + self.seen.pour_columns @ pours - self.seen.times
        pace = np.maximum(np.abs(found.paces), 1e-6)
        weights = 1.0 / np.hypot(self.seen.noise / pace, MARCH_ERROR * found.times)
        step = np.linalg.lstsq(weights[:, None] * jacobian, -weights * residuals, rcond=None)[0]
        state = State(values, pours, found.times, residuals, jacobian, weights, step)
        if self.marches == 1:
            self.seen.check_duration(found.times, PLAUSIBLE)
        return state

    def _stepped(self, state: State) -> tuple[Array, Array]:
        n = len(self.wanted)
        step = state.step
        values = np.array(
            [u.stepped(v, s) for u, v, s in zip(self.wanted, state.values, step[:n], strict=True)]
        )
        return values, state.pours + step[n:]

    def _silent(self, state: State) -> list[int]:
        """Drop what came with a short word and moves no time; refuse it where it was named."""
        moves = np.linalg.norm(state.weights[:, None] * state.jacobian, axis=0)[: len(self.wanted)]
        silent = [i for i, size in enumerate(moves) if size < 1.0]
        named = [self.wanted[i].name for i in silent if self.wanted[i].stands]
        if named or len(silent) == len(self.wanted):
            names = ", ".join(named or [u.name for u in self.wanted])
            raise CaseError(
                self.plan.case.source,
                [Problem("--fit", f"the log says nothing about {names}: it ends before")],
            )
        self.remarks += [
            f"{self.wanted[i].name} is left as it is: the log says nothing about it" for i in silent
        ]
        self.wanted = [u for i, u in enumerate(self.wanted) if i not in silent]
        return silent

    def _judge(self, state: State) -> None:
        """Refuse what the logs cannot tell apart."""
        if state.freedom < 1:
            rows, unknowns = state.jacobian.shape
            why = f"{rows} times at temperatures are too few for {unknowns} unknowns"
            raise CaseError(self.plan.case.source, [Problem("--fit", why)])
        weighted = state.weights[:, None] * state.jacobian
        lengths = np.linalg.norm(weighted, axis=0)
        _, sizes, rows = np.linalg.svd(weighted / lengths)
        condition = float(sizes[0] / sizes[-1]) if sizes[-1] > 0 else np.inf
        if condition > MOST_CONDITION:
            why = self._alike(rows[-1], lengths, condition)
            raise CaseError(self.plan.case.source, [Problem("--fit", why)])

    def _alike(self, mix: Array, lengths: Array, condition: float) -> str:
        """Say which unknowns hide each other."""
        n = len(self.wanted)
        trade = mix / lengths
        alike = [i for i in np.argsort(-np.abs(mix)) if abs(mix[i]) > 0.3]
        names = [self.wanted[i].name if i < n else "the time of the pour" for i in alike]
        if len(names) == 1:
            names.append("the rest")
        text = (
            f"the log cannot tell {' and '.join(names)} apart: changed together they leave its times as "
            f"they are (condition number {condition:.0f}, at most {MOST_CONDITION:.0f})"
        )
        if all(i < n and self.wanted[i].relative for i in alike) and len(alike) == 2:
            a, b = alike
            more = -trade[b] / trade[a] * 10.0
            text += (
                f"; 10 % more {self.wanted[a].name} looks like {abs(more):.0f} % "
                f"{'more' if more < 0 else 'less'} {self.wanted[b].name}"
            )
        if any(i >= n for i in alike):
            return (
                text + "; say when the mix was poured with --pour, or use a log that shows the first cooling"
            )
        return text + "; fit one of them, or add a log from another place in the piece"

    def _never_so_cold(self, times: Array) -> None:
        level = self.seen.temperatures[~np.isfinite(times)].max()
        why = (
            f"the case ends before its probe is at {level:.1f} degC, as the log is; let its stages last "
            "longer, or see whether coolant and recipe are those of the log"
        )
        raise CaseError(self.plan.case.source, [Problem("--log", why)])
