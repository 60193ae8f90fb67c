"""How closely the march follows time."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Annotated, Literal, Self

from pydantic import BaseModel, ConfigDict, model_validator

from fem.errors import Problem, Refused
from fem.quantity import Duration, Kind

TOLERANCE = Kind("share", "percent", "0.1 %", above=0.0, most=10.0)


@dataclass(frozen=True)
class Control:
    """How a march chooses its steps.

    Parameters
    ----------
    tolerance
        Bound on the error of one step (see `fem.march.problem.Problem.mean_size`).
    accept
        A step is accepted up to this multiple of the tolerance.
    growth
        Largest ratio of one step to the last; above 2.4 the scheme is no longer stable.
    first_move
        Share of its reach that an unknown may move in the first step.
    stop_mean, stop_worst
        The iteration of a step stops at these multiples of the tolerance.
    first_step, largest_step
        Given sizes [s]; None to choose.
    most_tries
        Sizes tried for one step before the march gives up.
    most_iterations
        Newton iterations of one step.

    """

    tolerance: float
    accept: float = 1.5
    growth: float = 2.0
    first_move: float = 0.05
    stop_mean: float = 0.2
    stop_worst: float = 1.0
    first_step: float | None = None
    largest_step: float | None = None
    most_tries: int = 40
    most_iterations: int = 25


ACCURACIES = {
    "quick": Control(tolerance=7e-3),
    "standard": Control(tolerance=2e-3),
    "tight": Control(tolerance=2e-4),
}


class Stepping(BaseModel):
    """Accuracy of the steps in time, and bounds on them.

    Parameters
    ----------
    accuracy
        How large an error each step may make.
    first_step
        First step of each stage [s], such as "0.1 s"; chosen if left out.
    largest_step
        Largest step of each stage [s], such as "30 s"; only accuracy bounds it if left out.
    tolerance
        Error that each step may make, such as "0.1 %" of what the piece gives up over the run's span of
        temperatures; that of the accuracy if left out: 1 %, 0.3 % or 0.03 %.

    """

    model_config = ConfigDict(frozen=True, extra="forbid")

    accuracy: Literal["quick", "standard", "tight"] = "standard"
    first_step: Duration | None = None
    largest_step: Duration | None = None
    tolerance: Annotated[float, TOLERANCE] | None = None

    @model_validator(mode="after")
    def _in_order(self) -> Self:
        first, largest = self.first_step, self.largest_step
        if first is not None and largest is not None and first > largest:
            message = f"must not be longer than largest_step ({largest:.4g} s), got {first:.4g} s"
            raise Refused([Problem("first_step", message)])
        return self

    def control(self) -> Control:
        """Return the tolerances of the march."""
        control = replace(
            ACCURACIES[self.accuracy], first_step=self.first_step, largest_step=self.largest_step
        )
        return control if self.tolerance is None else replace(control, tolerance=self.tolerance / 100.0)
