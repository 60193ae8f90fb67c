from __future__ import annotations

import time

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from pydantic import ValidationError

from fem.case.wording import notes
from fem.material import Material, Recipe
from fem.material.recipe import SOLIDS, _rows

MIXES = {
    "12 Brix": {"sucrose": 12},
    "15 Brix": {"sucrose": 15},
    "18 Brix": {"sucrose": 18},
    "18 Brix, half invert": {"sucrose": 9, "glucose": 4.5, "fructose": 4.5},
    "22 Brix, 30 % invert": {"sucrose": 15.4, "glucose": 3.3, "fructose": 3.3},
    "28 Brix, half invert": {"sucrose": 14, "glucose": 7, "fructose": 7},
}


def recipe(**keys: object) -> Recipe:
    return Recipe.model_validate({k: v if isinstance(v, str) else f"{v} %" for k, v in keys.items()})


def test_the_published_freezing_point_of_12_percent_sucrose() -> None:
    # -0.77 degC: The Science of Ice Cream, p. 25.
    assert recipe(sucrose=12).build().freezing_point == pytest.approx(-0.77, abs=0.005)


# kJ/kg of mix, computed apart from this code: from +4 degC to -10, -12, -15, -18, -20, -25 degC, and
# from +20 to -18 degC.
HEATS = {
    "12 Brix": (302, 310, 320, 329, 334, 347, 391),
    "15 Brix": (284, 294, 305, 314, 320, 333, 376),
    "18 Brix": (267, 277, 290, 300, 306, 320, 360),
    "18 Brix, half invert": (256, 268, 283, 294, 301, 316, 355),
    "22 Brix, 30 % invert": (236, 249, 264, 277, 284, 300, 335),
    "28 Brix, half invert": (192, 209, 228, 243, 252, 270, 299),
}


@pytest.mark.parametrize("name", list(HEATS))
def test_heat_to_remove(name: str) -> None:
    mix = recipe(**MIXES[name]).build()
    heats = [mix.heat(4.0, T) for T in (-10.0, -12.0, -15.0, -18.0, -20.0, -25.0)] + [mix.heat(20.0, -18.0)]
    np.testing.assert_allclose(np.array(heats) / mix.density / 1e3, HEATS[name], rtol=0.01)


# W/m/K at -5, -10, -20, -30 degC, computed apart from this code; the two have different
# conductivities of the solution, which shows most where it is the continuous phase and cold.
CONDUCTIVITIES = {
    ("12 Brix", "solution continuous"): (1.49, 1.67, 1.80, 1.88),
    ("12 Brix", "levy"): (1.63, 1.83, 1.99, 2.10),
    ("12 Brix", "ice continuous"): (1.74, 1.93, 2.10, 2.22),
    ("18 Brix", "solution continuous"): (1.22, 1.41, 1.55, 1.62),
    ("18 Brix", "levy"): (1.36, 1.59, 1.78, 1.89),
    ("18 Brix", "ice continuous"): (1.49, 1.72, 1.93, 2.06),
    ("28 Brix, half invert", "solution continuous"): (0.70, 0.98, 1.17, 1.24),
    ("28 Brix, half invert", "levy"): (0.76, 1.12, 1.38, 1.51),
    ("28 Brix, half invert", "ice continuous"): (0.84, 1.27, 1.57, 1.73),
}


@pytest.mark.parametrize(("name", "law"), list(CONDUCTIVITIES))
def test_frozen_conductivity(name: str, law: str) -> None:
    curve = recipe(**MIXES[name], conductivity_law=law).build().curve
    k = curve.conductivity(np.array([-5.0, -10.0, -20.0, -30.0]))
    expected = CONDUCTIVITIES[name, law]
    np.testing.assert_allclose(k[:3], expected[:3], rtol=0.04)
    np.testing.assert_allclose(k[3], expected[3], rtol=0.06 if law == "solution continuous" else 0.04)


def test_liquid_properties_at_18_brix() -> None:
    # 0.51 W/m/K and 3.75 kJ/kg/K at 0 degC from fits of Riedel's type, 1073 to 1075 kg/m3 at
    # 20 degC; values from memory.
    mix = recipe(sucrose=18).build()
    assert mix.curve.conductivity(0.0) == pytest.approx(0.51, rel=0.02)
    assert mix.curve.capacity(1.0) / mix.density == pytest.approx(3750.0, rel=0.01)
    assert mix.density == pytest.approx(1074.0, rel=3e-3)


