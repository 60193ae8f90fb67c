"""The solver against exact solutions: every line is a case through the same `run`."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

from fem.series import truth
from fem.series.verdict import Verdict, judge

# Five cell sizes a few per cent apart put the nodes at five places of the front's last cell.
OFFSETS = (1.0, 0.97, 0.94, 0.91, 0.88)


def verify(offsets: Sequence[float] = OFFSETS) -> Iterator[Verdict]:
    """Yield a verdict for each quantity of each exact solution, as they are run.

    Parameters
    ----------
    offsets
        Factors on the cell sizes; the worst of them is judged.

    """
    for check in truth.CHECKS:
        yield from judge(check, offsets)
