from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from fem.material.conductivity import LAWS, levy, maxwell_eucken, parallel

share = st.floats(0.0, 1.0)
solution = st.floats(0.1, 0.6)
ice = st.floats(2.0, 3.2)


@given(solution, ice, share)
def test_levy_lies_between_the_bounds(k_s: float, k_i: float, v: float) -> None:
    low, mid, high = (
        float(LAWS[law](k_s, k_i, v)) for law in ("solution continuous", "levy", "ice continuous")
    )
    slack = 1e-12
    assert k_s - slack <= low <= mid + slack
    assert mid - slack <= high <= k_i + slack


@given(solution, ice, share)
def test_levy_is_the_same_whichever_phase_comes_first(k_s: float, k_i: float, v: float) -> None:
    assert levy(k_s, k_i, v) == pytest.approx(levy(k_i, k_s, 1.0 - v), rel=1e-9)


@pytest.mark.parametrize("law", list(LAWS))
def test_the_pure_phases_come_out(law: str) -> None:
    assert LAWS[law](0.5, 2.3, 0.0) == pytest.approx(0.5, rel=1e-12)
    assert LAWS[law](0.5, 2.3, 1.0) == pytest.approx(2.3, rel=1e-12)


def test_few_spheres_are_maxwells_dilute_limit() -> None:
    # k = k_c (1 + 3 v (d - c) / (d + 2 c)) to first order in v: Maxwell 1873, value from memory.
    c, d, v = 0.5, 2.3, 1e-6
    assert maxwell_eucken(c, d, v) / c - 1.0 == pytest.approx(3 * v * (d - c) / (d + 2 * c), rel=1e-5)


def test_air_of_a_quarter_overrun() -> None:
    # 25 % overrun is 20 % air: 1.52 to 1.11 W/m/K, computed apart from this code.
    assert maxwell_eucken(1.52, 0.024, 0.2) == pytest.approx(1.11, abs=0.005)


def test_parallel_is_the_mean_by_volume() -> None:
    np.testing.assert_allclose(parallel([[0.25, 0.5], [0.75, 0.5]], [[1.0, 2.0], [3.0, 4.0]]), [2.5, 3.0])
