from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from pydantic import ValidationError

from fem.case.wording import notes
from fem.material import Material, Melting

WATER = {
    "kind": "melting",
    "melting_point": "0 degC",
    "latent_heat": "334 kJ/kg",
    "density": "1000 kg/m3",
    "solid": {"conductivity": "2.2 W/m/K", "heat_capacity": "2050 J/kg/K"},
    "liquid": {"conductivity": "0.56 W/m/K", "heat_capacity": "4200 J/kg/K"},
}


def water(**keys: object) -> Material:
    return Melting.model_validate(WATER | keys).build()


def test_latent_heat_is_what_is_stated() -> None:
    for width in (1e-6, 1e-3, 0.5):
        material = water(melting_range=f"{width} K")
        low, high = -width / 2, width / 2
        rise = float(material.curve.enthalpy(high) - material.curve.enthalpy(low))
        sensible = 1000 * (2050 + 4200) / 2 * width
        assert rise - sensible == pytest.approx(334e6, rel=1e-9)
        assert material.latent_heat() == material.latent_heat(-5.0) == 334e6


def test_either_side_is_constant() -> None:
    material = water(melting_point="-3 degC")
    for T, c, k in ((-150.0, 2050.0, 2.2), (-5.0, 2050.0, 2.2), (0.0, 4200.0, 0.56), (150.0, 4200.0, 0.56)):
        assert material.curve.capacity(T) / 1000.0 == pytest.approx(c, rel=1e-9)
        assert material.curve.conductivity(T) == pytest.approx(k, rel=1e-12)
    assert material.curve.enthalpy(0.0) == pytest.approx(0.0, abs=1e-6)
    assert material.heat(7.0, -23.0) == pytest.approx(334e6 + 4.2e6 * 10 + 2.05e6 * 20, rel=1e-6)


def test_ice_goes_with_the_enthalpy() -> None:
    material = water(melting_range="2 K")
    T = np.array([-5.0, -1.0, -0.5, 0.0, 0.5, 1.0, 5.0])
    np.testing.assert_allclose(material.ice(T), [1.0, 1.0, 0.75, 0.5, 0.25, 0.0, 0.0])
    assert material.freezable == 1.0
    front = material.front_enthalpy()
    top, bottom = (float(material.curve.enthalpy(T)) for T in (1.0, -1.0))
    assert front == pytest.approx((top + bottom) / 2, rel=1e-12)


def test_a_start_at_the_melting_point_is_liquid() -> None:
    for width in (1e-6, 1e-3, 2.0):
        material = water(melting_point="-3 degC", melting_range=f"{width} K")
        assert material.start_enthalpy(-3.0) == material.curve.enthalpy(-3.0 + width / 2)
        assert material.ice(material.curve.temperature(material.start_enthalpy(-3.0))) < 1e-6
    assert material.start_enthalpy(-3.5) == material.curve.enthalpy(-3.5)
    assert material.start_enthalpy(-10.0) == material.curve.enthalpy(-10.0)


@given(
    st.floats(-100.0, 80.0),
    st.floats(1e-6, 5.0),
    st.floats(1e4, 4e5),
    st.lists(st.floats(-3.0, 3.0), min_size=1, max_size=10),
)
def test_enthalpy_and_temperature_are_inverse(
    T_m: float, width: float, L: float, offsets: list[float]
) -> None:
    material = water(melting_point=f"{T_m} degC", melting_range=f"{width} K", latent_heat=f"{L} J/kg")
    T = T_m + np.array(offsets) * width
    curve = material.curve
    assert np.all(np.diff(curve.H) > 0.0)
    np.testing.assert_allclose(curve.temperature(curve.enthalpy(T)), T, rtol=0, atol=1e-9)
    H = curve.H[1] + np.linspace(0, 1, 11) * (curve.H[2] - curve.H[1])
    np.testing.assert_allclose(curve.enthalpy(curve.temperature(H)), H, rtol=0, atol=2e-7 * L * 1000)


@pytest.mark.parametrize(
    ("keys", "place", "said"),
    [
        ({"melting_range": "1e-9 K"}, ("melting_range",), "at least 1e-07 K"),
        ({"melting_range": "600 K"}, ("melting_range",), "absolute zero"),
        ({"melting_range": "1 degC"}, ("melting_range",), "not as a difference"),
        ({"latent_heat": "0 J/kg"}, ("latent_heat",), "above 0"),
        ({"solid": {"conductivity": "2 W/m/K"}}, ("solid", "heat_capacity"), "is missing"),
        ({"liquid": WATER["liquid"] | {"density": "1 kg/m3"}}, ("liquid", "density"), 'no key "density"'),
    ],
)
def test_mistakes_are_put_at_their_key(keys: dict[str, object], place: tuple[str, ...], said: str) -> None:
    with pytest.raises(ValidationError) as caught:
        water(**keys)
    (note,) = notes(caught.value, Melting, ())
    assert note.path == place
    assert said in note.message
