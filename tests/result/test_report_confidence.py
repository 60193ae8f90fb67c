"""How sure the answer is, as the report says it: error, range, estimates, and what the time hangs on."""

from __future__ import annotations

import copy
import json
import re
import shutil
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from fem.errors import CaseError
from fem.result import advice, numbers, range_pictures
from fem.result.answer import details, duration, input_names, ranking, span
from fem.result.confidence import answers, doubt
from fem.result.contents import read_contents
from fem.result.folder import open_run
from fem.result.maps import NoMaps, last_frame
from fem.result.report import write_report
from fem.run import run
from tests.pieces import small


@pytest.fixture(scope="module")
def finished(tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("runs") / "small"
    run(small("aim.within=8 min"), folder)
    return folder


@pytest.fixture
def folder(finished: Path, tmp_path: Path) -> Path:
    return shutil.copytree(finished, tmp_path / "run")


@pytest.fixture
def summary(finished: Path) -> dict[str, Any]:
    return copy.deepcopy(open_run(finished).summary)


def page_of(folder: Path) -> str:
    return write_report(folder).read_text(encoding="utf-8").replace("\N{NO-BREAK SPACE}", " ")


def alter(folder: Path, edit: Callable[[dict[str, Any]], None]) -> None:
    path = folder / "summary.json"
    found = json.loads(path.read_text())
    edit(found)
    path.write_text(json.dumps(found), encoding="utf-8")


def test_the_three_answers_carry_the_numbers_of_the_run(finished: Path, summary: dict[str, Any]) -> None:
    ours, likely, estimate = answers(summary)
    assert ours.value == duration(summary["aim"]["time_s"])
    assert ours.beside == f"± {summary['numerical_error']['time_s']:.2g} s"
    spread = summary["uncertainty"]["time_s"]
    assert likely.value == span(spread["low"], spread["high"]).replace("-", " to ")
    assert likely.notes[-1] == f"most of all: {summary['uncertainty']['inputs'][0]['words']}"
    poisson = next(e for e in summary["estimates"] if e["method"] == "Poisson")
    assert estimate.value == duration(poisson["time_s"])
    assert estimate.notes == [
        f"the run takes {poisson['ratio']:.2f} of it, 0.85 to 1.15 is allowed: they agree"
    ]
    page = page_of(finished)
    for answer in (ours, likely, estimate):
        assert f"<dd>{answer.value} <span>{answer.beside}</span></dd>" in page


@pytest.mark.parametrize(
    ("within", "said"),
    [
        (500.0, "even its late end keeps the 8.3 min given"),
        (420.0, "the 7 min given lie inside it: kept at its early end, missed by 60 s at its late end"),
        (300.0, "even its early end is past the 5 min given"),
    ],
)
def test_the_time_given_is_held_against_both_ends(summary: dict[str, Any], within: float, said: str) -> None:
    summary["uncertainty"]["time_s"] = {"low": 360.0, "likely": 400.0, "high": 480.0}
    summary["aim"]["within_s"] = within
    assert doubt(summary) == said


def test_an_estimate_outside_its_range_or_its_band_is_not_said_to_agree(summary: dict[str, Any]) -> None:
    (poisson,) = (e for e in summary["estimates"] if e["method"] == "Poisson")
    poisson["ratio"] = 1.4
    assert "they disagree" in answers(summary)[2].notes[0]
    for estimate in summary["estimates"]:
        estimate["in_range"] = False
    assert "out of its range here" in answers(summary)[2].notes[0]
    summary["estimates"] = [e for e in summary["estimates"] if e["method"] == "Plank"]
    assert answers(summary)[2].value == "–"


def test_the_chart_ranks_the_inputs_with_values_and_words(summary: dict[str, Any]) -> None:
    svg = range_pictures.effects(summary)
    inputs = summary["uncertainty"]["inputs"]
    places = [
        svg.index(f"{name} ± {e['half_width']}") for name, e in zip(input_names(inputs), inputs, strict=True)
    ]
    assert places == sorted(places)
    widths = [e["effect_of_more_s"] - e["effect_of_less_s"] for e in inputs]
    assert np.all(np.diff(np.abs(widths)) <= 0.0)
    for entry in inputs:
        assert f">{entry['words']}<" in svg
    for value in (inputs[0]["effect_of_less_s"], inputs[0]["effect_of_more_s"]):
        assert f">{value:+.0f}<".replace("-", "−") in svg


def test_the_band_shows_both_ends_the_estimates_and_the_time_given(summary: dict[str, Any]) -> None:
    svg = range_pictures.times(summary)
    spread = summary["uncertainty"]["time_s"]
    for text in (f"{spread['low'] / 60:.3g}", f"{spread['high'] / 60:.3g}", "8 min given"):
        assert f">{text}<" in svg
    for estimate in summary["estimates"]:
        assert f"{estimate['method']}  {duration(estimate['time_s'])}" in re.sub(r"\s\s", "  ", svg)


def test_a_derivative_that_could_not_be_taken_is_said(summary: dict[str, Any]) -> None:
    for entry, missing in zip(summary["uncertainty"]["inputs"][:2], (float("nan"), None), strict=True):
        entry["effect_of_less_s"] = entry["effect_of_more_s"] = missing
    assert range_pictures.effects(summary).count(">not known<") == 2
    assert ranking(summary)[0][2] == "#"


def test_inputs_of_one_name_are_told_apart_on_the_page_and_on_the_terminal(summary: dict[str, Any]) -> None:
    first = summary["uncertainty"]["inputs"][0]
    summary["uncertainty"]["inputs"].insert(1, {**first, "key": "stages.hold.surfaces.outside.h"})
    svg = range_pictures.effects(summary)
    for name in ("agitation (freeze)", "agitation (hold)"):
        assert f"{name} ± 30 %" in svg
        assert name in [row[0] for row in ranking(summary)]


def test_half_widths_stand_in_the_table_of_stage_ends(finished: Path, summary: dict[str, Any]) -> None:
    (width,) = summary["uncertainty"]["stages"]
    (row,) = numbers.stages(summary)
    # The stage lasts as long as it was told to.
    assert row["ended_half"] == ""
    assert row["slowest_half"] == f"± {width['slowest_degC_half_width']:.1f}"
    assert row["mean_half"] == f"± {width['mean_degC_half_width']:.1f}"
    page = page_of(finished)
    assert f"<small>± {width['heat_removed_J_half_width'] / 1e3:.2f}</small>" in page
    assert f"numerical error {summary['numerical_error']['heat_removed_J']:.2g}&nbsp;J" in page


def test_what_ended_a_stage_has_no_half_width(summary: dict[str, Any]) -> None:
    summary["stages"][0]["why"] = "slowest <= -12 degC was reached"
    summary["uncertainty"]["stages"][0]["ended_s_half_width"] = 61.2
    (row,) = numbers.stages(summary)
    assert (row["slowest_half"], row["ended_half"]) == ("", "± 61 s")


def test_where_tangents_are_not_to_be_trusted_the_page_says_so(folder: Path) -> None:
    said = "the aim is barely reached: its time hangs on everything, and the range is rough"
    alter(folder, lambda s: s["uncertainty"]["remarks"].append(said))
    assert f'<p class="remark">{said}</p>' in page_of(folder)


def test_a_folder_from_before_these_keys_still_makes_a_page(folder: Path) -> None:
    def forget(found: dict[str, Any]) -> None:
        for key in ("uncertainty", "numerical_error", "estimates"):
            del found[key]

    alter(folder, forget)
    page = page_of(folder)
    assert 'class="answers"' not in page
    assert "<dt>time to the aim</dt>" in page
    assert "what the time hangs on: this run carried none along" in page
    assert page.count("<figure>") == 6


def test_an_aim_that_was_not_reached_has_no_range(tmp_path: Path) -> None:
    run(small("stages.freeze.lasts=60 s", "aim.within=50 s"), tmp_path / "run")
    page = page_of(tmp_path / "run")
    assert "does not reach" in page
    assert 'class="answers"' not in page
    assert "<h2>What the time hangs on" not in page


def put(path: str, value: Any) -> Callable[[dict[str, Any]], None]:
    def edit(found: dict[str, Any]) -> None:
        *way, last = (int(part) if part.isdigit() else part for part in path.split("."))
        for part in way:
            found = found[part]  # type: ignore[index]
        found[last] = value  # type: ignore[index]

    return edit


BROKEN = {
    "no object": ("uncertainty", [], "uncertainty has to be an object, found []"),
    "no list": ("uncertainty.inputs", "h", 'uncertainty.inputs has to be a list, found "h"'),
    "a word": (
        "uncertainty.inputs.0.effect_of_less_s",
        "much",
        'uncertainty.inputs.0.effect_of_less_s has to be a number, found "much"',
    ),
    "no name": ("uncertainty.inputs.0.name", None, "uncertainty.inputs.0.name has to be a text, found None"),
    "too many": (
        "uncertainty.inputs",
        [
            {
                "key": "a.b",
                "name": "b",
                "half_width": "1 %",
                "effect_of_less_s": 1.0,
                "effect_of_more_s": 1.0,
                "words": "b",
            }
        ]
        * 99,
        "uncertainty.inputs has to be a list of at most 60",
    ),
    "half a range": ("uncertainty.time_s", {"low": 1.0, "likely": 2.0}, "uncertainty.time_s.high is missing"),
    "upside down": (
        "uncertainty.time_s",
        {"low": 9.0, "likely": 2.0, "high": 1.0},
        "uncertainty.time_s.low has to be at most its high",
    ),
    "not finite": (
        "uncertainty.time_s.high",
        float("inf"),
        "uncertainty.time_s.high has to be a finite number, found inf",
    ),
    "below 0": (
        "uncertainty.stages.0.mean_degC_half_width",
        -1.0,
        "uncertainty.stages.0.mean_degC_half_width has to be 0 or above, found -1.0",
    ),
    "remarks": ("uncertainty.remarks", [3], "uncertainty.remarks.0 has to be a text, found 3"),
    "error": ("numerical_error.time_s", "small", 'numerical_error.time_s has to be a number, found "small"'),
    "error is a number": ("numerical_error", 2.0, "numerical_error has to be an object, found 2.0"),
    "negative error": ("numerical_error.time_s", -2.0, "numerical_error.time_s has to be 0 or above"),
    "ratio": ("estimates.0.ratio", "good", 'estimates.0.ratio has to be a number, found "good"'),
    "band": ("estimates.0.band", [1.0], "estimates.0.band has to be two numbers, found [1.0]"),
    "what to remark": ("estimates.0.remarks", {}, "estimates.0.remarks has to be a list, found {}"),
}


@pytest.mark.parametrize("name", BROKEN)
def test_what_was_changed_by_hand_gets_one_plain_sentence(folder: Path, name: str) -> None:
    place, value, said = BROKEN[name]
    alter(folder, put(place, value))
    with pytest.raises(CaseError) as caught:
        write_report(folder)
    assert [problem.place for problem in caught.value.problems] == ["summary.json"]
    assert caught.value.problems[0].message.startswith(said)
    assert "\n" not in caught.value.problems[0].message


@pytest.mark.parametrize(
    ("place", "value"),
    [
        ("uncertainty.time_s", {"low": 0.0, "likely": 0.0, "high": 0.0}),
        ("uncertainty.time_s", {"low": -1e12, "likely": 0.0, "high": 1e12}),
        ("uncertainty.inputs", []),
        ("uncertainty.inputs.0.effect_of_less_s", 1e12),
        ("uncertainty.inputs.0.words", "$\\frac$ <b> 氷 " * 40),
        ("uncertainty.inputs.0.key", ""),
        ("uncertainty.stages", []),
        ("numerical_error.time_s", None),
        ("numerical_error.time_s", 1e12),
        ("estimates.0.time_s", 0.0),
        ("estimates.0.time_s", -5.0),
        ("estimates.2.time_s", 1e12),
        ("estimates.2.band", [0.0, 0.0]),
        ("aim.time_s", 0.0),
    ],
)
def test_odd_values_of_the_right_kind_still_make_a_page(folder: Path, place: str, value: Any) -> None:
    alter(folder, put(place, value))
    assert "<figure>" in page_of(folder)


def test_terminal_and_page_give_the_same_cautions_and_the_same_costs(finished: Path) -> None:
    contents = read_contents(finished)
    on_terminal = [text for label, text in details(contents.summary) if label == "caution"]
    on_page = advice.cautions(contents, -20.0)
    assert [text.rstrip(".").lower() for text in on_page[: len(on_terminal)]] == [
        t.lower() for t in on_terminal
    ]
    assert on_terminal
    by_key = {e["key"].rsplit(".", 1)[1]: e for e in contents.summary["uncertainty"]["inputs"]}
    said = " ".join(advice.checks(contents))
    for key, word, which in (
        ("h", "less", "effect_of_less_s"),
        ("coolant", "warmer", "effect_of_more_s"),
        ("thickness", "more", "effect_of_more_s"),
    ):
        assert f"{by_key[key]['half_width']} {word} costs {by_key[key][which]:.0f} s" in said
    for of_the_trade_at_large in ("factor of 1.5", "about 12 % near", "half a millimetre"):
        assert of_the_trade_at_large not in said
    assert "the late end of the likely range misses the time given by" in said


@pytest.fixture(scope="module")
def one_file(tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("runs") / "hdf"
    run(small("aim.within=8 min", "watch.fields=vtkhdf"), folder, numerical_error=False)
    return folder


def test_a_run_with_all_its_frames_in_one_file_has_the_same_maps(finished: Path, one_file: Path) -> None:
    ours, other = last_frame(one_file), last_frame(finished)
    assert not (one_file / "fields.pvd").exists()
    assert (ours.time, ours.names, ours.frozen_through) == (other.time, other.names, other.frozen_through)
    for name in ("points", "triangles", "region", "outline"):
        assert np.array_equal(getattr(ours, name), getattr(other, name))
    assert ours.values.keys() == other.values.keys()
    for name, values in ours.values.items():
        assert np.array_equal(values, other.values[name], equal_nan=True)
    assert "Left out" not in page_of(one_file)


@pytest.mark.parametrize("left", [0, 100, 5000, -2000])
def test_one_file_that_is_cut_short_leaves_out_the_maps_and_says_why(
    one_file: Path, tmp_path: Path, left: int
) -> None:
    folder = shutil.copytree(one_file, tmp_path / "run")
    path = folder / "fields.vtkhdf"
    path.write_bytes(path.read_bytes()[:left])
    page = page_of(folder)
    assert "Maps: fields.vtkhdf cannot be read: it is cut short or damaged." in page
    assert page.count("<figure>") == 5


def test_one_file_without_its_library_leaves_out_the_maps_and_says_what_to_install(
    one_file: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr("fem.result.maps.find_spec", lambda name: None)
    with pytest.raises(NoMaps, match=r"needs h5py to be read \(pip install"):
        last_frame(one_file)
