"""Cylinders frozen from outside and from a line within."""

from __future__ import annotations

import numpy as np

from fem.curve import Array
from fem.exact import InwardFreezing, LineSink
from fem.result.folder import Result
from fem.series.truth.texts import (
    AWAY,
    COARSE,
    FINE,
    FRONT_ORDER,
    LASTS,
    SMOOTH_ORDER,
    WATER,
    WIDE,
    answer,
    front_sample,
    melting,
    stride,
    table,
    text,
)
from fem.series.verdict import Bound, Check, Sample


def cylinder(ste: float) -> Check:
    """Return the check by a cylinder frozen from its wall to its axis."""
    radius = 0.02
    law = InwardFreezing("cylinder", ste)
    T_w = -ste * WATER.latent_heat / WATER.c_s
    pace = radius**2 * WATER.rho * WATER.c_s / WATER.k_s
    total = law.total * pace

    def samples(cell: float) -> dict[str, Sample]:
        result = answer(
            text(
                'section = "axisymmetric"\nstart_temperature = "0 degC"',
                f'form = "rod"\nradius = "{radius} m"\nheight = "2 mm"\ncell = ["{cell} m", "1 mm"]',
                melting(WATER),
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
        return {"front": front_sample(ours, position), "total time": Sample(np.array([total]), arrival, "s")}

    return Check(
        "cylinder frozen from outside",
        "front-fixing solution of the one-phase cylinder, computed with the program's exact solutions",
        COARSE,
        samples,
        {"front": Bound(0.005, FRONT_ORDER), "total time": Bound(0.005, FRONT_ORDER)},
    )


def line_sink() -> Check:
    """Return the check by a line that draws heat from a mix with a freezing range."""
    inner, outer, lasts = 2e-3, 0.05, LASTS
    law = LineSink(WIDE, Q=100.0, T_0=5.0)
    # Straight lines between these rows miss the exact flux by less than 1e-5 of its largest.
    clock = lasts * np.linspace(0.0, 1.0, 1201) ** 2
    flux = law.flux(inner, clock)

    def samples(cell: float) -> dict[str, Sample]:
        times, values = (", ".join(f"{x:.10g}" for x in xs) for xs in (clock, flux))
        out, fronts = {}, []
        for zone, level in (("solidus", WIDE.T_s), ("liquidus", WIDE.T_l)):
            result = answer(
                text(
                    'section = "axisymmetric"\nstart_temperature = "5 degC"',
                    f'form = "ring"\ninner = "{inner} m"\nouter = "{outer} m"\nheight = "2 mm"\n'
                    f'cell = ["{cell} m", "1 mm"]',
                    table(WIDE),
                    {
                        "inside": 'exchange = "flux"\nflux = { time = { unit = "s", values = '
                        f'[{times}] }}, value = {{ unit = "W/m2", values = [{values}] }} }}'
                    },
                    lasts,
                    f'front = "{level} degC"\n[watch.points]\n'
                    + "".join(f'x{r} = ["{r} mm", "1 mm"]\n' for r in (4, 6, 10))
                    + f'[watch.rays]\ndepth = {{ from = ["{inner} m", "1 mm"], to = ["{outer} m", "1 mm"] }}',
                    step=stride(cell),
                )
            )
            time = result.curves["time [s]"]
            exact = law.front(time) if zone == "solidus" else law.liquidus(time)
            fronts.append(exact)
            grown = np.where(exact > inner, exact - inner, 0.0)
            out[f"front of the {zone}"] = _from_axis(front_sample(result, grown, deep=1.5e-3), inner)
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
