"""Cases with exact answers, written as a user writes them, and run as any other."""

from __future__ import annotations

from functools import cache

from fem.case.read import loads
from fem.curve import Array
from fem.exact import RangeFreezing, SharpFreezing
from fem.result.folder import Result
from fem.run import run
from fem.series.verdict import Sample

# A front is judged once it is this deep: before, it has crossed only a few cells.
DEEP = 5e-3
# Temperatures are judged where the front is at least this far away [m].
AWAY = 1e-3
# Of the wall cases: the far end lies beyond 6 sqrt(alpha t) of the liquid.
LASTS, DEPTH = 400.0, 0.05
DEPTHS = (2, 5, 10, 20)
# Orders to demand: theory says 1 for a front inside a cell, whose place is known to a share of the
# cell, and 2 for smooth temperatures; a fit over three levels scatters by a third.
FRONT_ORDER, SMOOTH_ORDER = 0.7, 1.5
# An eighth of the time that a front at `DEEP` takes for a distance [s/m].
STRIDE = 6e3
COARSE = (0.5e-3, 0.25e-3, 0.125e-3)
# Where the curve bends at the front without a jump, the isotherm of a cell is known to a third
# of the cell and not better.
FINE = (0.24e-3, 0.12e-3, 0.06e-3)

WATER = SharpFreezing(k_s=2.2, c_s=2050.0, k_l=0.56, c_l=4200.0, rho=1000.0, latent_heat=334e3, T_m=0.0)
WIDE = RangeFreezing(
    k_s=2.0, c_s=2000.0, k_m=1.2, c_m=3000.0, k_l=0.55, c_l=3900.0, rho=1050.0, latent_heat=270e3,
    T_s=-8.0, T_l=-2.0,
)  # fmt: skip
WIDE_WITH_JUMP = RangeFreezing(
    k_s=2.0, c_s=2000.0, k_m=1.2, c_m=3000.0, k_l=0.55, c_l=3900.0, rho=1050.0, latent_heat=270e3,
    T_s=-8.0, T_l=-2.0, share=0.2,
)  # fmt: skip


def melting(material: SharpFreezing) -> str:
    """Return the body of a material's table, as `melting`."""
    m = material
    return f"""
kind = "melting"
melting_point = "{m.T_m} degC"
latent_heat = "{m.latent_heat} J/kg"
density = "{m.rho} kg/m3"
solid = {{ conductivity = "{m.k_s} W/m/K", heat_capacity = "{m.c_s} J/kg/K" }}
liquid = {{ conductivity = "{m.k_l} W/m/K", heat_capacity = "{m.c_l} J/kg/K" }}
"""


def table(material: RangeFreezing) -> str:
    """Return the body of a material's table, as rows."""
    rows = material.rows(-60.0, 30.0)
    columns = (rows.temperature, rows.enthalpy / material.rho, rows.conductivity)
    T, h, k = (", ".join(repr(float(x)) for x in xs) for xs in columns)
    return f"""
kind = "table"
density = "{material.rho} kg/m3"
temperature = {{ unit = "degC", values = [{T}] }}
enthalpy = {{ unit = "J/kg", values = [{h}] }}
conductivity = {{ unit = "W/m/K", values = [{k}] }}
"""


def text(
    piece: str,
    shape: str,
    material: str,
    surfaces: dict[str, str],
    lasts: float,
    watch: str,
    aim: str = "",
    step: str = "",
) -> str:
    """Put a case together; `surfaces` holds the body of each surface's table."""
    given = "".join(f"[stages.surfaces.{name}]\n{body}\n" for name, body in surfaces.items())
    return f"""schema = 1
title = "A case with an exact answer"
[piece]
{piece}
[shape]
{shape}
[regions]
product = "material"
[materials.material]
{material}
[[stages]]
name = "freeze"
lasts = "{lasts} s"
{given}
[watch]
every = "{lasts / 120} s"
frames = "{lasts} s"
{watch}
{aim}
[stepping]
accuracy = "tight"
{step}
"""


@cache
def answer(text: str) -> Result:
    """Run a case, once for each text."""
    return run(loads(text, "an exact case"), ranges=False, numerical_error=False)


def stride(cell: float) -> str:
    """Tie the steps to the cells, so that one rate shows for both."""
    return f'largest_step = "{STRIDE * cell} s"'


def front_sample(result: Result, exact: Array, deep: float = DEEP) -> Sample:
    """Compare the front at all rows where the exact one [m] is deep enough."""
    ours = result.fronts["depth.position [mm]"]
    judged = exact > deep
    return Sample(1e3 * exact[judged], ours[judged], "mm")
