"""Quasi-steady total times: digits, limits, the equation itself, bad input.

Digits: computed from the stated formulas, independently of this code.
"""

from __future__ import annotations

from math import inf, nan, sqrt

import numpy as np
import pytest

from fem.exact import InwardFreezing
from fem.exact import quasi_steady as qs


@pytest.mark.parametrize(
    ("b", "phi"), [(1, 0.29468541), (1.5, 0.40308554), (2, 0.45548732), (3, 0.49072957), (4, 0.49807271)]
)
def test_bar_with_cold_wall(b, phi):
    assert qs.rectangle(1, b) == pytest.approx(phi, abs=1e-8)
    assert qs.rectangle(b, 1) == pytest.approx(phi, abs=1e-8)


@pytest.mark.parametrize(
    ("biot", "square", "oblong"),
    [
        (0.1, 5.3317355, 7.2807106),
        (0.5, 1.3264768, 1.9055121),
        (1, 0.8216849, 1.2098261),
        (2, 0.5654289, 0.8473147),
        (5, 0.4069193, 0.6180428),
        (10, 0.3519498, 0.5380734),
        (50, 0.3063943, 0.4722477),
    ],
)
def test_bar_in_a_coolant(biot, square, oblong):
    assert qs.rectangle(1, 1, biot) == pytest.approx(square, abs=1e-7)
    assert qs.rectangle(1, 2, biot) == pytest.approx(oblong, abs=1e-7)
    assert qs.rectangle(2, 1, 2 * biot) == pytest.approx(oblong, abs=1e-7)


@pytest.mark.parametrize(
    ("half_height", "phi"),
    [(0.5, 0.10145227), (1, 0.20066348), (1.5, 0.23500012), (2, 0.24548571), (3, 0.24959221)],
)
def test_finite_cylinder_with_cold_wall(half_height, phi):
    # These digits come from a series broken off at 1e-7.
    assert qs.finite_cylinder(1, half_height) == pytest.approx(phi, abs=2e-7)


@pytest.mark.parametrize(
    ("biot", "squat", "tall"),
    [
        (0.1, 3.5634268, 4.3515215),
        (1, 0.5550066, 0.6948948),
        (10, 0.2395307, 0.2930708),
        (50, 0.2086303, 0.2550708),
    ],
)
def test_finite_cylinder_in_a_coolant(biot, squat, tall):
    assert qs.finite_cylinder(1, 1, biot) == pytest.approx(squat, abs=2e-7)
    assert qs.finite_cylinder(1, 2, biot) == pytest.approx(tall, abs=2e-7)


@pytest.mark.parametrize(
    ("sides", "phi"),
    [
        ((1, 1), 0.2248513),
        ((1.5, 1.5), 0.3501579),
        ((2, 2), 0.4246251),
        ((2, 3), 0.4501002),
        ((3, 4), 0.4891872),
        ((1.5, 3), 0.3999311),
    ],
)
def test_brick_with_cold_wall(sides, phi):
    # The digits are a double series broken off in the seventh place.
    assert qs.brick(1, *sides) == pytest.approx(phi, abs=2e-7)


@pytest.mark.parametrize(
    ("biot", "cube", "brick"),
    [(0.1, 3.6086467, 6.240812), (1, 0.5939672, 1.149428), (50, 0.2337405, 0.466328)],
)
def test_brick_in_a_coolant(biot, cube, brick):
    assert qs.brick(1, 1, 1, biot) == pytest.approx(cube, abs=1e-7)
    assert qs.brick(1, 2, 3, biot) == pytest.approx(brick, abs=6e-7)
    assert qs.brick(3, 1, 2, 3 * biot) == pytest.approx(brick, abs=6e-7)


def test_closed_forms():
    assert [qs.slab(2), qs.cylinder(2), qs.sphere(2)] == pytest.approx([2.0, 1.0, 2 / 3])
    assert [qs.slab(1, 2), qs.cylinder(1, 2), qs.sphere(1, 2)] == pytest.approx([1.0, 0.5, 1 / 3])
    assert [qs.ellipse(1, b) for b in (1.5, 2, 3, 4)] == pytest.approx(
        [0.34615385, 0.4, 0.45, 0.47058824], rel=2e-8
    )
    inradius = sqrt(3) / 6
    assert qs.triangle(1) / inradius**2 == pytest.approx(1 / 3)


