"""Quantities: number and unit in, SI and degC out; anything else is said with its remedy."""

from __future__ import annotations

import contextlib
from typing import Any

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from pydantic_core import PydanticCustomError

from fem.quantity import (
    COEFFICIENT,
    CONDUCTIVITY,
    COORDINATE,
    DENSITY,
    DIFFERENCE,
    DURATION,
    EMISSIVITY,
    FACTOR,
    FLUX,
    HEAT_CAPACITY,
    LATENT_HEAT,
    LENGTH,
    MOMENT,
    SHARE,
    TEMPERATURE,
    Kind,
    converter,
)


@pytest.mark.parametrize(
    ("kind", "text", "value"),
    [
        (LENGTH, "22 mm", 0.022),
        (LENGTH, "2.2cm", 0.022),
        (LENGTH, "1 inch", 0.0254),
        (LENGTH, "80 um", 80e-6),
        (COORDINATE, "-11 mm", -0.011),
        (COORDINATE, "\N{MINUS SIGN}11 mm", -0.011),
        (DURATION, "20 min", 1200.0),
        (DURATION, "1.5 h", 5400.0),
        (MOMENT, "0 s", 0.0),
        (TEMPERATURE, "-22 degC", -22.0),
        (TEMPERATURE, "-22 °C", -22.0),
        (TEMPERATURE, "273.15 K", 0.0),
        (TEMPERATURE, "14 degF", -10.0),
        (DIFFERENCE, "2 K", 2.0),
        (DENSITY, "1075 kg/m3", 1075.0),
        (DENSITY, "1.075 kg/L", 1075.0),
        (DENSITY, "1.075 g/cm³", 1075.0),
        (HEAT_CAPACITY, "3.75 kJ/kg/K", 3750.0),
        (HEAT_CAPACITY, "3.75 kJ/(kg K)", 3750.0),
        (HEAT_CAPACITY, "3.75 kJ/kg/degC", 3750.0),
        (CONDUCTIVITY, "16 W/m/K", 16.0),
        (CONDUCTIVITY, "16 W/(m*K)", 16.0),
        (COEFFICIENT, "250 W/m2/K", 250.0),
        (COEFFICIENT, "250 W/m^2/K", 250.0),
        (COEFFICIENT, "250 W/m²/K", 250.0),
        (COEFFICIENT, "300 W/m2/degC", 300.0),
        (COEFFICIENT, "180 W/m2/degF", 324.0),
        (COEFFICIENT, "2.5e2 W/m2/K", 250.0),
        (FLUX, "-0.5 kW/m2", -500.0),
        (LATENT_HEAT, "334 kJ/kg", 334e3),
        (SHARE, "18 %", 18.0),
        (SHARE, "0 %", 0.0),
        (FACTOR, "1.1", 1.1),
        (FACTOR, 1.1, 1.1),
        (EMISSIVITY, "0.9", 0.9),
        (EMISSIVITY, "90 %", 0.9),
    ],
)
def test_a_quantity_comes_out_in_its_unit(kind: Kind, text: Any, value: float) -> None:
    assert kind.read(text) == pytest.approx(value, rel=1e-12, abs=1e-12)


