"""Freezing times by hand: what an engineer would work out before any mesh is made.

All formulas are values from memory. Each answer says whether it stands inside the range that
the formula is stated for; outside it is still given, for want of a better first guess.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from math import isfinite

# P and R of Plank, and Pham's shape factor E.
SHAPES = {"slab": (1 / 2, 1 / 8, 1.0), "cylinder": (1 / 4, 1 / 16, 2.0), "sphere": (1 / 6, 1 / 24, 3.0)}


@dataclass(frozen=True)
class Estimate:
    """A freezing time by hand, and how far to trust it.

    Parameters
    ----------
    time_s
        [s].
    method
        Whose formula.
    in_range
        False if any number that could be judged stands outside the formula's range.
    remarks
        What is outside, what could not be judged and what the formula leaves out.

    """

    time_s: float
    method: str
    in_range: bool
    remarks: tuple[str, ...]


def plank(
    shape: str,
    size: float,
    h: float,
    conductivity: float,
    latent: float,
    freezing_point: float,
    coolant: float,
    *,
    capacity_frozen: float | None = None,
    capacity_unfrozen: float | None = None,
    start: float | None = None,
) -> Estimate:
    """Plank: the time for the latent heat alone, a lower bound; exact for Ste -> 0.

    Parameters
    ----------
    shape
        "slab", "cylinder" (long) or "sphere".
    size
        Full thickness or diameter [m].
    h
        Heat transfer coefficient, walls included [W/m2/K].
    conductivity
        Of the frozen product [W/m/K].
    latent
        Latent heat per volume [J/m3].
    freezing_point, coolant
        [degC]; the latent heat is given off at the first, to the second.
    capacity_frozen
        Heat capacity of the frozen product [J/m3/K], to judge the Stefan number: in range up to
        0.1, where the exact times are 3 % (slab) to 8 % (sphere) longer.
    capacity_unfrozen, start
        Heat capacity [J/m3/K] and temperature [degC] of the liquid at the beginning, to judge
        the superheat: in range while its heat is at most 5 % of the latent heat.

    Raises
    ------
    ValueError
        Where the shape is not known, a value is not above 0 or the coolant not below the
        freezing point.

    References
    ----------
    Plank 1913, 1941 (value from memory; P and R re-derived).

    """
    P, R, _ = _shape(shape)
    _positive(size=size, h=h, conductivity=conductivity, latent=latent)
    step = _drop("freezing_point", freezing_point, "coolant", coolant)
    time = latent / step * (P * size / h + R * size**2 / conductivity)
    remarks, good = ["sensible heat is left out: a lower bound"], True
    if capacity_frozen is None:
        remarks.append("not judged: Ste (no heat capacity was given)")
    else:
        _positive(capacity_frozen=capacity_frozen)
        good &= _judge(remarks, "Ste", capacity_frozen * step / latent, 0, 0.1)
    if capacity_unfrozen is None or start is None:
        remarks.append("not judged: Pk (start and its heat capacity are needed)")
    else:
        _positive(capacity_unfrozen=capacity_unfrozen)
        above = max(start - freezing_point, 0.0)
        good &= _judge(remarks, "Pk", capacity_unfrozen * above / latent, 0, 0.05)
    return Estimate(time, "Plank", good, tuple(remarks))


def mean_freezing_temperature(end: float, coolant: float) -> float:
    """Return Pham's mean freezing temperature T_fm [degC] from final core and coolant [degC]."""
    return 1.8 + 0.263 * end + 0.105 * coolant