def test_shapes_tend_to_each_other():
    assert qs.ellipse(1, 1) == pytest.approx(qs.cylinder(1))
    assert qs.ellipsoid(1, 1, 1) == pytest.approx(qs.sphere(1))
    assert qs.ellipsoid(1, 2, 1e6) == pytest.approx(qs.ellipse(1, 2))
    for biot in (0.3, inf):
        assert qs.rectangle(1, 40, biot) == pytest.approx(qs.slab(1, biot), rel=1e-6)
        assert qs.brick(1, 2, 80, biot) == pytest.approx(qs.rectangle(1, 2, biot), rel=1e-6)
        assert qs.finite_cylinder(1, 40, biot) == pytest.approx(qs.cylinder(1, biot), rel=1e-6)
    assert qs.rectangle(1, 1.3, 1e9) == pytest.approx(qs.rectangle(1, 1.3), rel=1e-8)


def test_series_solve_the_equation_on_a_grid():
    """Second differences on 2 a over 2 b, Robin on two sides, against the series: second order."""
    errors = [difference_bar(1.0, 1.5, 0.8, n) - qs.rectangle(1.0, 1.5, 0.8) for n in (16, 32)]
    assert abs(errors[1]) < 1e-3
    assert errors[0] / errors[1] == pytest.approx(4.0, rel=0.05)


def test_inward_freezing_tends_to_it():
    ste = 1e-3
    for shape, phi in (("slab", qs.slab(1)), ("cylinder", qs.cylinder(1)), ("sphere", qs.sphere(1))):
        # Dimensionless time is phi / Ste at the limit, the next order a factor 1 + Ste.
        assert InwardFreezing(shape, ste).total * ste == pytest.approx(phi, rel=1.1e-3)


def test_freezing_time_of_a_block_of_ice():
    """1 by 2 can 0.2794 m wide in brine at -9.44 degC: 36.4 h (computed from the formula)."""
    phi = qs.rectangle(0.1397, 0.2794)
    time = qs.freezing_time(phi, 917 * 334e3, 2.2, (32 - 15) / 1.8)
    assert time / 3600 == pytest.approx(36.4, abs=0.05)


@pytest.mark.parametrize(
    "call",
    [
        lambda: qs.slab(0.0),
        lambda: qs.cylinder(1.0, 0.0),
        lambda: qs.rectangle(1.0, nan),
        lambda: qs.rectangle(1.0, 1.0, -1.0),
        lambda: qs.brick(1.0, 1.0, 0.0),
        lambda: qs.finite_cylinder(1.0, -1.0),
        lambda: qs.finite_cylinder(1.0, 0.1),
        lambda: qs.ellipsoid(1.0, 1.0, 0.0),
        lambda: qs.freezing_time(1.0, 1.0, 1.0, 0.0),
    ],
)
def test_bad_input_is_refused(call):
    with pytest.raises(ValueError, match=r"above 0|a fifth"):
        call()


def difference_bar(a, b, h, n):
    """phi in the middle by finite volumes on a quarter, cell centres, extrapolated to the middle."""
    dx, dy = a / n, b / n
    one = np.eye(n)
    line = 2 * one - np.eye(n, k=1) - np.eye(n, k=-1)
    line[0, 0] = 1.0

    def operator(step):
        matrix = line / step**2
        # From the last centre half a cell of solid and the film in series.
        matrix[-1, -1] = 1 / step**2 + 1 / (step * (step / 2 + 1 / h))
        return matrix

    matrix = np.kron(operator(dx), one) + np.kron(one, operator(dy))
    phi = np.linalg.solve(matrix, np.ones(n * n)).reshape(n, n)
    # Even in both directions: a parabola through the first two centres in each.
    weights = np.array([9 / 8, -1 / 8])
    return float(weights @ phi[:2, :2] @ weights)
