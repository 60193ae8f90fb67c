from __future__ import annotations

import numpy as np
import pytest
from pydantic import ValidationError

from fem.case.wording import notes
from fem.material import MATERIALS, Material, Plain

STEEL = {"density": "7900 kg/m3", "heat_capacity": "480 J/kg/K", "conductivity": "16 W/m/K"}


def plain(**keys: object) -> Material:
    return Plain.model_validate(STEEL | keys).build()


def against(unit: str, T: list[float], values: list[float]) -> dict[str, object]:
    return {"temperature": {"unit": "degC", "values": T}, "value": {"unit": unit, "values": values}}


def test_constants_are_constant() -> None:
    material = plain()
    T = np.array([-60.0, 0.0, 30.0])
    np.testing.assert_allclose(material.curve.enthalpy(T), 7900 * 480 * T, atol=1e-6)
    np.testing.assert_allclose(material.curve.kirchhoff(T), 16 * T, atol=1e-9)
    assert not material.freezes
    assert material.freezing_point is None
    assert material.has_ice
    np.testing.assert_array_equal(material.ice(T), 0.0)
    assert material.freezable == material.latent_heat() == 0.0


def test_lists_are_straight_between_and_held_beyond() -> None:
    material = plain(
        heat_capacity=against("kJ/kg/K", [-40, 20], [0.4, 0.52]),
        conductivity=against("W/m/K", [-50, -10, 30], [14, 15, 17]),
    )
    T = np.array([-80.0, -45.0, -20.0, 0.0, 25.0, 70.0])
    np.testing.assert_allclose(
        material.curve.capacity(T) / 7900, np.interp(T, [-40, 20], [400.0, 520.0]), rtol=1e-12
    )
    np.testing.assert_allclose(
        material.curve.conductivity(T), np.interp(T, [-50, -10, 30], [14.0, 15.0, 17.0]), rtol=1e-12
    )
    assert material.curve.enthalpy(0.0) == pytest.approx(0.0, abs=1e-6)
    # c runs from 400 to 520 J/kg/K over 60 K: 460 on the mean.
    assert material.heat(20.0, -40.0) == pytest.approx(7900 * 460 * 60, rel=1e-12)
    assert material.range == (-40.0, 20.0)


def test_a_value_may_stand_beside_a_list() -> None:
    material = plain(conductivity=against("W/m/K", [-50, 30], [14, 16]))
    assert material.curve.conductivity(-10.0) == pytest.approx(15.0)
    assert material.curve.capacity(-10.0) == pytest.approx(7900 * 480)


@pytest.mark.parametrize(
    ("keys", "place", "said"),
    [
        ({"heat_capacity": "480 J/kg"}, ("heat_capacity",), "no unit of heat capacity"),
        ({"heat_capacity": 480}, ("heat_capacity",), "a bare number"),
        ({"conductivity": "-1 W/m/K"}, ("conductivity",), "above 0"),
        ({"conductivity": against("W/m/K", [0, 1], [1])}, ("conductivity", "value"), "has 1 values"),
        ({"conductivity": against("W/m", [0, 1], [1, 2])}, ("conductivity", "value"), "no unit of cond"),
        ({"conductivity": against("W/m/K", [1, 0], [1, 2])}, ("conductivity", "temperature"), "must rise"),
        ({"conductivity": {"value": against("W/m/K", [1], [1])["value"]}}, ("conductivity", "temperature"),
         "is missing"),
    ],
)  # fmt: skip
def test_mistakes_are_put_at_their_key(keys: dict[str, object], place: tuple[str, ...], said: str) -> None:
    with pytest.raises(ValidationError) as caught:
        plain(**keys)
    (note,) = notes(caught.value, Plain, ())
    assert note.path == place
    assert said in note.message


def test_every_kind_names_itself() -> None:
    for word, model in MATERIALS.items():
        assert model.model_fields["kind"].default == word
