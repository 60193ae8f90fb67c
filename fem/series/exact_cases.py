"""Cases whose answers are known exactly, written as a user writes them."""

from __future__ import annotations

from functools import cache

import numpy as np

from fem.case.read import loads
from fem.curve import Array
from fem.exact import (
    InwardFreezing,
    LineSink,
    Neumann,
    RangeFreezing,
    SharpFreezing,
    Similarity,
    ThreeZone,
    quasi_steady,
)
from fem.result.folder import Result
from fem.run import run
from fem.series.verdict import Bound, Check, Sample

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


def _melting(material: SharpFreezing) -> str:
    m = material
    return f"""
kind = "melting"
melting_point = "{m.T_m} degC"
latent_heat = "{m.latent_heat} J/kg"
density = "{m.rho} kg/m3"
solid = {{ conductivity = "{m.k_s} W/m/K", heat_capacity = "{m.c_s} J/kg/K" }}
liquid = {{ conductivity = "{m.k_l} W/m/K", heat_capacity = "{m.c_l} J/kg/K" }}
"""


def _table(material: RangeFreezing) -> str:
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


def _text(
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
def _run(text: str) -> Result:
    return run(loads(text, "an exact case"), ranges=False, numerical_error=False)


def _step(cell: float) -> str:
    """Tie the steps to the cells, so that one rate shows for both."""
    return f'largest_step = "{STRIDE * cell} s"'


def _wall(
    material: str, T_w: float, T_0: float, cell: float, front: str, depth: float, lasts: float
) -> Result:
    """Run a half space under a wall that steps to a temperature; nothing changes along the wall."""
    points = "".join(f'x{x} = ["{x} mm", "1 mm"]\n' for x in DEPTHS)
    return _run(
        _text(
            f'section = "plane"\nlength = "1 m"\nstart_temperature = "{T_0} degC"',
            f'form = "slab"\nthickness = "{depth} m"\nwidth = "2 mm"\ncell = ["{cell} m", "1 mm"]',
            material,
            {"left": f'exchange = "fixed"\ntemperature = "{T_w} degC"'},
            lasts,
            f'front = "{front}"\n[watch.points]\n{points}[watch.rays]\ndepth = {{ from = ["0 mm", "1 mm"], '
            f'to = ["{0.9 * depth} m", "1 mm"] }}',
            step=_step(cell),
        )
    )


def _front(result: Result, exact: Array, deep: float = DEEP) -> Sample:
    """Compare the front at all rows where the exact one [m] is deep enough."""
    ours = result.fronts["depth.position [mm]"]
    judged = exact > deep
    return Sample(1e3 * exact[judged], ours[judged], "mm")


def _temperatures(result: Result, law: Neumann | ThreeZone | Similarity, fronts: list[Array]) -> Sample:
    """Compare temperatures at the watched depths wherever no front is near."""
    time = result.curves["time [s]"][1:]
    exact, ours = [], []
    for x in DEPTHS:
        away = np.all([np.abs(1e-3 * x - s[1:]) > AWAY for s in fronts], axis=0) & (fronts[0][1:] > DEEP)
        exact.append(law.temperature(1e-3 * x, time[away]))
        ours.append(result.curves[f"point.x{x} [degC]"][1:][away])
    return Sample(np.concatenate(exact), np.concatenate(ours), "degC")


def _neumann(T_w: float, T_0: float, depth: float) -> Check:
    law = Neumann(WATER, T_w, T_0)

    def samples(cell: float) -> dict[str, Sample]:
        result = _wall(_melting(WATER), T_w, T_0, cell, "freezing point", depth, LASTS)
        front = law.front(result.curves["time [s]"])
        return {"front": _front(result, front), "temperature": _temperatures(result, law, [front])}

    name = "Neumann, one phase" if WATER.T_m == T_0 else "Neumann, two phases"
    return Check(
        name,
        "Carslaw and Jaeger 1959, section 11.2 (form from memory)",
        COARSE,
        samples,
        {"front": Bound(0.005, FRONT_ORDER), "temperature": Bound(0.1, FRONT_ORDER)},
    )


def _three_zones(name: str, material: RangeFreezing) -> Check:
    law = ThreeZone(material, -30.0, 5.0)

    def samples(cell: float) -> dict[str, Sample]:
        out = {}
        for zone, level in (("solidus", material.T_s), ("liquidus", material.T_l)):
            result = _wall(_table(material), -30.0, 5.0, cell, f"{level} degC", DEPTH, LASTS)
            time = result.curves["time [s]"]
            out[f"front of the {zone}"] = _front(result, getattr(law, zone)(time))
        fronts = [law.solidus(time), law.liquidus(time)]
        return out | {"temperature": _temperatures(result, law, fronts)}

    return Check(
        name,
        "after Tien and Geiger 1967 (form from memory)",
        FINE,
        samples,
        {
            "front of the solidus": Bound(0.005, FRONT_ORDER),
            "front of the liquidus": Bound(0.005, FRONT_ORDER),
            "temperature": Bound(0.1, FRONT_ORDER if material.share else SMOOTH_ORDER),
        },
    )


RECIPE = 'kind = "recipe"\nsucrose = "18 %"\n'


def _recipe() -> Check:
    @cache
    def law() -> tuple[Similarity, float]:
        text = _text(
            'section = "plane"\nlength = "1 m"\nstart_temperature = "5 degC"',
            'form = "slab"\nthickness = "9 mm"\nwidth = "9 mm"',
            RECIPE,
            {},
            1.0,
            "",
        )
        mix = loads(text).materials["material"].build()
        curve = mix.curve
        return Similarity(curve.enthalpy, curve.conductivity, -25.0, 5.0, breaks=curve.T), mix.freezing_point

    def samples(cell: float) -> dict[str, Sample]:
        exact, freezing_point = law()
        result = _wall(RECIPE, -25.0, 5.0, cell, "freezing point", DEPTH, LASTS)
        time = result.curves["time [s]"]
        front = exact.front(freezing_point, time)
        load = result.curves["heat_load.left [W]"]
        late = time > 100.0
        return {
            "front": _front(result, front),
            "temperature": _temperatures(result, exact, [front]),
            "wall flux": Sample(exact.wall_flux(time[late]), load[late] / 2e-3, "W/m2"),
        }

    return Check(
        "similarity, 18 % sucrose's own H(T) and k(T)",
        "similarity equation of the half space, solved for the recipe's curves",
        FINE,
        samples,
        {
            "front": Bound(0.005, FRONT_ORDER),
            "temperature": Bound(0.1, SMOOTH_ORDER),
            "wall flux": Bound(0.005),
        },
    )


def _cylinder(ste: float) -> Check:
    radius = 0.02
    law = InwardFreezing("cylinder", ste)
    T_w = -ste * WATER.latent_heat / WATER.c_s
    pace = radius**2 * WATER.rho * WATER.c_s / WATER.k_s
    total = law.total * pace

    def samples(cell: float) -> dict[str, Sample]:
        result = _run(
            _text(
                'section = "axisymmetric"\nstart_temperature = "0 degC"',
                f'form = "rod"\nradius = "{radius} m"\nheight = "2 mm"\ncell = ["{cell} m", "1 mm"]',
                _melting(WATER),
                {"side": f'exchange = "fixed"\ntemperature = "{T_w} degC"'},
                1.2 * total,
                f'[watch.rays]\ndepth = {{ from = ["{radius} m", "1 mm"], to = ["0 m", "1 mm"] }}',
                '[aim]\nreach = "-0.01 degC"',
            )
        )
        time = result.curves["time [s]"]
        within = time < 0.9 * total
        position = radius * (1.0 - law.front(time[within] / pace))
        ours = Result({}, {}, {"depth.position [mm]": result.fronts["depth.position [mm]"][within]})
        arrival = np.array([result.summary["aim"]["time_s"]])
        return {"front": _front(ours, position), "total time": Sample(np.array([total]), arrival, "s")}

    return Check(
        "cylinder frozen from outside",
        "front-fixing solution of the one-phase cylinder, computed with the program's exact solutions",
        COARSE,
        samples,
        {"front": Bound(0.005, FRONT_ORDER), "total time": Bound(0.005, FRONT_ORDER)},
    )


def _line_sink() -> Check:
    inner, outer, lasts = 2e-3, 0.05, LASTS
    law = LineSink(WIDE, Q=100.0, T_0=5.0)
    # Straight lines between these rows miss the exact flux by less than 1e-5 of its largest.
    clock = lasts * np.linspace(0.0, 1.0, 1201) ** 2
    flux = law.flux(inner, clock)

    def samples(cell: float) -> dict[str, Sample]:
        times, values = (", ".join(f"{x:.10g}" for x in xs) for xs in (clock, flux))
        out, fronts = {}, []
        for zone, level in (("solidus", WIDE.T_s), ("liquidus", WIDE.T_l)):
            result = _run(
                _text(
                    'section = "axisymmetric"\nstart_temperature = "5 degC"',
                    f'form = "ring"\ninner = "{inner} m"\nouter = "{outer} m"\nheight = "2 mm"\n'
                    f'cell = ["{cell} m", "1 mm"]',
                    _table(WIDE),
                    {
                        "inside": 'exchange = "flux"\nflux = { time = { unit = "s", values = '
                        f'[{times}] }}, value = {{ unit = "W/m2", values = [{values}] }} }}'
                    },
                    lasts,
                    f'front = "{level} degC"\n[watch.points]\n'
                    + "".join(f'x{r} = ["{r} mm", "1 mm"]\n' for r in (4, 6, 10))
                    + f'[watch.rays]\ndepth = {{ from = ["{inner} m", "1 mm"], to = ["{outer} m", "1 mm"] }}',
                    step=_step(cell),
                )
            )
            time = result.curves["time [s]"]
            exact = law.front(time) if zone == "solidus" else law.liquidus(time)
            fronts.append(exact)
            grown = np.where(exact > inner, exact - inner, 0.0)
            out[f"front of the {zone}"] = _from_axis(_front(result, grown, deep=1.5e-3), inner)
        return out | {"temperature": _around(result, law, fronts)}

    return Check(
        "line sink with a freezing range",
        "Carslaw and Jaeger 1959, section 11.6, with a range after Ozisik and Uzzell 1979 (from memory)",
        FINE,
        samples,
        {
            "front of the solidus": Bound(0.005, FRONT_ORDER),
            "front of the liquidus": Bound(0.005, FRONT_ORDER),
            "temperature": Bound(0.1, SMOOTH_ORDER),
        },
    )


def _from_axis(sample: Sample, inner: float) -> Sample:
    """Count a front from the axis, as the exact solution does, not from the inner wall."""
    return Sample(sample.exact + 1e3 * inner, sample.ours + 1e3 * inner, "mm")


def _around(result: Result, law: LineSink, fronts: list[Array]) -> Sample:
    """Compare temperatures about the line wherever no front is near."""
    time = result.curves["time [s]"]
    exact, ours = [], []
    for r in (4, 6, 10):
        away = np.all([np.abs(1e-3 * r - s) > AWAY for s in fronts], axis=0) & (time > 100.0)
        exact.append(law.temperature(1e-3 * r, time[away]))
        ours.append(result.curves[f"point.x{r} [degC]"][away])
    return Sample(np.concatenate(exact), np.concatenate(ours), "degC")


def _limit(name: str, phi: float, text: str, half: float) -> Check:
    """Compare the total time of ever smaller Stefan numbers with its limit, which is exact."""
    numbers = (0.02, 0.01)

    def samples(cell: float) -> dict[str, Sample]:
        ratios = []
        for ste in numbers:
            T_w = -ste * WATER.latent_heat / WATER.c_s
            limit = quasi_steady.freezing_time(phi, WATER.rho * WATER.latent_heat, WATER.k_s, -T_w)
            case = (
                text.replace("CELL", f"{cell} m").replace("COLD", f"{T_w}").replace("LASTS", f"{1.2 * limit}")
            )
            time = _run(case.replace("EVERY", f"{limit / 50}")).summary["aim"]["time_s"]
            ratios.append(time / limit)
        # The excess over the limit is linear in the Stefan number as it goes to 0.
        ours = ratios[1] + (ratios[1] - ratios[0]) * numbers[1] / (numbers[0] - numbers[1])
        scale = phi / half**2
        return {"total time factor": Sample(np.array([scale]), np.array([scale * ours]), "-")}

    source = (
        "quasi-steady limit: one Poisson problem, closed by its series (computed from the stated formula)"
    )
    return Check(name, source, (half / 8, half / 16), samples, {"total time factor": Bound(0.005)})


def _square() -> Check:
    half = 0.01
    h = WATER.k_s / half
    text = _text(
        'section = "plane"\nlength = "1 m"\nstart_temperature = "0 degC"',
        f'form = "bar"\nthickness = "{2 * half} m"\nwidth = "{2 * half} m"\ncell = "CELL"',
        _melting(WATER),
        {"outside": f'exchange = "fluid"\nh = "{h} W/m2/K"\ncoolant = "COLD degC"'},
        1.0,
        "",
        '[aim]\nreach = "-0.002 degC"',
    )
    return _limit("square rod, Bi = 1, Ste to 0", quasi_steady.rectangle(half, half, 1.0), _open(text), half)


def _squat() -> Check:
    half = 0.01
    text = _text(
        'section = "axisymmetric"\nstart_temperature = "0 degC"',
        f'form = "rod"\nradius = "{half} m"\nheight = "{half} m"\ncell = "CELL"',
        _melting(WATER),
        {name: 'exchange = "fixed"\ntemperature = "COLD degC"' for name in ("side", "top")},
        1.0,
        "",
        '[aim]\nreach = "-0.002 degC"',
    )
    return _limit(
        "cylinder as high as wide, Ste to 0", quasi_steady.finite_cylinder(half, half), _open(text), half
    )


def _open(text: str) -> str:
    """Leave the times of a case open, to be set for each Stefan number."""
    quick = text.replace('accuracy = "tight"', 'accuracy = "standard"')
    return quick.replace('lasts = "1.0 s"', 'lasts = "LASTS s"').replace(
        f'every = "{1.0 / 120} s"\nframes = "1.0 s"', 'every = "EVERY s"\nframes = "LASTS s"'
    )


CHECKS = (
    _neumann(-20.0, 5.0, DEPTH),
    _neumann(-20.0, 0.0, 0.02),
    _three_zones("three zones", WIDE),
    _three_zones("three zones, part of the heat at the solidus", WIDE_WITH_JUMP),
    _recipe(),
    _cylinder(0.2),
    _line_sink(),
    _square(),
    _squat(),
)
