from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from fem.errors import CaseError
from fem.series.probe import ProbeLog, read_log
from fem.series.stretch import stretches

N = 40
SECONDS = np.arange(N) * 5.0
CELSIUS = np.linspace(4.0, -15.5, N)
BOUNDS = (-22.0, -1.27)


def written(tmp_path: Path, text: str, encoding: str = "utf-8") -> Path:
    path = tmp_path / "probe.csv"
    path.write_bytes(text.encode(encoding))
    return path


def rows(line: str) -> str:
    """Return a line for each reading; `line` names s and T, F, K."""
    return "\n".join(
        line.format(
            s=s,
            T=T,
            F=1.8 * T + 32.0,
            K=T + 273.15,
            comma=f"{T:.2f}".replace(".", ","),
            min=s / 60.0,
            clock=f"{23 + int(3580 + s) // 3600:02d}".replace("24", "00")
            + f":{int(3580 + s) % 3600 // 60:02d}:{int(s + 3580) % 60:02d}",
            n=i,
        )
        for i, (s, T) in enumerate(zip(SECONDS, CELSIUS, strict=True))
    )


# The ways in which loggers write the same readings: common practice, no source.
LAYOUTS = {
    "commas": "time [s],core [degC]\n" + rows("{s:g},{T:.3f}"),
    "semicolons and decimal commas": "Zeit [s];Kern [°C]\n" + rows("{s:g};{comma}"),
    "tabs, minutes": "t (min)\tT (C)\n" + rows("{min:.6f}\t{T:.3f}"),
    "fahrenheit": "Time (s),Temp (°F)\n" + rows("{s:g},{F:.3f}"),
    "fahrenheit that is not said": "time [s],probe\n" + rows("{s:g},{F:.3f}"),
    "kelvin that is not said": "time [s],probe\n" + rows("{s:g},{K:.3f}"),
    "clocks past midnight": "clock,T [degC]\n" + rows("{clock},{T:.3f}"),
    "dates and clocks": "when;T [degC]\n" + rows("01.02.2024 {clock};{comma}"),
    "a preamble and counters": "Logger 7\nSerial;123\n\nNo;time [s];T [degC]\n" + rows("{n};{s:g};{T:.3f}"),
    "no headings": rows("{s:g} {T:.3f}"),
    "units in cells": "time,T\n" + rows("{s:g} ,{T:.3f} °C"),
}


@pytest.mark.parametrize("layout", LAYOUTS)
def test_every_layout_gives_the_same_readings(tmp_path: Path, layout: str) -> None:
    log = read_log(written(tmp_path, LAYOUTS[layout]), bounds=BOUNDS)
    np.testing.assert_allclose(log.times, SECONDS, atol=2e-3)
    np.testing.assert_allclose(log.temperatures, CELSIUS, atol=6e-3)


@pytest.mark.parametrize("encoding", ["utf-8-sig", "utf-16", "cp1252"])
def test_encodings_of_spreadsheets_are_read(tmp_path: Path, encoding: str) -> None:
    text = LAYOUTS["semicolons and decimal commas"]
    log = read_log(written(tmp_path, text, encoding), bounds=BOUNDS)
    np.testing.assert_allclose(log.temperatures, CELSIUS, atol=6e-3)


def test_a_unit_that_is_guessed_is_said(tmp_path: Path) -> None:
    log = read_log(written(tmp_path, LAYOUTS["fahrenheit that is not said"]), bounds=BOUNDS)
    assert any("read as degF" in remark for remark in log.remarks)


def test_blank_cells_and_open_thermocouples_are_left_out(tmp_path: Path) -> None:
    lines = LAYOUTS["commas"].splitlines()
    lines[5], lines[9], lines[20], lines[21] = "20,", "40,nan", "95,1372.0", "100,---"
    log = read_log(written(tmp_path, "\n".join(lines)), bounds=BOUNDS)
    assert len(log.times) == N - 4
    assert 20.0 not in log.times
    assert any("4 of 40 rows" in remark for remark in log.remarks)


def test_a_column_is_chosen_by_its_name(tmp_path: Path) -> None:
    text = "time [s];core [degC];edge [degC]\n" + rows("{s:g};{T:.3f};-9.0")
    path = written(tmp_path, text)
    with pytest.raises(CaseError, match=r"several columns.*core.*edge.*--column"):
        read_log(path)
    np.testing.assert_allclose(read_log(path, "core").temperatures, CELSIUS, atol=6e-3)
    with pytest.raises(CaseError, match='did you mean "edge'):
        read_log(path, "edg")


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("", "is empty"),
        ("hello\nworld\n", "no rows of a time and a temperature"),
        ("time [s],T [degC]\n0,4\n5,3\n", "12 at least"),
        ("time,T [degC]\n" + "\n".join(f"14:{i:02d},{4 - i / 4}" for i in range(30)), "hh:mm"),
        ("time [s],T [degC]\n" + "\n".join(f"{(i * 7) % 60},{4 - i / 4}" for i in range(40)), "clock"),
        ("time [s],T\n" + "\n".join(f"{i},{500 + i}" for i in range(40)), "no unit of temperature"),
        ("time,T\n" + "\n".join(f"{i},5,{4 - i // 9},{i % 9}" for i in range(40)), "decimal commas"),
    ],
)
def test_bad_logs_end_in_one_sentence(tmp_path: Path, text: str, said: str) -> None:
    path = written(tmp_path, text)
    with pytest.raises(CaseError) as caught:
        read_log(path, bounds=BOUNDS)
    assert said in str(caught.value)
    assert len(caught.value.problems) == 1
    assert "\n" not in caught.value.problems[0].message