def test_air_takes_mass_and_conductivity() -> None:
    # 25 % overrun on 22 Brix: k(-15) 1.52 to 1.11 W/m/K, density 1093 to 875 kg/m3, computed
    # apart from this code.
    still, whipped = (recipe(**MIXES["22 Brix, 30 % invert"], air=air).build() for air in (0, 20))
    assert whipped.density == pytest.approx(0.8 * still.density, rel=1e-12)
    ratio = whipped.curve.conductivity(-15.0) / still.curve.conductivity(-15.0)
    assert ratio == pytest.approx(1.11 / 1.52, rel=0.01)
    assert whipped.heat(4.0, -18.0) / whipped.density == pytest.approx(still.heat(4.0, -18.0) / still.density)
    np.testing.assert_array_equal(whipped.ice(-10.0), still.ice(-10.0))


def test_a_stated_density_scales_heat_and_nothing_else() -> None:
    computed, stated = recipe(sucrose=18).build(), recipe(sucrose=18, density="1200 kg/m3").build()
    assert stated.density == 1200.0
    assert stated.heat(4.0, -18.0) / 1200.0 == pytest.approx(computed.heat(4.0, -18.0) / computed.density)
    assert stated.curve.conductivity(-10.0) == computed.curve.conductivity(-10.0)
    assert computed.cautions == ()
    (caution,) = stated.cautions
    assert "+12 % off" in caution


def test_a_stated_freezing_point_is_where_ice_begins() -> None:
    for keys in ({"sucrose": "16 %"}, {"protein": "3 %", "fat": "2 %"}):
        mix = recipe(**keys, freezing_point="-1.4 degC").build()
        assert mix.freezing_point == pytest.approx(-1.4, abs=1e-9)
        assert mix.freezing_point in mix.curve.T
        assert mix.ice(-1.4 + 1e-6) == 0.0
        assert mix.ice(-1.41) > 0.004


def test_the_factor_multiplies_the_conductivity_only() -> None:
    one, more = recipe(sucrose=18).build(), recipe(sucrose=18, conductivity_factor="1.1").build()
    T = np.linspace(-50.0, 40.0, 37)
    np.testing.assert_allclose(more.curve.conductivity(T), 1.1 * one.curve.conductivity(T), rtol=1e-12)
    np.testing.assert_array_equal(more.curve.enthalpy(T), one.curve.enthalpy(T))


def test_ice_and_its_heat_end_where_told() -> None:
    mix = recipe(sucrose=18, ice_ends="-30 degC").build()
    assert mix.ice(-70.0) == mix.ice(-30.0) == mix.freezable
    assert -30.0 in mix.curve.T
    below, above = (float(mix.curve.capacity(T)) for T in (-30.01, -29.99))
    # The capacity jumps by the latent heat of the ice that would have gone on forming.
    forming = float(mix.ice(-30.0) - mix.ice(-29.9)) / 0.1
    assert above - below == pytest.approx(mix.density * 261.6e3 * forming, rel=0.05)
    assert below / mix.density == pytest.approx(1900.0, rel=0.05)  # 0.71 ice of 1877 J/kg/K, the rest mixed


def test_heat_is_latent_plus_sensible() -> None:
    # Between the freezing point and -12 degC: latent heat 266 to 333 kJ per kg of ice, and what
    # remains is sensible heat of 2 to 3.8 kJ/kg/K.
    mix = recipe(sucrose=18).build()
    T_f = mix.freezing_point
    assert T_f is not None
    latent = mix.latent_heat(-12.0)
    assert latent == pytest.approx(mix.density * float(mix.ice(-12.0)) * 327e3, rel=0.01)
    sensible = (mix.heat(T_f, -12.0) - latent) / mix.density / (T_f + 12.0)
    assert 2000.0 < sensible < 3800.0
    assert mix.latent_heat() > mix.latent_heat(-25.0) > latent
    assert mix.latent_heat(T_f) == mix.latent_heat(20.0) == 0.0


@pytest.mark.parametrize("keys", [{"sucrose": 0.4}, {"sucrose": 3}, {"sucrose": 18}, {"glucose": 35}])
def test_rows_are_fine_enough(keys: dict[str, float], monkeypatch: pytest.MonkeyPatch) -> None:
    # The same mix on rows 20 times as fine is the reference; between our rows T(H) must not
    # miss it by a thousandth of a kelvin anywhere.
    coarse = recipe(**keys).build().curve
    monkeypatch.setattr(
        "fem.material.recipe._rows", lambda T_f, ends: np.unique(_between(_rows(T_f, ends), 20))
    )
    fine = recipe(**keys).build().curve
    assert len(fine.T) > 15 * len(coarse.T)
    missed = np.abs(coarse.temperature(fine.H) - fine.T)
    assert np.max(missed) < 2e-4
    assert 300 < len(coarse.T) < 2000


def _between(rows: np.ndarray, parts: int) -> np.ndarray:
    return np.interp(np.linspace(0, len(rows) - 1, parts * (len(rows) - 1) + 1), np.arange(len(rows)), rows)


def test_a_recipe_is_built_in_no_time() -> None:
    mix = recipe(sucrose=18, fat=1)
    mix.build()
    start = time.perf_counter()
    mix.build()
    assert time.perf_counter() - start < 0.05


