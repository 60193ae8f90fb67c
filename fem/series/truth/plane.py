"""A half space under a wall that steps to its temperature."""

from __future__ import annotations

from functools import cache

import numpy as np

from fem.case.read import loads
from fem.curve import Array
from fem.exact import Neumann, RangeFreezing, Similarity, ThreeZone
from fem.result.folder import Result
from fem.series.truth.texts import (
    AWAY,
    COARSE,
    DEEP,
    DEPTH,
    DEPTHS,
    FINE,
    FRONT_ORDER,
    LASTS,
    SMOOTH_ORDER,
    WATER,
    answer,
    front_sample,
    melting,
    stride,
    table,
    text,
)
from fem.series.verdict import Bound, Check, Sample


def _wall(
    material: str, T_w: float, T_0: float, cell: float, front: str, depth: float, lasts: float
) -> Result:
    """Run a half space under a wall that steps to a temperature; nothing changes along the wall."""
    points = "".join(f'x{x} = ["{x} mm", "1 mm"]\n' for x in DEPTHS)
    return answer(
        text(
            f'section = "plane"\nlength = "1 m"\nstart_temperature = "{T_0} degC"',
            f'form = "slab"\nthickness = "{depth} m"\nwidth = "2 mm"\ncell = ["{cell} m", "1 mm"]',
            material,
            {"left": f'exchange = "fixed"\ntemperature = "{T_w} degC"'},
            lasts,
            f'front = "{front}"\n[watch.points]\n{points}[watch.rays]\ndepth = {{ from = ["0 mm", "1 mm"], '
            f'to = ["{0.9 * depth} m", "1 mm"] }}',
            step=stride(cell),
        )
    )


def _temperatures(result: Result, law: Neumann | ThreeZone | Similarity, fronts: list[Array]) -> Sample:
    """Compare temperatures at the watched depths wherever no front is near."""
    time = result.curves["time [s]"][1:]
    exact, ours = [], []
    for x in DEPTHS:
        away = np.all([np.abs(1e-3 * x - s[1:]) > AWAY for s in fronts], axis=0) & (fronts[0][1:] > DEEP)
        exact.append(law.temperature(1e-3 * x, time[away]))
        ours.append(result.curves[f"point.x{x} [degC]"][1:][away])
    return Sample(np.concatenate(exact), np.concatenate(ours), "degC")


def neumann(T_w: float, T_0: float, depth: float) -> Check:
    """Return the check by one sharp front, with or without superheat."""
    law = Neumann(WATER, T_w, T_0)

    def samples(cell: float) -> dict[str, Sample]:
        result = _wall(melting(WATER), T_w, T_0, cell, "freezing point", depth, LASTS)
        front = law.front(result.curves["time [s]"])
        return {"front": front_sample(result, front), "temperature": _temperatures(result, law, [front])}

    name = "Neumann, one phase" if WATER.T_m == T_0 else "Neumann, two phases"
    return Check(
        name,
        "Carslaw and Jaeger 1959, section 11.2 (form from memory)",
        COARSE,
        samples,
        {"front": Bound(0.005, FRONT_ORDER), "temperature": Bound(0.1, FRONT_ORDER)},
    )


def three_zones(name: str, material: RangeFreezing) -> Check:
    """Return the check by a freezing range between two fronts."""
    law = ThreeZone(material, -30.0, 5.0)

    def samples(cell: float) -> dict[str, Sample]:
        out = {}
        for zone, level in (("solidus", material.T_s), ("liquidus", material.T_l)):
            result = _wall(table(material), -30.0, 5.0, cell, f"{level} degC", DEPTH, LASTS)
            time = result.curves["time [s]"]
            out[f"front of the {zone}"] = front_sample(result, getattr(law, zone)(time))
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


def recipe() -> Check:
    """Return the check by the similarity solution of a real recipe's own curves."""

    @cache
    def law() -> tuple[Similarity, float]:
        case = text(
            'section = "plane"\nlength = "1 m"\nstart_temperature = "5 degC"',
            'form = "slab"\nthickness = "9 mm"\nwidth = "9 mm"',
            RECIPE,
            {},
            1.0,
            "",
        )
        mix = loads(case).materials["material"].build()
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
            "front": front_sample(result, front),
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
