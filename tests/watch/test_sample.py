from __future__ import annotations

import numpy as np
import pytest

from fem.mesh.build import build
from fem.watch.sample import Outside, sampler
from tests.pieces import bar, ring


@pytest.mark.parametrize(("shape", "length"), [(bar(), 0.083), (ring(), None)])
def test_a_linear_field_is_sampled_exactly(shape, length) -> None:
    domain = build(shape, length)
    low, high = domain.bounds
    rng = np.random.default_rng(2)
    points = low[:, None] + (high - low)[:, None] * rng.uniform(0.3, 0.7, (2, 50))
    points[0] = np.abs(points[0]) if length is None else points[0]
    inside = points[:, np.hypot(*points) >= (4.1e-3 if length is None else 0.0)]
    inside = inside[:, inside[0] > 4.1e-3] if length is None else inside
    matrix, _ = sampler(domain, inside)
    field = 3.0 + 7.0 * domain.points[0] - 2.0 * domain.points[1]
    folded = domain.fold(inside)
    np.testing.assert_allclose(matrix @ field, 3.0 + 7.0 * folded[0] - 2.0 * folded[1], rtol=1e-12)


def test_points_on_the_outline_are_inside() -> None:
    domain = build(bar(), 0.083)
    matrix, _ = sampler(domain, np.array([[11.8e-3, -11.8e-3, 0.0], [0.0, 10e-3, 25.8e-3]]))
    np.testing.assert_allclose(matrix.sum(axis=1), 1.0, rtol=1e-12)


def test_points_outside_are_named() -> None:
    with pytest.raises(Outside) as error:
        sampler(build(bar(), 0.083), np.array([[0.0, 11.7e-3], [0.0, 25.7e-3]]))
    assert list(error.value.which) == [1]