percent = st.floats(0.0, 15.0)


@st.composite
def recipes(draw: st.DrawFn) -> Recipe:
    keys = {name: draw(percent) for name in SOLIDS}
    if keys["sucrose"] + keys["glucose"] + keys["fructose"] < 0.4:
        keys["sucrose"] = 0.4
    keys["air"] = draw(st.floats(0.0, 60.0))
    more: dict[str, object] = {"conductivity_law": draw(st.sampled_from(["levy", "ice continuous"]))}
    if draw(st.booleans()):
        more["freezing_point"] = f"{draw(st.floats(-8.0, -0.05))} degC"
    return recipe(**{name: f"{value} %" for name, value in keys.items()}, **more)


@settings(max_examples=40, deadline=None)
@given(recipes(), st.lists(st.floats(-75.0, 60.0), min_size=2, max_size=20))
def test_every_recipe_is_sound(mix: Recipe, temperatures: list[float]) -> None:
    material = mix.build()
    check_curve(material, np.sort(temperatures))
    T = np.linspace(-60.0, 20.0, 401)
    ice = material.ice(T)
    assert np.all((ice >= 0.0) & (ice <= 1.0))
    assert np.all(np.diff(ice) <= 1e-15)
    assert material.ice(-50.0) > 0.0
    k = material.curve.conductivity(T)
    assert np.all((k > 0.05) & (k < 3.5))


def check_curve(material: Material, T: np.ndarray) -> None:
    curve = material.curve
    assert np.all(np.diff(curve.H) > 0.0)
    assert np.all(np.diff(curve.theta) > 0.0)
    H = curve.enthalpy(T)
    assert np.all(np.diff(H)[np.diff(T) > 1e-9] > 0.0)
    np.testing.assert_allclose(curve.temperature(H), T, atol=1e-9)
    slope = (curve.kirchhoff(T + 5e-6) - curve.kirchhoff(T - 5e-6)) / 1e-5
    np.testing.assert_allclose(slope, curve.conductivity(T), rtol=1e-3)


@settings(max_examples=25, deadline=None)
@given(recipes(), st.floats(-40.0, 30.0))
def test_laws_keep_their_order(mix: Recipe, T: float) -> None:
    low, mid, high = (
        float(mix.model_copy(update={"conductivity_law": law}).build().curve.conductivity(T))
        for law in ("solution continuous", "levy", "ice continuous")
    )
    assert low * (1 - 1e-9) <= mid <= high * (1 + 1e-9)


@pytest.mark.parametrize(
    ("keys", "place", "said"),
    [
        ({"sucrose": "60 %", "fat": "45 %"}, ("sucrose",), "sucrose 60 % + fat 45 % make 105 %"),
        ({"sucrose": "180 %"}, ("sucrose",), "at most 100 %"),
        ({"sucrose": "0.18"}, ("sucrose",), "has no unit"),
        ({"sucrose": 0.18}, ("sucrose",), "a bare number"),
        ({"sucrose": "0.18 %"}, ("sucrose",), 'sucrose = "18 %"?'),
        ({"fat": "3 %"}, (), 'use kind = "melting"'),
        ({"sucrose": "18 %", "freezing_point": "1 degC"}, ("freezing_point",), "below 0 degC"),
        ({"sucrose": "18 %", "freezing_point": "-0.001 degC"}, ("freezing_point",), 'kind = "melting"'),
        ({"sucrose": "18 %", "air": "100 %"}, ("air",), "an overrun of 100 % is 50 % air"),
        ({"sucrose": "80 %"}, ("ice_ends",), "the mix would never freeze"),
        ({"sucrose": "18 %", "freezing_point": "-40 degC"}, ("freezing_point",), "never freeze"),
        ({"sucrose": "18 %", "conductivity_law": "parallel"}, ("conductivity_law",), "there is: levy"),
        ({"sucrose": "18 %", "sucros": "1 %"}, ("sucros",), 'did you mean "sucrose"?'),
    ],
)
def test_what_cannot_be_a_mix_is_refused_at_its_key(
    keys: dict[str, object], place: tuple[str, ...], said: str
) -> None:
    with pytest.raises(ValidationError) as caught:
        Recipe.model_validate(keys)
    (note,) = notes(caught.value, Recipe, ())
    assert note.path == place
    assert said in note.message


def test_a_mistake_keeps_the_place_of_the_table_around_it() -> None:
    with pytest.raises(ValidationError) as caught:
        Recipe.model_validate({"sucrose": "0.18 %"})
    (note,) = notes(caught.value, Recipe, ("materials", "mix"))
    assert note.path == ("materials", "mix", "sucrose")


def test_more_sugar_than_the_handbook_is_a_caution() -> None:
    assert "up to 42 %" in recipe(sucrose=50).build().cautions[0]
