"""Inward freezing: digits, limits, heat balance, bad input.

Digits: Chebyshev front-fixing done independently of this code, which stopped at R / a = 1e-3
and so lies up to 1e-5 low on the cylinder at large Stefan number.
"""

from __future__ import annotations

from math import nan, pi, sqrt

import numpy as np
import pytest

from fem.exact import InwardFreezing, stefan_root

# Ste: slab, cylinder, sphere.
TOTALS = {
    0.005: (100.1665558, 50.1952675, 33.4934168),
    0.05: (10.1655762, 5.1763424, 3.4809727),
    0.1: (5.1645252, 2.6682343, 1.8077784),
    0.2: (2.6625313, 1.4086541, 0.9662942),
    0.5: (1.1572684, 0.6435713, 0.4531063),
    1.0: (0.6502328, 0.3805222, 0.2750681),
    2.0: (0.3900384, 0.2416145, 0.1798450),
}
ROOTS = {
    0.001: 0.0223569544229,
    0.01: 0.0705932765604,
    0.05: 0.156820922335,
    0.1: 0.220016272743,
    0.2: 0.306423905361,
    0.5: 0.464785920646,
    1.0: 0.620062633314,
    2.0: 0.800601362806,
    5.0: 1.05968701428,
}


@pytest.mark.parametrize("ste", ROOTS)
def test_one_phase_root_has_the_digits_computed_elsewhere(ste):
    assert stefan_root(ste) == pytest.approx(ROOTS[ste], rel=1e-11)
    assert InwardFreezing("slab", ste).total == pytest.approx(1 / (4 * ROOTS[ste] ** 2), rel=1e-11)


@pytest.mark.parametrize("ste", TOTALS)
def test_total_times_have_the_digits_computed_elsewhere(ste):
    found = [InwardFreezing(shape, ste).total for shape in ("slab", "cylinder", "sphere")]
    assert found == pytest.approx(TOTALS[ste], rel=2e-5)


@pytest.mark.parametrize(
    ("shape", "ste", "times"),
    [
        ("cylinder", 0.1, (0.049934, 0.415947, 1.049778, 1.814606, 2.497052, 2.610072)),
        ("sphere", 0.1, (0.048310, 0.374730, 0.873982, 1.385253, 1.744513, 1.789486)),
        ("cylinder", 0.5, (0.011227, 0.094273, 0.240492, 0.422046, 0.594279, 0.625704)),
        ("sphere", 0.5, (0.010898, 0.085880, 0.204383, 0.332474, 0.432095, 0.446499)),
    ],
)
def test_times_on_the_way_have_the_digits_computed_elsewhere(shape, ste, times):
    assert InwardFreezing(shape, ste).time([0.9, 0.7, 0.5, 0.3, 0.1, 0.05]) == pytest.approx(times, abs=6e-7)


def test_small_stefan_number_tends_to_the_quasi_steady_time():
    """Next order on the sphere: 1 + Ste - 6 sqrt 2 zeta(3) / pi^2.5 Ste^1.5, value from memory."""
    ste = 1e-3
    ratio = InwardFreezing("sphere", ste).total * 6 * ste
    third = 6 * sqrt(2) * 1.2020569 / pi**2.5
    assert (1 + ste - ratio) / ste**1.5 == pytest.approx(third, rel=0.05)
    assert InwardFreezing("cylinder", ste).total * 4 * ste == pytest.approx(1 + ste, rel=2e-4)


def test_slab_position_is_the_root_of_time():
    slab = InwardFreezing("slab", 0.3)
    assert slab.time([1.0, 0.95, 0.77, 0.5, 0.0]) == pytest.approx(
        slab.total * np.array([0.0, 0.05, 0.23, 0.5, 1.0]) ** 2, rel=1e-12
    )


@pytest.mark.parametrize("shape", ["slab", "cylinder", "sphere"])
def test_front_and_time_are_inverse(shape):
    exact = InwardFreezing(shape, 0.3)
    position = np.array([1.0, 0.999, 0.9, 0.5, 0.1, 0.01, 0.0])
    assert exact.front(exact.time(position)) == pytest.approx(position, abs=1e-5)
    assert np.all(np.diff(exact.time(np.linspace(1, 0, 500))) > 0)


@pytest.mark.parametrize(
    ("shape", "ste"), [("cube", 0.2), ("slab", 0.0), ("sphere", -1.0), ("cylinder", nan)]
)
def test_bad_input_is_refused(shape, ste):
    with pytest.raises(ValueError, match=r"shape|Stefan"):
        InwardFreezing(shape, ste)


def test_positions_and_times_outside_the_body_are_refused():
    exact = InwardFreezing("sphere", 0.3)
    for position in (-0.1, 1.1, nan):
        with pytest.raises(ValueError, match="position"):
            exact.time(position)
    with pytest.raises(ValueError, match="time"):
        exact.front(exact.total * 1.01)