@pytest.mark.parametrize(
    ("kind", "raw", "words"),
    [
        (LENGTH, "22", 'has no unit; a length is written like "22 mm"'),
        (LENGTH, 22, "a bare number (22) has no unit"),
        (LENGTH, 0.022, "a bare number (0.022) has no unit"),
        (LENGTH, "22 mm mm", "no unit of length"),
        (LENGTH, "22 kg", '"kg" is no unit of length'),
        (LENGTH, "22 blub", '"blub" is no unit that is known here'),
        (LENGTH, "22 __import__('os')", "is no unit that is known here"),
        (LENGTH, "2 2 mm", "is no unit"),
        (LENGTH, "mm", "cannot be read as a length"),
        (LENGTH, "", "cannot be read as a length"),
        (LENGTH, "22,5 mm", "decimal sign as a point"),
        (LENGTH, "1.2.3 mm", "cannot be read"),
        (LENGTH, "0 mm", "must be above 0, got 0 mm"),
        (LENGTH, "-1 mm", "must be above 0, got -1 mm"),
        (LENGTH, "1 km", "must be at most 100 m, got 1 km"),
        (LENGTH, "nan mm", "not a finite number"),
        (LENGTH, "inf mm", "not a finite number"),
        (LENGTH, "1e999 mm", "not a finite number"),
        (DURATION, "1e308 h", "not a finite number"),
        (COEFFICIENT, "250 W/m2/K)", "no unit that is known here"),
        (COEFFICIENT, "250 W/", "no unit that is known here"),
        (COEFFICIENT, "250 W/m/0", "no unit that is known here"),
        (COEFFICIENT, "250 9**9**9**9", "no unit that is known here"),
        (LENGTH, True, "must be a length with its unit"),
        (LENGTH, None, "must be a length with its unit"),
        (LENGTH, ["22 mm"], "must be a length with its unit"),
        (LENGTH, float("nan"), "bare number"),
        (MOMENT, "-1 s", "at least 0"),
        (TEMPERATURE, "-22", 'has no unit; a temperature is written like "-22 degC"'),
        (TEMPERATURE, "-22 C", "no unit of temperature"),
        (TEMPERATURE, "-22 mm", "no unit of temperature"),
        (TEMPERATURE, "-300 degC", "at least -273.1"),
        (TEMPERATURE, "2000 degC", "at most 1000 degC"),
        (DIFFERENCE, "2 degC", "reads as a temperature, not as a difference"),
        (COEFFICIENT, "250 W/m2", "no unit of heat transfer coefficient"),
        (COEFFICIENT, "-35 W/m2/K", "must be above 0, got -35 W/m2/K"),
        (SHARE, 0.18, 'a bare number (0.18) has no unit; write it as text, such as "18 %"'),
        (SHARE, 180, "a bare number (180)"),
        (SHARE, "180 %", "must be at most 100 %, got 180 %"),
        (SHARE, "-1 %", "at least 0"),
        (EMISSIVITY, "1.5", "at most 1, got 1.5"),
        (FACTOR, float("inf"), "bare number (inf)"),
        (FACTOR, "3 kg", "no unit of factor"),
    ],
)
def test_what_is_no_such_quantity_is_said_with_the_remedy(kind: Kind, raw: Any, words: str) -> None:
    with pytest.raises(PydanticCustomError) as caught:
        kind.read(raw)
    assert words in caught.value.message()


def test_a_column_is_converted_at_once() -> None:
    values = np.array([32.0, 14.0])
    convert: Any = converter("degF", TEMPERATURE)
    np.testing.assert_allclose(convert(values), [0.0, -10.0], atol=1e-12)


@given(st.floats(-200.0, 900.0))
def test_scales_of_temperature_agree(T: float) -> None:
    assert TEMPERATURE.read(f"{T + 273.15!r} K") == pytest.approx(T, abs=1e-9)
    assert TEMPERATURE.read(f"{T * 1.8 + 32.0!r} degF") == pytest.approx(T, abs=1e-9)


@given(st.text(max_size=12))
def test_any_text_is_read_or_refused_in_words(text: str) -> None:
    for kind in (LENGTH, TEMPERATURE, FACTOR):
        with contextlib.suppress(PydanticCustomError):
            assert np.isfinite(kind.read(text))


@given(st.from_regex(r"[0-9]{1,3} ?[a-zA-Z%/()*. 0-9^-]{0,8}", fullmatch=True))
def test_any_unit_is_read_or_refused_in_words(text: str) -> None:
    with contextlib.suppress(PydanticCustomError):
        assert COEFFICIENT.read(text) > 0.0