def test_a_file_that_is_not_there_or_no_text_is_said(tmp_path: Path) -> None:
    with pytest.raises(CaseError, match="cannot be read"):
        read_log(tmp_path / "nothing.csv")
    (tmp_path / "probe.csv").write_bytes(bytes(range(256)) * 4)
    with pytest.raises(CaseError, match="no text"):
        read_log(tmp_path / "probe.csv")


def trace(noise: float = 0.1, seed: int = 0, **changes: float) -> ProbeLog:
    """Return a log with air, pour, cooling, plateau and descent, 2 s apart."""
    corners = {0: 20.0, 40: 20.0, 42: 4.0, 60: 3.9, 200: -1.0, 600: -1.4, 660: -3.0, 760: -12.0, 1000: -20.0}
    corners |= {int(time): value for time, value in ((k[1:], v) for k, v in changes.items())}
    times = np.arange(0.0, 1000.0, 2.0)
    T = np.interp(times, sorted(corners), [corners[k] for k in sorted(corners)])
    T += np.random.default_rng(seed).normal(0.0, noise, len(T))
    return ProbeLog("trace", Path("trace.csv"), times, T, 0.0)


def test_the_first_cooling_and_the_descent_after_the_plateau_are_used() -> None:
    found = stretches(trace(), -1.3, 4.0, -22.0)
    assert found.plateau == pytest.approx(-1.2, abs=0.2)
    assert 60.0 < found.cooling.times.min() < found.cooling.times.max() < 200.0
    assert 600.0 < found.freezing.times.min() < found.freezing.times.max() < 730.0
    assert found.freezing.temperatures.min() > -8.3


def test_a_supercooling_dip_is_left_out_and_said() -> None:
    # Liquid down to -6 degC, then recalescence to the plateau within 4 s.
    found = stretches(trace(t300=-6.0, t304=-1.3), -1.3, 4.0, -22.0)
    assert found.freezing.times.min() > 600.0
    assert any("dips to -5" in r or "dips to -6" in r for r in found.remarks)


def test_a_probe_that_leaves_the_mix_cuts_the_log() -> None:
    log = trace(t720=-8.4, t722=15.0, t1000=20.0)
    found = stretches(log, -1.3, 4.0, -22.0)
    assert found.freezing.times.max() < 721.0
    assert any("left the mix" in r for r in found.remarks)


def test_a_gap_is_bridged_by_no_time() -> None:
    whole = trace()
    keep = (whole.times < 640.0) | (whole.times > 690.0)
    log = ProbeLog("gap", Path("gap.csv"), whole.times[keep], whole.temperatures[keep], 0.0)
    found = stretches(log, -1.3, 4.0, -22.0)
    assert not np.any((found.freezing.times > 640.0) & (found.freezing.times < 690.0))
    assert np.any(found.freezing.times > 690.0)


def test_a_log_without_freezing_says_how_cold_it_got() -> None:
    log = trace()
    log = ProbeLog("warm", Path("warm.csv"), log.times[:100], log.temperatures[:100], 0.0)
    with pytest.raises(ValueError, match="nothing has frozen at the probe"):
        stretches(log, -1.3, 4.0, -22.0)


def test_pairs_of_a_parabola_lie_on_it_and_their_errors_are_independent() -> None:
    from fem.series.stretch import _two_nodes

    times = np.sort(np.random.default_rng(5).uniform(0.0, 30.0, 17))
    exact = lambda t: 2.0 - 0.1 * t - 0.004 * t**2  # noqa: E731
    pair = _two_nodes(times, exact(times), 0.2)
    np.testing.assert_allclose(pair.temperatures, exact(pair.times), rtol=1e-12)
    draws = np.random.default_rng(6).normal(0.0, 0.2, (4000, len(times)))
    found = np.array([_two_nodes(times, exact(times) + d, 0.2).temperatures for d in draws])
    np.testing.assert_allclose(found.std(axis=0), pair.noise, rtol=0.05)
    assert abs(np.corrcoef(found.T)[0, 1]) < 0.05
