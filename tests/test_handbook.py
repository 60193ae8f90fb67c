"""Hand methods: worked numbers, agreement with exact times, ranges, bad input.

The formulas are values from memory; the numbers were computed from them independently.
"""

from __future__ import annotations

from math import inf, nan

import numpy as np
import pytest

from fem.exact import quasi_steady as qs
from fem.handbook import Estimate, conductance, mean_freezing_temperature, pham, plank, shape_factor

# Gel: capacities and latent heat in J/m3 (values from memory), core to -10 degC.
UNFROZEN, FROZEN, LATENT, GEL_FREEZES, GEL_K = 3.71e6, 1.90e6, 209e6, -0.6, 1.65


def gel(E, D, h, start, coolant):
    mean = mean_freezing_temperature(-10, coolant)
    return pham(
        D / 2,
        h,
        GEL_K,
        start=start,
        end=-10,
        coolant=coolant,
        capacity_unfrozen=UNFROZEN,
        heat=UNFROZEN * (start - mean) + LATENT + FROZEN * (mean + 10),
        shape_factor=E,
        freezing_point=GEL_FREEZES,
        capacity_frozen=FROZEN,
    )


def test_plank_sphere_of_the_textbooks():
    found = plank("sphere", 0.07, 50, 1.2, 250e6, -1.25, -40)
    assert found.time_s == pytest.approx(2603.05, abs=0.005)
    assert found.method == "Plank"
    assert any("lower bound" in remark for remark in found.remarks)


@pytest.mark.parametrize(
    ("shape", "phi"), [("slab", qs.slab), ("cylinder", qs.cylinder), ("sphere", qs.sphere)]
)
def test_plank_is_the_exact_quasi_steady_time(shape, phi):
    size, h, k, latent = 0.04, 80.0, 1.7, 2.4e8
    exact = qs.freezing_time(phi(size / 2, h * size / 2 / k), latent, k, 22.0)
    assert plank(shape, size, h, k, latent, -2.0, -24.0).time_s == pytest.approx(exact, rel=1e-12)


def test_half_the_thickness_is_a_quarter_of_the_time_at_large_biot_and_half_at_small():
    for h, ratio in ((1e7, 4.0), (1e-3, 2.0)):
        thick, thin = (plank("slab", D, h, 1.7, 2.4e8, -2, -24).time_s for D in (0.02, 0.01))
        assert thick / thin == pytest.approx(ratio, rel=1e-4)


@pytest.mark.parametrize(
    ("case", "seconds"),
    [
        ((1, 0.05, 50, 10, -30), 6923.6),
        ((1, 0.1, 25, 20, -25), 35553.8),
        ((1, 0.025, 100, 5, -35), 1412.6),
        ((2, 0.15, 30, 20, -30), 22730.7),
        ((3, 0.13, 40, 20, -35), 9028.4),
    ],
)
def test_pham_on_gel(case, seconds):
    found = gel(*case)
    assert found.time_s == pytest.approx(seconds, abs=0.06)
    assert found.in_range
    assert found.remarks == ()


@pytest.mark.parametrize(
    ("case", "seconds"),
    [
        ((1, 0.05, 50, 10, -30), 6296.1),
        ((1, 0.1, 25, 20, -25), 33493.2),
        ((2, 0.15, 30, 20, -30), 21183.9),
        ((3, 0.13, 40, 20, -35), 8671.4),
    ],
)
def test_pham_is_within_a_tenth_of_a_numerical_gel_that_freezes_gradually(case, seconds):
    """Numerical times of an independent enthalpy run; Pham itself is stated as +/-10 %."""
    assert gel(*case).time_s == pytest.approx(seconds, rel=0.1)


def test_a_workshop_bar_by_hand():
    """22 x 50 mm in coolant at -22 degC behind 0.8 mm of steel: 1130 s, all inputs as stated there."""
    U = conductance(250, [(0.8e-3, 16)])
    assert pytest.approx(247, abs=0.1) == U
    E = shape_factor(50 / 22, U * 0.022 / 1.70)
    assert pytest.approx(1.13, abs=0.005) == E
    mean = mean_freezing_temperature(-12, -22)
    found = pham(
        0.011,
        U,
        1.70,
        start=4,
        end=-12,
        coolant=-22,
        capacity_unfrozen=31.0e6 / (4 - mean),
        heat=31.0e6 + 267.1e6,
        shape_factor=E,
    )
    assert found.time_s * E == pytest.approx(1282, rel=0.003)
    assert found.time_s == pytest.approx(1130, rel=0.005)
    assert any("not judged: Ste and Pk" in remark for remark in found.remarks)


