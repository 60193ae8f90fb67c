from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from pydantic import ValidationError

from fem.case.wording import notes
from fem.material import Material, Table

ROWS = {
    "density": "1080 kg/m3",
    "freezing_point": "-1.6 degC",
    "temperature": {"unit": "degC", "values": [-30, -10, -1.600001, -1.6, 20]},
    "enthalpy": {"unit": "kJ/kg", "values": [-300, -240, -150, -6, 72]},
    "conductivity": {"unit": "W/m/K", "values": [1.9, 1.7, 1.2, 0.5, 0.55]},
    "ice": {"unit": "%", "values": [75, 70, 40, 0, 0]},
}


def table(**keys: object) -> Material:
    rows = {name: value for name, value in (ROWS | keys).items() if value is not None}
    return Table.model_validate(rows).build()


def column(unit: str, *values: float) -> dict[str, object]:
    return {"unit": unit, "values": list(values)}


def test_rows_come_out_as_they_went_in() -> None:
    material = table()
    np.testing.assert_array_equal(material.curve.T, ROWS["temperature"]["values"])
    np.testing.assert_allclose(material.curve.H, 1080e3 * np.array(ROWS["enthalpy"]["values"]), rtol=1e-14)
    np.testing.assert_allclose(
        material.curve.conductivity(material.curve.T), ROWS["conductivity"]["values"], rtol=1e-14
    )
    np.testing.assert_allclose(material.ice([-40.0, -20.0, -1.0]), [0.75, 0.725, 0.0])
    assert material.range == (-30.0, 20.0)
    assert material.front_enthalpy() == pytest.approx(-6 * 1080e3)


def test_it_goes_on_with_its_end_slopes_and_holds_its_conductivity() -> None:
    curve = table().curve
    assert curve.enthalpy(-50.0) / 1080e3 == pytest.approx(-360.0)
    assert curve.enthalpy(40.0) / 1080e3 == pytest.approx(72 + 20 * 78 / 21.6)
    np.testing.assert_array_equal(curve.conductivity([-90.0, 60.0]), [1.9, 0.55])


def test_enthalpy_per_volume_and_other_units_mean_the_same() -> None:
    mass = table(density="1000 kg/m3")
    volume = table(
        density="1000 kg/m3",
        temperature=column("K", *(273.15 + np.array(ROWS["temperature"]["values"]))),
        enthalpy=column("MJ/m3", *ROWS["enthalpy"]["values"]),
        ice=column("kg/kg", 0.75, 0.7, 0.4, 0, 0),
    )
    np.testing.assert_allclose(volume.curve.H, mass.curve.H, rtol=1e-13)
    np.testing.assert_allclose(volume.curve.T, mass.curve.T, atol=1e-12)
    assert np.diff(volume.curve.T)[2] == pytest.approx(1e-6, rel=1e-6)
    np.testing.assert_allclose(volume.ice([-20.0]), mass.ice([-20.0]))


def test_without_a_column_of_ice_it_does_not_pretend_to_know() -> None:
    material = table(ice=None)
    assert not material.has_ice
    assert np.all(np.isnan(material.ice([-20.0, 5.0])))
    assert table().has_ice


def test_latent_heat_is_what_sensible_heat_does_not_explain() -> None:
    # Frozen slope 3 kJ/kg/K between -30 and -10 degC: 294 - 3 * 28.4 kJ/kg down to -30 degC.
    assert table().latent_heat() / 1080e3 == pytest.approx(294 - 3 * 28.4)
    assert np.isnan(table(freezing_point=None).latent_heat())
    assert table(freezing_point=None).front_enthalpy() is None


def test_a_file_is_read_beside_the_case(tmp_path: Path) -> None:
    (tmp_path / "mix.csv").write_text(
        "temperature [degC], enthalpy [kJ/kg], conductivity [W/m/K], ice [%]\n"
        "-30, -300, 1.9, 75\n-10, -240, 1.7, 70\n-1.600001, -150, 1.2, 40\n-1.6, -6, 0.5, 0\n"
        "20, 72, 0.55, 0\n"
    )
    raw = {"density": "1080 kg/m3", "freezing_point": "-1.6 degC", "file": "mix.csv"}
    material = Table.model_validate(raw, context={"folder": tmp_path}).build()
    np.testing.assert_array_equal(material.curve.T, table().curve.T)
    np.testing.assert_array_equal(material.curve.H, table().curve.H)
    assert material.ice(-20.0) == pytest.approx(0.725)


