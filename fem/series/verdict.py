"""How a computed number is judged by an exact one."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import asdict, dataclass, field
from typing import Any

import numpy as np

from fem.curve import Array


@dataclass(frozen=True, eq=False)
class Sample:
    """One quantity of one run beside its exact values.

    Parameters
    ----------
    exact, ours
        Values in `unit`, shape (n,): a window of times, or one total.
    unit
        "mm", "degC", "s" or "W/m2".

    """

    exact: Array
    ours: Array
    unit: str

    @property
    def errors(self) -> Array:
        """Size of each error: in K for temperatures, else relative [-]."""
        gap = np.abs(self.ours - self.exact)
        return gap if self.unit == "degC" else gap / np.abs(self.exact)


@dataclass(frozen=True)
class Bound:
    """What is demanded of a quantity.

    Parameters
    ----------
    error
        Largest error that passes: relative, or in K for temperatures.
    rate
        Least order at which the mean error has to fall with the cell; None where the finest
        level is at the bottom of what time steps leave.

    """

    error: float
    rate: float | None = None


@dataclass(frozen=True)
class Check:
    """A case with an exact answer, run at several cell sizes and offsets of the cells.

    Parameters
    ----------
    name
        In words.
    source
        Where the exact answer comes from.
    cells
        Cell sizes from coarse to fine [m].
    samples
        From a cell size to the quantities of one run.
    bounds
        Quantity -> what is demanded.

    """

    name: str
    source: str
    cells: tuple[float, ...]
    samples: Callable[[float], dict[str, Sample]]
    bounds: dict[str, Bound]


@dataclass(frozen=True)
class Verdict:
    """One line of the table: the worst of all offsets and times at the finest cells.

    Parameters
    ----------
    check, source, quantity, unit
        What was judged, by what.
    exact, ours
        At the time and offset where the error is worst.
    error, bound
        Relative, or in K where the unit is degC.
    rate, least_rate
        Order of the mean error over the cell sizes; None for a single size, or none demanded.
    passed
        Whether both hold.

    """

    check: str
    source: str
    quantity: str
    unit: str
    exact: float
    ours: float
    error: float
    bound: float
    rate: float | None
    least_rate: float | None
    passed: bool = field(default=False)

    def as_dict(self) -> dict[str, Any]:
        """Return the line for JSON."""
        return asdict(self)

    def cells(self) -> tuple[str, ...]:
        """Return the line for a terminal: check, quantity, exact, ours, error, bound, rate."""
        absolute = self.unit == "degC"
        error, bound = (f"{v:.3f} K" if absolute else f"{100 * v:.3f} %" for v in (self.error, self.bound))
        rate = "" if self.rate is None else f"{self.rate:.1f}"
        values = (f"{v:.5g} {self.unit}" for v in (self.exact, self.ours))
        return (self.check, self.quantity, *values, error, bound, rate)


def judge(check: Check, offsets: Sequence[float]) -> list[Verdict]:
    """Run a check and return a verdict for each of its quantities.

    Parameters
    ----------
    check
        What to run.
    offsets
        Factors on the cell size: a few per cent apart, they move every node past the front.

    """
    levels = [[check.samples(cell * factor) for factor in offsets] for cell in check.cells]
    return [_verdict(check, quantity, bound, levels) for quantity, bound in check.bounds.items()]


def _verdict(check: Check, quantity: str, bound: Bound, levels: list[list[dict[str, Sample]]]) -> Verdict:
    means = [float(np.mean(np.concatenate([run[quantity].errors for run in runs]))) for runs in levels]
    finest = [run[quantity] for run in levels[-1]]
    exact, ours, errors = (
        np.concatenate([getattr(sample, name) for sample in finest]) for name in ("exact", "ours", "errors")
    )
    worst = int(np.argmax(errors))
    rate = None
    if len(means) > 1:
        steps = np.log(np.array(check.cells))
        rate = float(np.polyfit(steps, np.log(np.maximum(means, 1e-300)), 1)[0])
    error = float(errors[worst])
    passed = error <= bound.error and (bound.rate is None or rate is None or rate >= bound.rate)
    return Verdict(
        check.name,
        check.source,
        quantity,
        finest[0].unit,
        float(exact[worst]),
        float(ours[worst]),
        error,
        bound.error,
        rate,
        bound.rate,
        bool(passed),
    )
