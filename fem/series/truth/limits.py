"""Total times in the limit of a small Stefan number, where one Poisson problem is exact."""

from __future__ import annotations

import numpy as np

from fem.exact import quasi_steady
from fem.series.truth.texts import (
    WATER,
    answer,
    melting,
    text,
)
from fem.series.verdict import Bound, Check, Sample


def _limit(name: str, phi: float, open_case: str, half: float) -> Check:
    """Compare the total time of ever smaller Stefan numbers with its limit, which is exact."""
    numbers = (0.02, 0.01)

    def samples(cell: float) -> dict[str, Sample]:
        ratios = []
        for ste in numbers:
            T_w = -ste * WATER.latent_heat / WATER.c_s
            limit = quasi_steady.freezing_time(phi, WATER.rho * WATER.latent_heat, WATER.k_s, -T_w)
            case = open_case.replace("CELL", f"{cell} m").replace("COLD", f"{T_w}")
            case = case.replace("LASTS", f"{1.2 * limit}")
            time = answer(case.replace("EVERY", f"{limit / 50}")).summary["aim"]["time_s"]
            ratios.append(time / limit)
        # The excess over the limit is linear in the Stefan number as it goes to 0.
        ours = ratios[1] + (ratios[1] - ratios[0]) * numbers[1] / (numbers[0] - numbers[1])
        scale = phi / half**2
        return {"total time factor": Sample(np.array([scale]), np.array([scale * ours]), "-")}

    source = (
        "quasi-steady limit: one Poisson problem, closed by its series (computed from the stated formula)"
    )
    return Check(name, source, (half / 10, half / 20), samples, {"total time factor": Bound(0.005)})


def square() -> Check:
    """Return the check by a square rod under a film."""
    half = 0.01
    h = WATER.k_s / half
    case = text(
        'section = "plane"\nlength = "1 m"\nstart_temperature = "0 degC"',
        f'form = "bar"\nthickness = "{2 * half} m"\nwidth = "{2 * half} m"\ncell = "CELL"',
        melting(WATER),
        {"outside": f'exchange = "fluid"\nh = "{h} W/m2/K"\ncoolant = "COLD degC"'},
        1.0,
        "",
        '[aim]\nreach = "-0.002 degC"',
    )
    return _limit("square rod, Bi = 1, Ste to 0", quasi_steady.rectangle(half, half, 1.0), _open(case), half)


def squat() -> Check:
    """Return the check by a cylinder as high as it is wide, all walls cold."""
    half = 0.01
    case = text(
        'section = "axisymmetric"\nstart_temperature = "0 degC"',
        f'form = "rod"\nradius = "{half} m"\nheight = "{half} m"\ncell = "CELL"',
        melting(WATER),
        {name: 'exchange = "fixed"\ntemperature = "COLD degC"' for name in ("side", "top")},
        1.0,
        "",
        '[aim]\nreach = "-0.002 degC"',
    )
    return _limit(
        "cylinder as high as wide, Ste to 0", quasi_steady.finite_cylinder(half, half), _open(case), half
    )


def _open(case: str) -> str:
    """Leave the times of a case open, to be set for each Stefan number."""
    quick = case.replace('accuracy = "tight"', 'accuracy = "standard"')
    return quick.replace('lasts = "1.0 s"', 'lasts = "LASTS s"').replace(
        f'every = "{1.0 / 120} s"\nframes = "1.0 s"', 'every = "EVERY s"\nframes = "LASTS s"'
    )
