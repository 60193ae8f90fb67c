"""Exchanges: flux out of the product, and its slope as the difference quotient has it."""

from __future__ import annotations

from typing import Annotated, Literal

import numpy as np
import pytest
from pydantic import ValidationError

from fem.curve import Array
from fem.heat.exchange import EXCHANGES, STEFAN_BOLTZMANN, Exchange, Fixed, Fluid, Flux, Insulated, Radiant
from fem.quantity import TEMPERATURE
from fem.signal import Signal, signal

T = np.array([[-40.0, -12.0, 0.0], [4.0, 20.0, 80.0]])
RAMP = {"time": {"unit": "s", "values": [0, 100]}, "value": {"unit": "degC", "values": [-20, -30]}}

EXAMPLES = {
    "fluid": Fluid(h="250 W/m2/K", coolant=RAMP),
    "flux": Flux(flux="500 W/m2"),
    "radiant": Radiant(emissivity="0.9", surroundings="-20 degC"),
    "radiant with air": Radiant(emissivity="0.9", surroundings="-20 degC", h="5 W/m2/K", air="-18 degC"),
    "insulated": Insulated(),
}


@pytest.mark.parametrize("name", EXAMPLES)
def test_the_slope_is_that_of_the_flux(name: str) -> None:
    flux, slope = EXAMPLES[name].flux(T, 30.0)
    assert flux.shape == slope.shape == T.shape
    up, down = (EXAMPLES[name].flux(T + d, 30.0)[0] for d in (1e-3, -1e-3))
    np.testing.assert_allclose(slope, (up - down) / 2e-3, rtol=1e-6, atol=1e-6)


def test_heat_that_leaves_the_product_is_positive() -> None:
    fluid = Fluid(h="250 W/m2/K", coolant=RAMP)
    flux, slope = fluid.flux(np.array([5.0]), 50.0)
    assert flux == pytest.approx([250.0 * 30.0])
    assert slope == pytest.approx([250.0])
    assert (fluid.environment(50.0), fluid.coefficient(50.0)) == pytest.approx((-25.0, 250.0))
    np.testing.assert_array_equal(fluid.knots(), [0.0, 100.0])


def test_a_fixed_surface_is_imposed() -> None:
    fixed = Fixed(temperature=RAMP)
    assert fixed.surface_temperature(1e3) == fixed.environment(1e3) == -30.0
    with pytest.raises(TypeError, match="surface_temperature"):
        fixed.flux(T, 0.0)


def test_radiation_follows_the_fourth_power_in_kelvin() -> None:
    flux, _ = Radiant(emissivity="0.5", surroundings="0 K").flux(np.array([26.85]), 0.0)
    assert flux == pytest.approx([0.5 * STEFAN_BOLTZMANN * 300.0**4], rel=1e-12)


def test_radiation_and_air_drive_to_the_temperature_where_they_balance() -> None:
    both = Radiant(emissivity="0.9", surroundings="20 degC", h="5 W/m2/K", air="-30 degC")
    balance = both.environment(0.0)
    assert -30.0 < balance < 20.0
    flux, slope = both.flux(np.array(balance), 0.0)
    assert abs(float(flux)) < 1e-9
    assert both.coefficient(0.0) == pytest.approx(float(slope))


def test_an_exchange_without_an_environment_says_so() -> None:
    for exchange in (Insulated(), Flux(flux="3 W/m2")):
        assert exchange.environment(0.0) is None
        assert exchange.coefficient(0.0) is None
        assert len(exchange.knots()) == 0


@pytest.mark.parametrize("only", [{"h": "5 W/m2/K"}, {"air": "-18 degC"}])
def test_air_and_its_coefficient_come_together(only: dict[str, str]) -> None:
    with pytest.raises(ValidationError, match="is missing"):
        Radiant(emissivity="0.9", surroundings="-20 degC", **only)


@pytest.mark.parametrize("emissivity", ["0", "1.1", "-0.5", "nan"])
def test_emissivity_lies_between_0_and_1(emissivity: str) -> None:
    with pytest.raises(ValidationError):
        Radiant(emissivity=emissivity, surroundings="-20 degC")


@pytest.mark.parametrize(
    ("h", "coolant", "words"),
    [
        ("250 W/m2/K", "-22 degC", []),
        ("7 W/m2/K", "-18 degC", []),
        ("1500 W/m2/K", "20 degC", []),
        ("5000 W/m2/K", "-22 degC", ["h = 5000 W/m2/K"]),
        ("1 W/m2/K", "-22 degC", ["h = 1 W/m2/K"]),
        ("250 W/m2/K", "-190 degC", ["coolant = -190 degC"]),
        ("2 W/m2/K", "90 degC", ["h = 2 W/m2/K", "coolant = 90 degC"]),
    ],
)
def test_values_far_outside_the_trade_are_cautioned(h: str, coolant: str, words: list[str]) -> None:
    cautions = Fluid(h=h, coolant=coolant).cautions()
    assert len(cautions) == len(words)
    for caution, word in zip(cautions, words, strict=True):
        assert word in caution


def test_the_words_of_the_case_are_those_of_the_classes() -> None:
    assert {name: kind.model_fields["exchange"].default for name, kind in EXCHANGES.items()} == {
        name: name for name in EXCHANGES
    }


def test_a_new_exchange_is_fields_and_flux() -> None:
    class Spray(Exchange):
        exchange: Literal["spray"] = "spray"
        water: Annotated[Signal, signal(TEMPERATURE)]

        def flux(self, T: Array, clock: float) -> tuple[Array, Array]:
            return 800.0 * (T - self.water.at(clock)), np.full_like(T, 800.0)

    spray = Spray(water=RAMP)
    assert float(spray.flux(np.array(0.0), 0.0)[0]) == 16000.0
    np.testing.assert_array_equal(spray.knots(), [0.0, 100.0])
    assert spray.cautions() == []
