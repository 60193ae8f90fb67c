from __future__ import annotations

from collections.abc import Callable

import numpy as np
import pytest

from fem.heat import forms, linear
from fem.heat.body import Body
from fem.heat.linear import BandedCholesky, Factor, Multigrid, SparseLDL, factor_for
from fem.heat.pattern import Pattern, narrow_order, width
from tests.pieces import bar_body, slab_body

RUNGS: dict[str, Callable[[Pattern], Factor]] = {
    "banded": lambda pattern: BandedCholesky(pattern, narrow_order(pattern)),
    "sparse": SparseLDL,
    "multigrid": Multigrid,
}
rung = pytest.mark.parametrize("make", RUNGS.values(), ids=RUNGS)


@pytest.fixture(scope="module")
def body() -> Body:
    return bar_body()


def system(body: Body, factor: float) -> np.ndarray:
    regions = [forms.conductance(body.domain, region) for region in body.domain.regions]
    data = factor * np.sum([body.pattern.gather(*entries) for entries in regions], axis=0)
    data[body.pattern.diagonal] += 1.0
    return data


@rung
def test_solves_and_solves_again_with_new_values(make, body) -> None:
    solver = make(body.pattern)
    rng = np.random.default_rng(1)
    for factor in (1.0, 30.0, 0.01):
        data, x = system(body, factor), rng.normal(size=body.size)
        # A residual of 1e-8 of the right-hand side, times a condition number of about 10.
        np.testing.assert_allclose(solver.solve(data, body.pattern.matrix(data) @ x), x, atol=1e-6)


@rung
def test_several_right_hand_sides_at_once_and_again_with_the_last_matrix(make, body) -> None:
    solver = make(body.pattern)
    solver.solve(system(body, 30.0), np.ones(body.size))
    data = system(body, 2.0)
    x = np.random.default_rng(2).normal(size=(body.size, 3))
    rhs = body.pattern.matrix(data) @ x
    np.testing.assert_allclose(solver.solve(data, rhs), x, atol=1e-6)
    np.testing.assert_allclose(solver.again(rhs), x, atol=1e-6)
    np.testing.assert_allclose(solver.again(rhs[:, 1]), x[:, 1], atol=1e-6)
    np.testing.assert_array_equal(solver.again(np.zeros(body.size)), 0.0)


@rung
@pytest.mark.parametrize("shift", [100.0, 2.0], ids=["negative everywhere", "negative for smooth fields"])
def test_an_indefinite_matrix_is_refused(make, body, shift: float) -> None:
    data = system(body, 1.0)
    data[body.pattern.diagonal] -= shift
    solver = make(body.pattern)
    solver.solve(system(body, 1.0), np.ones(body.size))
    with pytest.raises(ArithmeticError, match="not positive definite"):
        solver.solve(data, np.ones(body.size))


def test_an_old_hierarchy_is_kept_until_its_iterations_cost_as_much_as_a_new_one(body, monkeypatch) -> None:
    built = []
    renew = Multigrid._renew
    monkeypatch.setattr(Multigrid, "_renew", lambda self: (built.append(1), renew(self)))
    solver = Multigrid(body.pattern)
    rhs = np.random.default_rng(3).normal(size=body.size)
    for _ in range(5):
        solver.solve(system(body, 1.0), rhs)
    assert len(built) == 1
    for factor in np.geomspace(1.0, 1e4, 12):
        solver.solve(system(body, factor), rhs)
    assert 2 <= len(built) <= 12


def test_the_ladder_goes_by_bandwidth_and_size(body, monkeypatch: pytest.MonkeyPatch) -> None:
    assert isinstance(factor_for(body.pattern), BandedCholesky)
    monkeypatch.setattr(linear, "WIDEST_BAND", 3)
    assert isinstance(factor_for(body.pattern), SparseLDL)
    monkeypatch.setattr(linear, "MOST_FOR_FACTORS", 100)
    assert isinstance(factor_for(body.pattern), Multigrid)


def test_the_band_of_a_rectangle_is_a_row_of_it() -> None:
    pattern = slab_body(thickness="20 mm", width="60 mm", cell="2 mm").pattern
    order = narrow_order(pattern)
    np.testing.assert_array_equal(np.sort(order), np.arange(pattern.size))
    # 11 nodes across; a node of a quadrilateral meets the next row's neighbour.
    assert width(pattern, order) == 12


def test_two_pieces_that_do_not_touch_are_ordered_too() -> None:
    pattern = Pattern(np.array([0, 1, 2, 3]), np.array([1, 0, 3, 2]), 4)
    np.testing.assert_array_equal(np.sort(narrow_order(pattern)), np.arange(4))


def test_the_pattern_keeps_exact_zeros_and_adds_repeated_entries() -> None:
    pattern = Pattern(np.array([0, 0, 1, 0]), np.array([1, 1, 0, 0]), 3)
    data = pattern.gather(np.array([0, 0, 1, 0]), np.array([1, 1, 0, 0]), np.array([1.0, 2.0, 0.0, 0.0]))
    np.testing.assert_array_equal(pattern.matrix(data).toarray(), [[0, 3, 0], [0, 0, 0], [0, 0, 0]])
    assert len(data) == 5


def test_entries_of_one_region_fall_on_their_places_in_the_common_pattern() -> None:
    pattern = Pattern(np.array([0, 1, 2, 0]), np.array([1, 2, 0, 2]), 3)
    data = pattern.gather(np.array([2, 1, 1]), np.array([0, 2, 2]), np.array([5.0, 1.0, 2.0]))
    np.testing.assert_array_equal(pattern.matrix(data).toarray(), [[0, 0, 0], [0, 0, 3], [5, 0, 0]])
