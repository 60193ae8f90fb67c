"""Materials of the exact solutions as rows of a table."""

from __future__ import annotations

import numpy as np
import pytest

from fem.curve import Curve
from fem.exact import RangeFreezing, SharpFreezing

WATER = SharpFreezing(k_s=2.2, c_s=2050, k_l=0.56, c_l=4200, rho=1000, latent_heat=334e3, T_m=0)
WIDE = RangeFreezing(2.0, 2000, 1.2, 3000, 0.55, 3900, 1050, 270e3, -8, -2, share=0.2)


def test_rows_of_a_sharp_front_hold_its_latent_heat_in_the_last_microkelvin():
    T, H, k = WATER.rows(-40, 20)
    assert list(T) == pytest.approx([-40, -1e-6, 0, 20], abs=1e-12)
    assert H[2] - H[1] == pytest.approx(334e6, rel=1e-7)
    assert H[2] == pytest.approx(0.0, abs=1e-6)
    assert np.diff(H)[[0, 2]] / np.diff(T)[[0, 2]] == pytest.approx([2.05e6, 4.2e6], rel=1e-8)
    assert list(k) == [2.2, 2.2, 0.56, 0.56]


def test_rows_of_a_range_hold_the_share_at_the_solidus_and_the_rest_between():
    curve = Curve.from_enthalpy(*WIDE.rows(-40, 20))
    latent = 1050 * 270e3
    across = curve.enthalpy(-8.0) - curve.enthalpy(-8.0 - 1e-6)
    assert across == pytest.approx(0.2 * latent, rel=1e-5)
    assert curve.enthalpy(-2.0) - curve.enthalpy(-8.0) == pytest.approx(
        0.8 * latent + 1050 * 3000 * 6, rel=1e-9
    )
    assert curve.capacity(-5.0) == pytest.approx(1050 * WIDE.effective_capacity, rel=1e-9)
    assert curve.conductivity([-9.0, -5.0, 1.0]) == pytest.approx([2.0, 1.2, 0.55], rel=1e-9)
    assert curve.enthalpy(0.0) == pytest.approx(0.0, abs=1e-5)


@pytest.mark.parametrize(("low", "high"), [(0.0, 10.0), (-40.0, 0.0), (5.0, -5.0)])
def test_rows_have_to_reach_over_the_jump(low, high):
    with pytest.raises(ValueError, match="rise"):
        WATER.rows(low, high)


def test_a_jump_has_a_width():
    with pytest.raises(ValueError, match="wide"):
        WIDE.rows(-40, 10, width=0.0)


@pytest.mark.parametrize(
    "change", [{"k_s": 0.0}, {"latent_heat": -1.0}, {"rho": float("nan")}, {"T_m": float("inf")}]
)
def test_a_sharp_material_refuses_what_is_not_above_0_or_not_finite(change):
    good = {"k_s": 2.2, "c_s": 2050, "k_l": 0.56, "c_l": 4200, "rho": 1000, "latent_heat": 334e3, "T_m": 0}
    with pytest.raises(ValueError, match=next(iter(change))):
        SharpFreezing(**(good | change))


@pytest.mark.parametrize(
    ("T_s", "T_l", "share"), [(-2, -2, 0.0), (0, -2, 0.0), (-8, -2, 1.0), (-8, -2, -0.1)]
)
def test_a_range_refuses_a_solidus_at_the_liquidus_and_shares_outside_0_to_1(T_s, T_l, share):
    with pytest.raises(ValueError, match=r"T_s|share"):
        RangeFreezing(2.0, 2000, 1.2, 3000, 0.55, 3900, 1050, 270e3, T_s, T_l, share)