@pytest.mark.parametrize(
    ("text", "said"),
    [
        (None, "cannot read"),
        ("temperature [degC],enthalpy [kJ/kg],conductivity [W/m/K],ise [%]\n0,0,1,0\n", 'mean "ice"?'),
        ("temperature [degC],enthalpy [kJ/kg]\n0,0\n", 'no column "conductivity"'),
        ("temperature [degC],enthalpy [kJ/kg],conductivity [W/m]\n0,0,1\n", "mix.csv, conductivity:"),
        ("temperature [degC],enthalpy [kJ/kg],conductivity [W/m/K]\n0,0,1\n", "two at least"),
        ("temperature [degC],enthalpy [kJ/kg],conductivity [W/m/K]\n0,0,1\n-1,2,1\n", "row 2 is -1 degC"),
        ("temperature [degC],enthalpy [kJ/kg],conductivity [W/m/K]\n0,0,1\n1,x,1\n", 'line 3, enthalpy: "x"'),
        ("temperature [degC],enthalpy [kJ/kg],conductivity [W/m/K]\n0,0,1\n1,inf,1\n", "not a finite number"),
    ],
)
def test_a_file_that_cannot_be_used_is_refused_at_its_key(
    tmp_path: Path, text: str | None, said: str
) -> None:
    if text is not None:
        (tmp_path / "mix.csv").write_text(text)
    with pytest.raises(ValidationError) as caught:
        Table.model_validate({"density": "1080 kg/m3", "file": "mix.csv"}, context={"folder": tmp_path})
    (error,) = caught.value.errors()
    assert error["loc"] == ("file",)
    assert said in error["msg"]


@pytest.mark.parametrize(
    ("keys", "place", "said"),
    [
        ({"temperature": column("degC", -30, -10, -10, -1.6, 20)}, ("temperature",),
         "row 3 is -10 degC, row 2 is -10 degC"),
        ({"enthalpy": column("kJ/kg", -300, -240, -150, -160, 72)}, ("enthalpy",),
         "row 4 is -160 kJ/kg, row 3 is -150 kJ/kg"),
        ({"conductivity": column("W/m/K", 1, 1, 1)}, ("conductivity",), "has 3 values, but temp"),
        ({"conductivity": column("W/m/K", 1, 1, 0, 1, 1)}, ("conductivity",), "row 3: must be above 0"),
        ({"enthalpy": column("kJ/kg", -300, -240, float("nan"), -6, 72)}, ("enthalpy", "values"),
         "row 3: nan is not a finite number"),
        ({"enthalpy": column("kJ", *ROWS["enthalpy"]["values"])}, ("enthalpy",), "no unit of specific"),
        ({"enthalpy": column("", *ROWS["enthalpy"]["values"])}, ("enthalpy",), "has no unit"),
        ({"ice": column("%", 75, 101, 40, 0, 0)}, ("ice",), "row 2: must be at most 100 %"),
        ({"ice": column("%", 75, 70, 40, 0, -1)}, ("ice",), "row 5: must be at least 0 %"),
        ({"freezing_point": "-40 degC"}, ("freezing_point",), "outside the rows"),
        ({"conductivity": None}, (), "conductivity not given"),
        ({"temperature": column("degC", 1), "enthalpy": column("kJ/kg", 1),
          "conductivity": column("W/m/K", 1), "ice": None, "freezing_point": None},
         ("temperature",), "two at least"),
    ],
)  # fmt: skip
def test_rows_that_cannot_be_right_are_refused(
    keys: dict[str, object], place: tuple[str, ...], said: str
) -> None:
    with pytest.raises(ValidationError) as caught:
        table(**keys)
    (note,) = notes(caught.value, Table, ())
    assert note.path == place
    assert said in note.message


def test_a_file_beside_lists_is_refused(tmp_path: Path) -> None:
    (tmp_path / "mix.csv").write_text(
        "temperature [degC],enthalpy [kJ/kg],conductivity [W/m/K]\n0,0,1\n1,2,1\n"
    )
    with pytest.raises(ValidationError) as caught:
        Table.model_validate(ROWS | {"file": "mix.csv"}, context={"folder": tmp_path})
    (note,) = notes(caught.value, Table, ())
    assert note.path == ("file",)
    assert "not both" in note.message


@st.composite
def tables(draw: st.DrawFn) -> Material:
    count = draw(st.integers(2, 8))
    steps = [draw(st.sampled_from([1e-6, 1e-3, 0.1, 3.0])) for _ in range(count - 1)]
    rises = [draw(st.floats(1.0, 300.0)) for _ in range(count - 1)]
    T = -30.0 + np.concatenate([[0.0], np.cumsum(steps)])
    H = -400.0 + np.concatenate([[0.0], np.cumsum(rises)])
    k = [draw(st.floats(0.2, 2.5)) for _ in range(count)]
    rows = {"temperature": column("degC", *T), "enthalpy": column("kJ/kg", *H)}
    return table(**rows, conductivity=column("W/m/K", *k), ice=None, freezing_point=None)


@settings(max_examples=60, deadline=None)
@given(tables(), st.lists(st.floats(-0.2, 1.2), min_size=1, max_size=12))
def test_every_table_is_sound(material: Material, places: list[float]) -> None:
    curve = material.curve
    T = curve.T[0] + np.array(places) * (curve.T[-1] - curve.T[0])
    np.testing.assert_allclose(curve.temperature(curve.enthalpy(T)), T, rtol=0, atol=1e-9)
    H = curve.H[0] + np.array(places) * (curve.H[-1] - curve.H[0])
    at = curve.at(np.sort(H))
    assert np.all(np.diff(at.temperature) >= 0.0)
    assert np.all(np.diff(at.kirchhoff) >= 0.0)
    # Across each row pair the integral of k is the trapezoid of what was typed, however thin.
    k = curve.conductivity(curve.T)
    np.testing.assert_allclose(
        np.diff(curve.theta), np.diff(curve.T) * (k[:-1] + k[1:]) / 2, rtol=1e-7, atol=1e-13
    )
