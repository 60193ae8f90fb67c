"""Thermocouple logs as loggers write them: any separator, either decimal sign, clocks, gaps, no units.

`csv.Sniffer` and its successors look for a dialect of text; a probe's log is known to hold a
clock and numbers, so the reading that makes most cells clocks or numbers is taken instead. That
settles the decimal comma too, which no dialect knows of.
"""

from __future__ import annotations

import csv
import re
from collections import Counter
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from fem.curve import Array
from fem.errors import CaseError, Problem, unknown
from fem.series.logger_units import clock_unit, clocks, temperature_unit, to_celsius

SEPARATORS = (";", "\t", ",", "|", " ")
FEWEST = 12
"""Rows with a reading that a log needs to be worth anything."""
# What an open or broken thermocouple is written as lies outside of what a mix can be [degC].
COLDEST, WARMEST = -100.0, 150.0

_NUMBER = re.compile(r"([-+]?\d+(?:\.\d+)?(?:[eE][-+]?\d+)?)\s*((?:°|deg)?\s*[CFK])?")
_CLOCK = re.compile(r"(?:.*[\sT])?\d{1,3}:\d{2}(?::\d{2}(?:\.\d+)?)?(?:\s*[APap][Mm])?Z?")
_COUNTERS = re.compile(r"(?i)\s*(no\.?|nr\.?|#|n|index|record|scan|sample|count)\s*")
_TIMES = re.compile(r"(?i).*(time|clock|elapsed|zeit|temps|hora|uhr)")


@dataclass(frozen=True, eq=False)
class ProbeLog:
    """What one thermocouple saw.

    Parameters
    ----------
    name
        The file's name, with the column where it has several.
    file
        Where it was read from; columns of one file share their clock.
    times
        Since the first row of the file [s], strictly rising, shape (n,).
    temperatures
        [degC], shape (n,).
    clock
        What the first row's clock says [s since midnight, or since the log's own 0].
    remarks
        What had to be assumed, dropped or guessed, in sentences.

    """

    name: str
    file: Path
    times: Array
    temperatures: Array
    clock: float
    remarks: tuple[str, ...] = ()


def read_log(
    path: str | Path,
    column: str | None = None,
    unit: str | None = None,
    bounds: tuple[float, float] | None = None,
) -> ProbeLog:
    """Read a log.

    Parameters
    ----------
    path
        The file.
    column
        Heading of the probe's column, with or without its unit; needed where there are several.
    unit
        "degC", "degF" or "K"; by default as the file says it, else the one that fits `bounds`.
    bounds
        Coldest temperature that the probe can have seen and the freezing point [degC].

    Raises
    ------
    CaseError
        Where it cannot be read as a log; says why in one sentence.

    """
    path = Path(path)
    try:
        return _read(path, column, unit, bounds)
    except ValueError as error:
        raise CaseError(str(path), [Problem("--log", str(error))]) from error


def _read(path: Path, column: str | None, unit: str | None, bounds: tuple[float, float] | None) -> ProbeLog:
    remarks: list[str] = []
    table = _table(_decoded(path))
    clock = _clock_column(table)
    probe = _probe_column(table, clock, column)
    heading = table.headings[probe]
    seconds = clocks(
        [row[clock] for row in table.rows], clock_unit(table.headings[clock]), table.decimal, remarks
    )
    cells = [_NUMBER.fullmatch(_plain(row[probe], table.decimal)) for row in table.rows]
    values = np.array([float(m[1]) if m else np.nan for m in cells])
    in_cells = next((temperature_unit(f"[{m[2].strip()}]") for m in cells if m and m[2]), None)
    stated = unit or temperature_unit(heading) or in_cells
    values, found = to_celsius(values, stated, bounds)
    if not stated:
        remarks.append(f"{path.name} does not say its unit of temperature: read as {found}")
    good = np.isfinite(seconds) & np.isfinite(values) & (values > COLDEST) & (values < WARMEST)
    if dropped := int(np.sum(~good)):
        remarks.append(f"{dropped} of {len(good)} rows of {path.name} have no reading and are left out")
    if good.sum() < FEWEST:
        raise ValueError(
            f"holds {good.sum()} rows with a time and a temperature; {FEWEST} at least are needed"
        )
    times, temperatures = _rising(seconds[good], values[good])
    if len(times) < FEWEST:
        raise ValueError(f"holds only {len(times)} different times; {FEWEST} at least are needed")
    first = float(times[0])
    name = path.name if column is None else f"{path.name} {heading.strip()}"
    return ProbeLog(name, path, times - first, temperatures, first, tuple(remarks))


@dataclass(frozen=True)
class _Table:
    headings: list[str]
    rows: list[list[str]]
    decimal: str


def _decoded(path: Path) -> list[str]:
    """Return the lines of a file, whatever wrote it."""
    try:
        raw = path.read_bytes()
    except OSError as error:
        raise ValueError(f"cannot be read: {error.strerror or error}") from error
    wide = raw[:2] in (b"\xff\xfe", b"\xfe\xff")
    for encoding in ("utf-16",) if wide else ("utf-8-sig", "cp1252"):
        try:
            text = raw.decode(encoding)
        except UnicodeDecodeError:
            continue
        if "\0" not in text:
            lines = [line for line in text.splitlines() if line.strip()]
            if not lines:
                raise ValueError("is empty")
            return lines
    raise ValueError("is no text; save it as CSV")


