"""Units and clocks of loggers: what a heading says, and what the numbers must mean where it is silent."""

from __future__ import annotations

import re
from collections.abc import Sequence

import numpy as np

from fem.curve import Array
from fem.quantity import TEMPERATURE, convert

DAY = 86400.0

_SECONDS = {
    "ms": 1e-3,
    "s": 1.0,
    "sec": 1.0,
    "secs": 1.0,
    "seconds": 1.0,
    "min": 60.0,
    "mins": 60.0,
    "minutes": 60.0,
    "h": 3600.0,
    "hr": 3600.0,
    "hrs": 3600.0,
    "hours": 3600.0,
    "d": DAY,
    "days": DAY,
}
_WRITTEN = ("hh:mm:ss", "mm:ss", "hh:mm")
_SPELLED = {"celsius": "degC", "fahrenheit": "degF", "kelvin": "K"}
_TEMPERATURE = re.compile(r"(?i)(?:°|º|deg\.?)\s*_?([CF])\b|[\[(]\s*([CFK])\s*[\])]|(?:^|[\s_/,-])([CFK])$")
_PARTS = re.compile(r"(?:(.*)[\sT])?(\d{1,3}):(\d{2})(?::(\d{2}(?:\.\d+)?))?(?:\s*([AP])M)?Z?", re.IGNORECASE)


def temperature_unit(heading: str) -> str | None:
    """Return the unit of temperature that a heading names, or None.

    >>> temperature_unit("T1 (°F)"), temperature_unit("core [degC]"), temperature_unit("probe 1")
    ('degF', 'degC', None)
    """
    for word, unit in _SPELLED.items():
        if word in heading.lower():
            return unit
    match = _TEMPERATURE.search(heading.strip())
    if match is None:
        return None
    letter = (match[1] or match[2] or match[3]).upper()
    return "K" if letter == "K" else f"deg{letter}"


def clock_unit(heading: str) -> str | None:
    """Return the unit of time that a heading names, or how it writes its clock, or None.

    >>> clock_unit("Time [min]"), clock_unit("elapsed_s"), clock_unit("t (mm:ss)"), clock_unit("time")
    ('min', 's', 'mm:ss', None)
    """
    text = heading.strip().lower()
    for form in _WRITTEN:
        if form in text:
            return form
    match = re.search(r"[\[(]\s*([a-z]+)\.?\s*[\])]|[\s_/,-]([a-z]+)\.?$", text)
    word = (match[1] or match[2]) if match else text
    return word if word in _SECONDS else None


def to_celsius(values: Array, unit: str | None, bounds: tuple[float, float] | None) -> tuple[Array, str]:
    """Return temperatures in degC, and the unit that they were read in.

    Parameters
    ----------
    values
        As typed, NaN where there is none.
    unit
        "degC", "degF" or "K"; None to choose the reading that fits.
    bounds
        Coldest temperature that can have been seen and the freezing point [degC]; None for degC.

    Raises
    ------
    ValueError
        A unit that is none; readings that fit in no unit.

    """
    if unit is not None:
        return np.asarray(convert(values, unit, TEMPERATURE)), unit  # type: ignore[arg-type]
    known = values[np.isfinite(values)]
    if bounds is None or not len(known):
        return values, "degC"
    coldest, freezing_point = bounds
    for reading in ("degC", "degF", "K"):
        low, high = (float(convert(float(np.percentile(known, q)), reading, TEMPERATURE)) for q in (1, 99))
        if coldest - 5.0 <= low < freezing_point and freezing_point < high < 60.0:
            return np.asarray(convert(values, reading, TEMPERATURE)), reading  # type: ignore[arg-type]
    raise ValueError(
        f"goes from {known.min():.4g} to {known.max():.4g} and does not say its unit: in no unit of "
        f"temperature does that pass the freezing point ({freezing_point:.3g} degC) above the coolant "
        f"({coldest:.3g} degC); "
        "add --unit, or see whether it is the right log"
    )


def clocks(cells: Sequence[str], unit: str | None, decimal: str, remarks: list[str]) -> Array:
    """Return the seconds that a clock column means, NaN where a cell says nothing, shape (n,).

    Parameters
    ----------
    cells
        As typed.
    unit
        From `clock_unit`.
    decimal
        Decimal sign of the file.
    remarks
        Takes what had to be assumed.

    Raises
    ------
    ValueError
        A clock that can be read in two ways.

    """
    parts = [_PARTS.fullmatch(cell.strip().replace(",", ".")) for cell in cells]
    if sum(m is not None for m in parts) > 0.5 * len(cells):
        return _past_midnight(np.array([_seconds(m, unit) if m else np.nan for m in parts]))
    numbers = np.array([_number(cell, decimal) for cell in cells])
    if unit in _SECONDS:
        return numbers * _SECONDS[unit]
    known = numbers[np.isfinite(numbers)]
    if len(known) > 1 and 2e4 < known[0] < 8e4 and known[-1] - known[0] < 10.0 and np.any(known % 1 > 0):
        remarks.append("the clock counts days, as spreadsheets do")
        return numbers * DAY
    remarks.append("the clock's unit is not said: read as seconds")
    return numbers


def _seconds(match: re.Match[str], unit: str | None) -> float:
    first, second = int(match[2]), int(match[3])
    if match[4] is None:
        if unit not in ("mm:ss", "hh:mm"):
            raise ValueError(
                f'writes its clock like "{match[0].strip()}": hours and minutes, or minutes and seconds? '
                "Head the column [hh:mm] or [mm:ss]"
            )
        return 60.0 * first + second if unit == "mm:ss" else 3600.0 * first + 60.0 * second
    if match[5]:
        first = first % 12 + (12 if match[5].upper() == "P" else 0)
    return 3600.0 * first + 60.0 * second + float(match[4])


def _past_midnight(seconds: Array) -> Array:
    """Go on counting where a clock of the day starts anew."""
    known = np.isfinite(seconds)
    days = np.cumsum(np.diff(seconds[known], prepend=seconds[known][:1]) < -0.5 * DAY)
    out = seconds.copy()
    out[known] += DAY * days
    return out


def _number(cell: str, decimal: str) -> float:
    text = cell.strip().replace("\N{MINUS SIGN}", "-")
    if decimal == ",":
        text = text.replace(",", ".")
    try:
        return float(text)
    except ValueError:
        return float("nan")
