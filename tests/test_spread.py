from __future__ import annotations

import numpy as np
import pytest

from fem.case.shift import Spread
from fem.sensitivity import Input
from fem.spread import Bend, bends_of, name_of, range_of, ranking, words

H = Input("stages.freeze.surfaces.outside.h", Spread(0.3, relative=True))
COOLANT = Input("stages.freeze.surfaces.outside.coolant", Spread(1.5, relative=False))
THICKNESS = Input("shape.thickness", Spread(0.5e-3, relative=False))


def test_one_straight_input_gives_its_own_half_width() -> None:
    spread = range_of(1000.0, np.array([80.0]), [Bend()])
    assert spread.low == pytest.approx(920.0, abs=2.0)
    assert spread.high == pytest.approx(1080.0, abs=2.0)


def test_independent_inputs_add_in_quadrature() -> None:
    spread = range_of(1000.0, np.array([30.0, -40.0]), [Bend(), Bend()])
    assert (spread.high - spread.low) / 2 == pytest.approx(50.0, rel=0.02)


def test_an_inverse_effect_is_exact_where_the_time_is_planks() -> None:
    # t = 400 + 600 / (h / h0): the bend has to give it back for any h.
    bend = Bend(0.3)
    slope = -600.0 * 0.3
    for by in (-1.0, -0.5, 0.7, 1.0):
        assert bend.effect(slope, np.array(by)) == pytest.approx(600.0 / (1 + 0.3 * by) - 600.0, rel=1e-12)


def test_a_warmer_coolant_bends_upwards() -> None:
    (bend,) = bends_of([COOLANT], [-22.0], -1.27)
    drive = 20.73
    for by in (-1.0, 1.0):
        exact = 1000.0 * (drive / (drive - 1.5 * by) - 1.0)
        assert bend.effect(1000.0 * 1.5 / drive, np.array(by)) == pytest.approx(exact, rel=1e-12)


def test_the_range_is_the_same_in_every_run() -> None:
    assert range_of(10.0, np.array([1.0]), [Bend()]) == range_of(10.0, np.array([1.0]), [Bend()])


def test_the_most_important_input_stands_first_whatever_its_sign() -> None:
    rows = ranking([THICKNESS, H], np.array([30.0, -158.0]), [Bend(), Bend(0.3)], [0.022, 250.0])
    assert [row["name"] for row in rows] == ["agitation", "thickness"]


@pytest.mark.parametrize(
    ("entry", "slope", "said"),
    [
        (H, -158.0, "10 % more agitation buys 53 s"),
        (COOLANT, 86.0, "1 K colder coolant buys 57 s"),
        (THICKNESS, 30.0, "1 mm more thickness costs 60 s"),
        (H, -0.03, "10 % of agitation hardly matter"),
    ],
)
def test_plain_words(entry: Input, slope: float, said: str) -> None:
    assert words(entry, slope, name_of(entry.key)) == said


def test_what_moves_h_depends_on_its_size() -> None:
    assert name_of(H.key, 250.0) == "agitation"
    assert name_of(H.key, 30.0) == "air speed"
