from __future__ import annotations

import numpy as np
import pytest

from fem.heat import linear
from fem.heat.linear import BandedCholesky, Pattern, SparseLDL, factor_for
from tests.pieces import bar_body


def system(body, factor: float) -> np.ndarray:
    data = factor * body.parts[0].stiffness.data.copy()
    data[body.pattern.diagonal] += 1.0
    return data


@pytest.mark.parametrize("kind", [BandedCholesky, SparseLDL])
def test_solves_and_solves_again_with_new_values(kind) -> None:
    body = bar_body()
    if kind is BandedCholesky:
        solver = factor_for(body.pattern)
        assert isinstance(solver, BandedCholesky)
    else:
        solver = SparseLDL(body.pattern)
    rng = np.random.default_rng(1)
    for factor in (1.0, 30.0, 0.01):
        data, x = system(body, factor), rng.normal(size=body.size)
        np.testing.assert_allclose(solver.solve(data, body.pattern.matrix(data) @ x), x, rtol=1e-9, atol=1e-11)


def test_a_wide_band_goes_to_the_sparse_factor(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(linear, "WIDEST_BAND", 3)
    assert isinstance(factor_for(bar_body().pattern), SparseLDL)


def test_an_indefinite_matrix_is_refused() -> None:
    body = bar_body()
    data = system(body, 1.0)
    data[body.pattern.diagonal] -= 100.0
    with pytest.raises(ArithmeticError, match="not positive definite"):
        factor_for(body.pattern).solve(data, np.ones(body.size))


def test_the_pattern_keeps_exact_zeros_and_adds_repeated_entries() -> None:
    pattern = Pattern(np.array([0, 0, 1, 0]), np.array([1, 1, 0, 0]), 3)
    data = pattern.gather(np.array([0, 0, 1, 0]), np.array([1, 1, 0, 0]), np.array([1.0, 2.0, 0.0, 0.0]))
    np.testing.assert_array_equal(pattern.matrix(data).toarray(), [[0, 3, 0], [0, 0, 0], [0, 0, 0]])
    assert len(data) == 5