def pham(
    half_size: float,
    h: float,
    conductivity: float,
    *,
    start: float,
    end: float,
    coolant: float,
    capacity_unfrozen: float,
    heat: float,
    shape_factor: float = 1.0,
    freezing_point: float | None = None,
    capacity_frozen: float | None = None,
) -> Estimate:
    """Pham's two-stage method: precooling, then freezing with subcooling; within about 10 %.

    Parameters
    ----------
    half_size
        Half thickness or radius [m].
    h
        Heat transfer coefficient, walls included [W/m2/K].
    conductivity
        Of the frozen product, at about -15 degC [W/m/K].
    start, end, coolant
        Start, aim of the slowest point, coolant [degC].
    capacity_unfrozen
        Heat capacity of the unfrozen product [J/m3/K].
    heat
        All heat from start to end, H(start) - H(end) [J/m3].
    shape_factor
        E: 1 slab, 2 long cylinder, 3 sphere, `shape_factor` for a bar.
    freezing_point, capacity_frozen
        [degC], [J/m3/K]; to judge Ste and Pk, otherwise only Bi is judged.

    Raises
    ------
    ValueError
        Where a value is not above 0, the temperatures are out of order or the precooling takes
        more than the whole heat.

    References
    ----------
    Pham 1986 (value from memory): +/-10 % for 0.02 < Bi < 11, 0.11 < Ste < 0.36, 0.03 < Pk < 0.61.

    """
    _positive(half_size=half_size, h=h, conductivity=conductivity, heat=heat)
    _positive(capacity_unfrozen=capacity_unfrozen, shape_factor=shape_factor)
    _drop("start", start, "end", end)
    _drop("end", end, "coolant", coolant)
    mean = mean_freezing_temperature(end, coolant)
    _drop("mean freezing temperature", mean, "coolant", coolant)
    _drop("start", start, "mean freezing temperature", mean)
    precooling = capacity_unfrozen * (start - mean)
    if precooling >= heat:
        raise ValueError(f"precooling to {mean:.3g} degC takes {precooling:g} J/m3, more than {heat:g}")
    drive = precooling / ((start + mean) / 2 - coolant) + (heat - precooling) / (mean - coolant)
    biot = h * half_size / conductivity
    time = half_size / (shape_factor * h) * drive * (1 + biot / 2)
    remarks: list[str] = []
    good = _judge(remarks, "Bi", biot, 0.02, 11)
    if freezing_point is None or capacity_frozen is None:
        remarks.append("not judged: Ste and Pk (freezing point and heat capacity are needed)")
    else:
        above = start - freezing_point
        # Ste and Pk are defined on the heat from the freezing point down to -10 degC.
        to_10 = heat - capacity_unfrozen * above + capacity_frozen * (end + 10.0)
        _positive(heat_to_minus_10=to_10)
        good &= _judge(remarks, "Ste", capacity_frozen * (freezing_point - coolant) / to_10, 0.11, 0.36)
        good &= _judge(remarks, "Pk", capacity_unfrozen * above / to_10, 0.03, 0.61)
    return Estimate(time, "Pham", good, tuple(remarks))


def shape_factor(beta: float, biot: float) -> float:
    """Return E of a long bar of rectangular section: its slab's freezing time over its own [-].

    Parameters
    ----------
    beta
        Long side over short side, 1 or more [-].
    biot
        h times the full short side over k [-].

    Raises
    ------
    ValueError
        If `beta` is below 1 or `biot` not above 0.

    References
    ----------
    Equivalent heat transfer dimensionality after Cleland and Earle (value from memory); within
    3 % of the exact ratio at Ste -> 0 for beta from 1 to 6 and Bi from 0.02 to 200.

    """
    if not (beta >= 1.0 and isfinite(beta)):
        raise ValueError(f"beta is long side over short side: 1 or more, got {beta:g}")
    _positive(biot=biot)
    x = 2.32 / beta**1.77
    weight = x / (biot**1.34 + x)
    return 1.0 + weight / beta + (1.0 - weight) * 0.73 / beta**2.5


def conductance(h: float, layers: Iterable[tuple[float, float]] = ()) -> float:
    """Return the heat transfer coefficient through a film and layers behind it [W/m2/K].

    Parameters
    ----------
    h
        Heat transfer coefficient of the film [W/m2/K].
    layers
        Thickness [m] and conductivity [W/m/K] of each.

    Raises
    ------
    ValueError
        Where a value is not above 0 (a thickness may be 0).

    """
    _positive(h=h)
    resistance = 1.0 / h
    for thickness, conductivity in layers:
        _positive(layer_conductivity=conductivity)
        if not (thickness >= 0 and isfinite(thickness)):
            raise ValueError(f"layer thickness has to be 0 or more, got {thickness:g} m")
        resistance += thickness / conductivity
    return 1.0 / resistance


def _shape(shape: str) -> tuple[float, float, float]:
    if shape not in SHAPES:
        raise ValueError(f'no shape "{shape}" (there is: {", ".join(SHAPES)})')
    return SHAPES[shape]


def _judge(remarks: list[str], name: str, value: float, low: float, high: float) -> bool:
    """Say whether a number stands in the formula's range; add a remark if not."""
    if low <= value <= high:
        return True
    remarks.append(f"{name} = {value:.3g} is outside {low:g} to {high:g}")
    return False


def _drop(warm: str, warm_value: float, cold: str, cold_value: float) -> float:
    if not warm_value > cold_value:
        raise ValueError(f"{warm} ({warm_value:g} degC) has to be above {cold} ({cold_value:g} degC)")
    return warm_value - cold_value


def _positive(**values: float) -> None:
    for name, value in values.items():
        if not (value > 0 and isfinite(value)):
            raise ValueError(f"{name} has to be above 0 and finite, got {value:g}")
