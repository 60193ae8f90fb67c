"""What a result hangs on among many things that vary."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from fem.series.sweep_plan import SweepPlan
from fem.series.table import Heads, Row


@dataclass(frozen=True)
class Weight:
    """How much a result hangs on one thing that varies.

    Parameters
    ----------
    name
        What varies.
    share
        Of the result's variance, what the means over its settings explain, 0 to 1.
    low, high
        Settings with the smallest and the largest mean.
    swing
        Between these means, in the unit of the result.

    """

    name: str
    share: float
    low: Any
    high: Any
    swing: float


def weights_of(plan: SweepPlan, rows: Sequence[Row], result: str) -> list[Weight]:
    """Return what a result hangs on, the most important first; drawn numbers are put in bins."""
    heads = Heads(plan)
    head = heads.results[result]
    usable = [row for row in rows if row[head] is not None]
    values = np.array([row[head] for row in usable])
    if len(values) < 3 or np.ptp(values) == 0.0:
        return []
    found = []
    for name, column in heads.varied.items():
        groups = _groups([row[column] for row in usable], plan.unit_of(name) is not None)
        means = np.array([values[at].mean() for _, at in groups])
        sizes = np.array([len(at) for _, at in groups])
        share = float(np.sum(sizes * (means - values.mean()) ** 2) / np.sum((values - values.mean()) ** 2))
        low, high = int(np.argmin(means)), int(np.argmax(means))
        found.append(Weight(name, share, groups[low][0], groups[high][0], float(means[high] - means[low])))
    return sorted(found, key=lambda w: -w.share)


def _groups(settings: list[Any], numeric: bool) -> list[tuple[Any, NDArray[np.intp]]]:
    """Return settings and the rows that have them; many numbers in bins of as many rows each."""
    distinct = list(dict.fromkeys(settings))
    if not numeric or len(distinct) <= max(4, len(settings) // 4):
        return [(s, np.flatnonzero([t == s for t in settings])) for s in distinct]
    order = np.argsort(np.array(settings, dtype=float), kind="stable")
    bins = np.array_split(order, max(2, min(6, len(settings) // 5)))
    return [(float(np.mean([settings[i] for i in at])), at) for at in bins]
