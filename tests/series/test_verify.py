from __future__ import annotations

import numpy as np
import pytest

from fem.series.truth import CHECKS
from fem.series.verdict import Bound, Check, Sample, judge

# Fewer offsets than the command takes, the first and one between, to keep the suite short.
OFFSETS = (1.0, 0.93)


@pytest.mark.parametrize("check", CHECKS, ids=lambda check: check.name)
def test_the_solver_meets_the_exact_solution(check: Check) -> None:
    verdicts = judge(check, OFFSETS)
    assert verdicts
    failed = [" ".join(v.cells()) for v in verdicts if not v.passed]
    assert not failed, "\n".join(failed)


def test_every_line_that_is_promised_is_there() -> None:
    names = " ".join(check.name for check in CHECKS)
    for part in ("one phase", "two phases", "three zones", "similarity", "cylinder", "line sink", "square"):
        assert part in names


def quadratic(scale: float, unit: str = "mm") -> Check:
    def samples(cell: float) -> dict[str, Sample]:
        exact = np.array([2.0, 4.0])
        return {"depth": Sample(exact, exact * (1 + np.array([0.5, 1.0]) * scale * cell**2), unit)}

    return Check("made up", "none", (0.4, 0.2, 0.1), samples, {"depth": Bound(0.01, 1.5)})


def test_the_worst_time_and_offset_are_judged_at_the_finest_cells() -> None:
    (verdict,) = judge(quadratic(0.5), (1.0, 0.5))
    assert verdict.passed
    assert (verdict.exact, verdict.error) == (4.0, pytest.approx(0.005))
    assert verdict.rate == pytest.approx(2.0, abs=1e-9)


def test_an_error_beyond_its_bound_fails() -> None:
    assert not judge(quadratic(2.0), (1.0,))[0].passed


def test_an_error_that_does_not_fall_fast_enough_fails() -> None:
    check = quadratic(0.5)
    slow = Check(check.name, check.source, check.cells, check.samples, {"depth": Bound(0.01, 2.5)})
    assert not judge(slow, (1.0,))[0].passed


def test_temperatures_are_judged_in_kelvin() -> None:
    (verdict,) = judge(quadratic(0.5, "degC"), (1.0,))
    assert verdict.error == pytest.approx(0.02)
    assert "K" in verdict.cells()[4]
