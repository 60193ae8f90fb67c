"""Which part of a probe's log says something, and what: times at temperatures, each with its weight.

Used are the first cooling, above the freezing point, and the descent after the plateau. Left out
are what came before the pour, the plateau itself, a supercooling dip with its recalescence, and
all that came after the probe left the mix.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.ndimage import median_filter

from fem.curve import Array
from fem.series.probe import ProbeLog

MARGIN = 0.5
"""Distance kept from the plateau and from the fill temperature [K]."""
DOWN_TO = -8.0
"""Coldest level that counts [degC]: below it the conductivity of frozen mix rules (common practice)."""
BINS = 12
"""Groups of rows that a stretch is divided into."""
FEWEST = 6
FINEST = 0.02  # no thermocouple is better than this [K]
JUMP = 3.0  # a probe that leaves the mix sees at least this at once [K]


@dataclass(frozen=True, eq=False)
class TimesAt:
    """Times at temperatures.

    Parameters
    ----------
    times
        On the log's clock [s], shape (k,).
    temperatures
        [degC], shape (k,).
    noise
        Standard deviation of each temperature [K], shape (k,).

    """

    times: Array
    temperatures: Array
    noise: Array

    def __add__(self, other: TimesAt) -> TimesAt:
        both = zip(self._columns(), other._columns(), strict=True)
        return TimesAt(*(np.concatenate(pair) for pair in both))

    def _columns(self) -> tuple[Array, Array, Array]:
        return self.times, self.temperatures, self.noise


@dataclass(frozen=True, eq=False)
class Stretches:
    """What of a log is used.

    Parameters
    ----------
    cooling, freezing
        Times at temperatures before and after the plateau.
    plateau
        Temperature of the plateau [degC]; None where there is none to see.
    remarks
        What was left out and why, in sentences.

    """

    cooling: TimesAt
    freezing: TimesAt
    plateau: float | None
    remarks: tuple[str, ...]


def stretches(
    log: ProbeLog, freezing_point: float, start: float, coldest: float, down_to: float | None = None
) -> Stretches:
    """Find what of a log can be used.

    Parameters
    ----------
    log
        As read.
    freezing_point, start, coldest
        Of the mix, at the fill, and of the coolant [degC].
    down_to
        Coldest level that counts [degC]; by default -8 degC, or 5 K below the freezing point.

    Raises
    ------
    ValueError
        Where nothing is left; says what the log shows instead.

    """
    remarks = list(log.remarks)
    noise = _noise(log.temperatures)
    times, T = _without_spikes(log.times, log.temperatures, noise, remarks)
    smooth = median_filter(T, _window(len(T)), mode="nearest")
    left = _left_the_mix(times, smooth, freezing_point)
    if left is not None:
        remarks.append(f"{log.name} is cut at {times[left]:.0f} s, where the probe left the mix")
        times, T, smooth = times[:left], T[:left], smooth[:left]
    if smooth.min() > freezing_point - 2 * MARGIN:
        raise ValueError(
            f"goes down to {smooth.min():.1f} degC only: nothing has frozen at the probe, whose mix freezes "
            f"from {freezing_point:.1f} degC"
        )
    end = int(np.argmin(smooth))
    plateau = _plateau(times[: end + 1], smooth[: end + 1], freezing_point)
    upper = min(freezing_point, plateau if plateau is not None else freezing_point) - MARGIN
    begin = _after_the_plateau(smooth, end, upper, noise, remarks, log.name)
    lower = min(DOWN_TO, freezing_point - 5.0) if down_to is None else down_to
    below = np.flatnonzero(smooth[begin:end] < max(lower, coldest + 1.5))
    stop = begin + int(below[0]) if len(below) else end + 1
    if stop - begin < FEWEST:
        raise ValueError(
            f"holds {stop - begin} rows between {upper:.1f} degC and its coldest, after the plateau; "
            f"{FEWEST} at least are needed"
        )
    freezing = _times_at(times[begin:stop], T[begin:stop], noise)
    cooling = _first_cooling(times[:begin], T[:begin], smooth[:begin], freezing_point, start, noise)
    return Stretches(cooling, freezing, plateau, tuple(remarks))


def _window(rows: int) -> int:
    return int(np.clip(rows // 100, 5, 31)) | 1


def _noise(T: Array) -> float:
    """Return the scatter of single readings [K], from second differences: slow changes drop out."""
    bend = np.abs(np.diff(T, 2))
    return max(1.4826 * float(np.median(bend)) / np.sqrt(6.0), FINEST)


def _without_spikes(times: Array, T: Array, noise: float, remarks: list[str]) -> tuple[Array, Array]:
    far = np.abs(T - median_filter(T, 5, mode="nearest")) > max(6.0 * noise, 1.5)
    if far.any():
        remarks.append(f"{int(far.sum())} single readings stand far from their neighbours and are left out")
    return times[~far], T[~far]


def _left_the_mix(times: Array, smooth: Array, freezing_point: float) -> int | None:
    """Return the row at which the temperature jumps for good, or None.

    A jump up to the freezing point is recalescence; one across a gap may be anything.
    """
    frozen = np.flatnonzero(smooth < freezing_point - MARGIN)
    if not len(frozen):
        return None
    step, size = np.diff(times), np.diff(smooth)
    usual = float(np.median(np.abs(size[np.abs(size) > 0]))) if np.any(size) else 0.0
    close = step < 5.0 * np.median(step)
    to_air = (smooth[1:] > freezing_point + 1.0) & (smooth[:-1] < freezing_point)
    jumps = close & (np.abs(size) > max(JUMP, 8.0 * usual)) & ((size < 0) | to_air)
    found = np.flatnonzero(jumps & (np.arange(len(size)) >= frozen[0]))
    return int(found[0]) - 1 if len(found) else None


def _plateau(times: Array, smooth: Array, freezing_point: float) -> float | None:
    """Return the temperature near the freezing point at which the log stays longest [degC]."""
    edges = np.arange(freezing_point - 4.0, freezing_point + 2.0, 0.25)
    spent, _ = np.histogram(smooth[1:], edges, weights=np.diff(times))
    longest = int(np.argmax(spent))
    if spent[longest] < 0.1 * (times[-1] - times[0]):
        return None
    inside = (smooth >= edges[longest]) & (smooth <= edges[longest + 1])
    return float(np.median(smooth[inside]))


def _after_the_plateau(
    smooth: Array, end: int, upper: float, noise: float, remarks: list[str], name: str
) -> int:
    """Return the row after which the temperature falls for good."""
    above = np.flatnonzero(smooth[: end + 1] > upper)
    begin = int(above[-1]) + 1 if len(above) else 0
    early = np.flatnonzero(smooth[:begin] < upper - max(MARGIN, 4.0 * noise))
    if len(early):
        remarks.append(f"{name} dips to {smooth[early].min():.1f} degC before it freezes: left out")
    # A plateau that is colder than the case's freezing point shows as a rise further on.
    rise = smooth[begin : end + 1] - np.minimum.accumulate(smooth[begin : end + 1])
    if len(rise) and rise.max() > max(1.0, 5.0 * noise):
        last = int(np.flatnonzero(rise > max(1.0, 5.0 * noise))[-1])
        remarks.append(f"{name} rises once more after it began to freeze: what comes before is left out")
        begin += last + 1
    return begin


def _first_cooling(
    times: Array, T: Array, smooth: Array, freezing_point: float, start: float, noise: float
) -> TimesAt:
    """Return the times above the freezing point, after the pour."""
    nothing = TimesAt(*(np.empty(0) for _ in range(3)))
    cold = np.flatnonzero(smooth < freezing_point + MARGIN)
    end = int(cold[0]) if len(cold) else 0
    warm = np.flatnonzero(smooth[:end] > start - MARGIN - noise)
    begin = int(warm[-1]) + 1 if len(warm) else 0
    if end - begin < FEWEST or smooth[begin] - smooth[end - 1] < 2 * MARGIN:
        return nothing
    return _times_at(times[begin:end], T[begin:end], noise)


def _times_at(times: Array, T: Array, noise: float) -> TimesAt:
    """Sum up rows as few times at temperatures, whose errors are independent."""
    gaps = np.flatnonzero(np.diff(times) > 5.0 * np.median(np.diff(times))) + 1
    found = []
    for run in np.split(np.arange(len(times)), gaps):
        bins = max(1, min(len(run) // 4, round(BINS * len(run) / len(times))))
        found += [_two_nodes(times[rows], T[rows], noise) for rows in np.array_split(run, bins)]
    pairs = found[0]
    for other in found[1:]:
        pairs = pairs + other
    return pairs


def _two_nodes(times: Array, T: Array, noise: float) -> TimesAt:
    """Return a straight fit's values where they are right for a parabola too, and independent.

    Those are the two zeros of the quadratic that is orthogonal over the rows, the nodes of
    Gauss's rule: there the line and the parabola of least squares meet.
    """
    middle = times.mean()
    t = times - middle
    spread = float(np.mean(t**2))
    if len(times) < 3 or spread == 0.0:
        return TimesAt(np.array([middle]), np.array([T.mean()]), np.array([noise / np.sqrt(len(times))]))
    slope = float(np.mean(t * T)) / spread
    half_skew = 0.5 * float(np.mean(t**3)) / spread
    root = np.sqrt(half_skew**2 + spread)
    nodes = np.array([half_skew - root, half_skew + root])
    shares = nodes[::-1] / (nodes[::-1] - nodes)
    return TimesAt(middle + nodes, T.mean() + slope * nodes, noise / np.sqrt(len(times) * shares))
