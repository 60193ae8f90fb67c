"""The value of one input that just meets the aim: a root search that keeps its bracket.

Each run carries the derivative of its time to the aim along, so most steps are Newton's, taken in
the variable in which that time is straight: 1/h, or the inverse of the distance between freezing
point and coolant. Where no derivative is at hand the bracket is halved.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

from pydantic_core import PydanticCustomError

from fem.case.case import Case
from fem.case.shift import kind_of, value_of
from fem.errors import CaseError, Problem
from fem.quantity import Kind
from fem.series.aim_search import AimSearch, Progress, Trial, written
from fem.signal import Signal


@dataclass(frozen=True)
class SetPoint:
    """What a search has found.

    Parameters
    ----------
    key, kind
        What was varied, and what sort of quantity it is.
    between
        The interval that was searched, in the unit of the kind.
    within
        The time given for the aim [s].
    with_margin
        Whether the aim is met at the unfavourable end of the time's range.
    value
        The value that just meets the aim, on the side that meets it; None where there is none.
    why
        A sentence: what was found, or why there is none.
    trials
        Every run, in order.

    """

    key: str
    kind: Kind
    between: tuple[float, float]
    within: float
    with_margin: bool
    value: float | None
    why: str
    trials: tuple[Trial, ...]

    @property
    def text(self) -> str | None:
        """The value as a case has it."""
        return None if self.value is None else self.written(self.value)

    def written(self, value: float, digits: int = 9) -> str:
        """Return any value of the input as a case has it."""
        return written(self.kind, value, digits)

    def as_dict(self) -> dict[str, Any]:
        """Return the outcome for JSON: SI, temperatures in degC."""
        return {
            "key": self.key,
            "unit": self.kind.unit,
            "between": list(self.between),
            "within_s": self.within,
            "with_margin": self.with_margin,
            "value": self.value,
            "text": self.text,
            "why": self.why,
            "runs": [{"value": t.value, "time_s": t.time} for t in self.trials],
        }


def setpoint(
    case: Case,
    vary: str,
    between: tuple[str, str],
    *,
    with_margin: bool = False,
    progress: Progress | None = None,
) -> SetPoint:
    """Find the value of an input with which the aim is met in exactly the time that is given for it.

    Parameters
    ----------
    case
        From `fem.case.read.load`; it has an aim with a time.
    vary
        Dotted key of a quantity, such as "stages.freeze.surfaces.outside.coolant".
    between
        Ends of the interval to search, as a case writes them: ``("-30 degC", "-15 degC")``.
    with_margin
        Whether the aim has to be met at the unfavourable end of the time's range, instead of by
        the likely time.
    progress
        Called with a sentence before each run.

    Returns
    -------
    The value, at most 0.04 K or 0.2 % on the side that meets the aim; or that there is none.

    Raises
    ------
    CaseError
        No aim, an unknown key, values that cannot be read or run.
    RunFailure
        Where a run cannot go on.

    """
    if case.aim is None or case.aim.within is None:
        message = 'is needed: set-points are sought for a time, such as within = "20 min" under [aim]'
        raise CaseError(case.source, [Problem("aim.within", message)])
    kind, ends = _read(case, vary, between)
    search = AimSearch(case, vary, kind, ends, with_margin, progress or (lambda said: None))
    value, why = search.find()
    return SetPoint(vary, kind, ends, case.aim.within, with_margin, value, why, tuple(search.trials))


def _read(case: Case, key: str, between: tuple[str, str]) -> tuple[Kind, tuple[float, float]]:
    problems = []
    try:
        kind = kind_of(case, key)
        own = value_of(case, key)
    except ValueError as error:
        raise CaseError(case.source, [Problem("--vary", str(error))]) from error
    if isinstance(own, Signal) and not own.constant:
        raise CaseError(
            case.source, [Problem("--vary", f'"{key}" changes with time: no single value stands for it')]
        )
    ends = []
    for text in between:
        try:
            ends.append(kind.read(text))
        except PydanticCustomError as error:
            said = error.message()
            problems.append(Problem("--between", said if text in said else f"{text} {said}"))
    if not problems and ends[0] == ends[1]:
        problems.append(Problem("--between", f"is one value twice, {between[0]}; an interval has two ends"))
    if problems:
        raise CaseError(case.source, problems)
    return kind, (ends[0], ends[1])