@pytest.mark.parametrize(
    ("biot", "square", "oblong"),
    [
        (0.1, 1.98717, 1.44607),
        (0.5, 1.91867, 1.27923),
        (1, 1.85911, 1.20761),
        (5, 1.75589, 1.14023),
        (50, 1.73130, 1.12957),
    ],
)
def test_shape_factors_have_the_digits_computed_elsewhere(biot, square, oblong):
    assert shape_factor(1, 2 * biot) == pytest.approx(square, abs=6e-6)
    assert shape_factor(2, 2 * biot) == pytest.approx(oblong, abs=6e-6)


def test_shape_factors_are_within_3_percent_of_the_exact_ratio():
    for beta in (1, 1.5, 2, 50 / 22, 3, 6):
        for biot in np.geomspace(0.02, 200, 12):
            exact = qs.slab(1, biot / 2) / qs.rectangle(1, beta, biot / 2)
            assert shape_factor(beta, biot) == pytest.approx(exact, rel=0.03)


def test_a_film_and_walls_in_series():
    assert conductance(400, [(1e-3, 16), (1e-4, 0.022)]) == pytest.approx(140.6875, abs=5e-5)
    assert conductance(400) == pytest.approx(400)
    assert conductance(400, [(0.0, 16)]) == pytest.approx(400)


def test_pham_says_what_is_outside_its_range():
    found = gel(1, 0.05, 1000, 10, -30)
    assert not found.in_range
    assert found.remarks == ("Bi = 15.2 is outside 0.02 to 11",)
    hot = gel(1, 0.05, 50, 60, -30)
    assert not hot.in_range
    assert any(remark.startswith("Pk") for remark in hot.remarks)
    cold = gel(1, 0.05, 50, 10, -60)
    assert any(remark.startswith("Ste") for remark in cold.remarks)


def test_plank_says_what_is_outside_its_range():
    def of(**more):
        return plank("slab", 0.02, 200, 1.7, 2.4e8, -2, -12, **more)

    assert of(capacity_frozen=2e6, capacity_unfrozen=3.6e6, start=-2).in_range
    assert not of(capacity_frozen=3e6).in_range
    assert not of(capacity_unfrozen=3.6e6, start=4).in_range
    assert sum("not judged" in remark for remark in of().remarks) == 2


def test_an_estimate_is_frozen():
    estimate = Estimate(1.0, "Plank", True, ())
    with pytest.raises(AttributeError):
        estimate.time_s = 2.0


@pytest.mark.parametrize(
    "change",
    [
        {"size": 0.0},
        {"h": -1.0},
        {"conductivity": nan},
        {"latent": inf},
        {"coolant": -1.0},
        {"shape": "cube"},
    ],
)
def test_plank_refuses_bad_input(change):
    good = {"shape": "slab", "size": 0.02, "h": 200, "conductivity": 1.7, "latent": 2.4e8}
    good |= {"freezing_point": -2, "coolant": -12}
    with pytest.raises(ValueError, match=next(iter(change))):
        plank(**(good | change))


@pytest.mark.parametrize(
    ("change", "word"),
    [
        ({"half_size": 0.0}, "half_size"),
        ({"h": nan}, "h has"),
        ({"end": -40.0}, "coolant"),
        ({"end": 12.0}, "end"),
        ({"heat": 1e6}, "precooling"),
        ({"shape_factor": 0.0}, "shape_factor"),
        ({"start": -9.0}, "mean freezing"),
    ],
)
def test_pham_refuses_bad_input(change, word):
    good = {"half_size": 0.01, "h": 200, "conductivity": 1.7, "start": 4, "end": -12, "coolant": -30}
    good |= {"capacity_unfrozen": 3.6e6, "heat": 3e8}
    with pytest.raises(ValueError, match=word):
        pham(**(good | change))


@pytest.mark.parametrize(("beta", "biot"), [(0.9, 1.0), (nan, 1.0), (2.0, 0.0)])
def test_shape_factor_refuses_bad_input(beta, biot):
    with pytest.raises(ValueError, match=r"beta|biot"):
        shape_factor(beta, biot)


@pytest.mark.parametrize(("h", "layers"), [(0.0, []), (100.0, [(1e-3, 0.0)]), (100.0, [(-1e-3, 16.0)])])
def test_conductance_refuses_bad_input(h, layers):
    with pytest.raises(ValueError, match=r"h has|layer"):
        conductance(h, layers)
