"""Growth into supercooled water and the corner: digits, balance, bad input.

Digits: computed from the stated formulas, independently of this code.
"""

from __future__ import annotations

from math import exp, nan, pi, sqrt

import numpy as np
import pytest
from scipy.integrate import quad
from scipy.special import erf, erfc

from fem.exact import corner_diagonal, corner_front, frank_root, recalescence

FRANK = {
    0.01: (0.005678093332, 0.0415334363, 0.07551361377),
    0.05: (0.02914364976, 0.1143771656, 0.1849623961),
    0.1: (0.06031390023, 0.1846234866, 0.2826305065),
    0.25: (0.1689990425, 0.3802714137, 0.5388711272),
    0.5: (0.4327515994, 0.7810619641, 1.038016924),
    0.9: (1.930507628, 2.858430025, 3.556553589),
}


@pytest.mark.parametrize("supercooling", FRANK)
def test_frank_has_the_digits_computed_elsewhere(supercooling):
    found = [frank_root(shape, supercooling) for shape in ("plane", "cylinder", "sphere")]
    assert found == pytest.approx(FRANK[supercooling], rel=1e-9)


def test_a_sphere_in_water_5_K_supercooled():
    eta = frank_root("sphere", 4200 * 5 / 334e3)
    assert 2e3 * eta * sqrt(0.56 / 4.2e6 * 60) == pytest.approx(1.1991257, rel=1e-7)


def test_latent_heat_of_the_sphere_warms_the_water_around_it():
    """Heat in the water, by quadrature of its profile, is that of the ice: all per 4 pi."""
    delta = 0.3
    eta = frank_root("sphere", delta)

    def shell(z):
        return quad(lambda s: exp(-s * s) / (s * s), z, 12, epsabs=1e-14, epsrel=1e-12)[0]

    amplitude = delta / shell(eta)
    gained = quad(lambda z: amplitude * shell(z) * z * z, eta, 12, epsabs=1e-13, epsrel=1e-11)[0]
    # The ice itself is at the melting temperature, delta above the far water.
    assert gained == pytest.approx((1 - delta) * eta**3 / 3, rel=1e-8)


def test_corner_has_the_diagonal_of_the_published_constants():
    """Constants from memory; 0.8956 was met within 0.3 % by an independent enthalpy run."""
    assert corner_diagonal() == pytest.approx(0.89562086, rel=1e-7)
    assert corner_front(corner_diagonal()) == pytest.approx(corner_diagonal(), rel=1e-12)
    assert corner_front([0.8, 1.0, 1.5]) == pytest.approx([1.0431821, 0.8199972, 0.7238971], rel=1e-6)


def test_corner_far_from_one_wall_is_the_plane_front_of_the_other():
    lam = float(corner_front(50.0))
    assert lam == pytest.approx(0.70766, rel=1e-6)
    # Two-phase, equal properties: L / (c dT) = 0.25, superheat 0.3 of the step.
    balance = exp(-(lam**2)) * (1 / erf(lam) - 0.3 / erfc(lam))
    assert balance == pytest.approx(sqrt(pi) * lam * 0.25, abs=1e-5)


def test_recalescence_has_the_digits_computed_elsewhere():
    # With a constant heat capacity: 4.2 kJ/kg/K against 334 kJ/kg.
    found = [recalescence(4200, d, 334e3) for d in (2, 5, 10, 20)]
    assert found == pytest.approx([0.025150, 0.062874, 0.125749, 0.251497], abs=6e-7)


@pytest.mark.parametrize(("shape", "delta"), [("cube", 0.1), ("plane", 0.0), ("plane", 1.0), ("sphere", nan)])
def test_frank_refuses_what_does_not_grow(shape, delta):
    with pytest.raises(ValueError, match=r"shape|supercooling"):
        frank_root(shape, delta)


def test_frank_says_when_it_is_asked_too_near_its_end():
    with pytest.raises(ValueError, match="too near"):
        frank_root("sphere", 0.9999)


def test_corner_and_recalescence_refuse_what_is_not_there():
    with pytest.raises(ValueError, match="lambda"):
        corner_front(np.array([1.0, 0.7]))
    with pytest.raises(ValueError, match="above 0"):
        recalescence(4200, 0.0, 334e3)
    with pytest.raises(ValueError, match="all freezes"):
        recalescence(4200, 80.0, 334e3)