def _table(lines: Sequence[str]) -> _Table:
    """Split lines into cells by the separator and decimal sign that make the most sense of them."""
    best: tuple[float, list[list[str]], str] | None = None
    for separator in SEPARATORS:
        split = [_cells(line, separator) for line in lines]
        for decimal in (".", ","):
            if decimal != separator:
                # Blanks separate only where nothing else does: headings hold them too.
                score = _sense(split, decimal) - 2.0 * (separator == " ")
                if best is None or score > best[0]:
                    best = score, split, decimal
    assert best is not None
    score, split, decimal = best
    if score <= 0:
        raise ValueError("holds no rows of a time and a temperature, in whatever way its lines are split")
    width = _width(split, decimal)
    told = [len(row) == width and _told(row, decimal) >= 2 for row in split]
    first = told.index(True)
    rows = [
        row for row, is_data in zip(split[first:], told[first:], strict=True) if is_data or len(row) == width
    ]
    above = [row for row in split[:first] if len(row) > 1]
    headings = above[-1] if above else [""] * width
    if len(headings) != width:
        if _only_commas(lines[first]):
            raise ValueError(
                f"heads {len(headings)} columns over rows of {width}: decimal commas between commas cannot "
                "be told apart; export it with semicolons or decimal points"
            )
        headings = (headings + [""] * width)[:width]
    return _Table(headings, rows, decimal)


def _only_commas(line: str) -> bool:
    """Whether the only sign between the digits of a line is the comma."""
    return "," in line and not re.search(r"[;\t|.]", line)


def _cells(line: str, separator: str) -> list[str]:
    if separator == " ":
        return line.split()
    return [cell.strip() for cell in next(csv.reader([line], delimiter=separator))]


def _plain(cell: str, decimal: str) -> str:
    text = cell.strip().replace("\N{MINUS SIGN}", "-").replace("\N{NO-BREAK SPACE}", " ")
    if decimal == ",":
        # A point is then no decimal sign, and a number with one is no number.
        return text.replace(".", "?").replace(",", ".")
    return text


def _is_value(cell: str, decimal: str) -> bool:
    # A date before a clock has points in it.
    clock = _CLOCK.fullmatch(cell.strip().replace(",", "."))
    return bool(clock or _NUMBER.fullmatch(_plain(cell, decimal)))


def _told(row: Sequence[str], decimal: str) -> int:
    return sum(_is_value(cell, decimal) for cell in row)


def _width(split: Sequence[Sequence[str]], decimal: str) -> int:
    widths = Counter(len(row) for row in split if _told(row, decimal) >= 1 and len(row) > 1)
    return widths.most_common(1)[0][0] if widths else 0


def _sense(split: Sequence[Sequence[str]], decimal: str) -> float:
    """Score a reading: rows with a clock and a number, less cells that are neither."""
    width = _width(split, decimal)
    if width < 2:
        return 0.0
    rows = [row for row in split if len(row) == width]
    good = [_told(row, decimal) for row in rows]
    odd = sum(sum(bool(cell.strip()) for cell in row) - n for row, n in zip(rows, good, strict=True))
    return sum(n >= 2 for n in good) - 0.1 * odd / width - 0.001 * width


def _clock_column(table: _Table) -> int:
    """Return the column of the clock: times of the day, else what is headed so, else what rises."""
    width = len(table.headings)
    columns = [[row[i] for row in table.rows] for i in range(width)]
    by_clock = [
        sum(bool(_CLOCK.fullmatch(c.strip().replace(",", "."))) for c in column) for column in columns
    ]
    if max(by_clock) > 0.5 * len(table.rows):
        return int(np.argmax(by_clock))
    rising = [i for i in range(width) if _rises(columns[i], table.decimal)]
    named = [i for i in rising if _TIMES.match(table.headings[i]) or clock_unit(table.headings[i])]
    plain = [i for i in rising if not _COUNTERS.fullmatch(table.headings[i])]
    for choice in (named, plain, rising):
        if choice:
            return choice[0]
    raise ValueError("has no column that could be its clock: none rises from row to row")


def _rises(cells: Sequence[str], decimal: str) -> bool:
    numbers = [float(m[1]) for c in cells if (m := _NUMBER.fullmatch(_plain(c, decimal)))]
    return (
        len(numbers) > 0.5 * len(cells)
        and bool(np.mean(np.diff(numbers) >= 0) > 0.98)
        and numbers[-1] > numbers[0]
    )


def _probe_column(table: _Table, clock: int, column: str | None) -> int:
    """Return the column of the probe."""
    numeric = [
        i
        for i in range(len(table.headings))
        if i != clock
        and not _COUNTERS.fullmatch(table.headings[i])
        and sum(bool(_NUMBER.fullmatch(_plain(r[i], table.decimal))) for r in table.rows)
        > 0.2 * len(table.rows)
    ]
    names = {i: table.headings[i].strip() or f"column {i + 1}" for i in numeric}
    if column is not None:
        short = {i: re.sub(r"\s*[\[(].*", "", name) for i, name in names.items()}
        for i in numeric:
            if column in (names[i], short[i], str(i + 1)):
                return i
        raise ValueError(unknown("column", column, short.values()))
    if not numeric:
        raise ValueError("has a clock but no column of temperatures")
    if len(numeric) > 1:
        raise ValueError(
            f"has several columns that may be the probe: {', '.join(names.values())}; add --column"
        )
    return numeric[0]


def _rising(times: Array, values: Array) -> tuple[Array, Array]:
    """Average rows of the same time; refuse a clock that runs backwards."""
    back = np.flatnonzero(np.diff(times) < 0)
    if len(back):
        raise ValueError(
            f"runs backwards: {len(back)} rows come before the row above them, such as row {back[0] + 2}"
        )
    unique, where, counts = np.unique(times, return_inverse=True, return_counts=True)
    return unique, np.bincount(where, weights=values) / counts
