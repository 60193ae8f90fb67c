"""Exact answers that the whole program is judged by: each a case through the same `run`."""

from __future__ import annotations

from fem.series.truth.axisymmetric import cylinder, line_sink
from fem.series.truth.limits import square, squat
from fem.series.truth.plane import neumann, recipe, three_zones
from fem.series.truth.texts import DEPTH, WIDE, WIDE_WITH_JUMP

CHECKS = (
    neumann(-20.0, 5.0, DEPTH),
    neumann(-20.0, 0.0, 0.02),
    three_zones("three zones", WIDE),
    three_zones("three zones, part of the heat at the solidus", WIDE_WITH_JUMP),
    recipe(),
    cylinder(0.2),
    line_sink(),
    square(),
    squat(),
)
