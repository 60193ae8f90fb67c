from __future__ import annotations

import json
import re
import resource
import shutil
import subprocess
import sys
from collections.abc import Callable
from html.parser import HTMLParser
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from fem.case.read import load
from fem.errors import CaseError
from fem.result import advice, map_pictures, pictures
from fem.result.contacts import contacts
from fem.result.contents import read_contents
from fem.result.folder import open_run
from fem.result.maps import NoMaps, last_frame
from fem.result.page import typeset
from fem.result.report import write_report
from fem.run import run
from tests.pieces import SMALL, small


@pytest.fixture(scope="module")
def finished(tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("runs") / "small"
    run(small("aim.within=10 min"), folder)
    return folder


@pytest.fixture
def folder(finished: Path, tmp_path: Path) -> Path:
    return shutil.copytree(finished, tmp_path / "run", ignore=shutil.ignore_patterns("report.html"))


def change(folder: Path, **keys: Any) -> None:
    path = folder / "summary.json"
    path.write_text(json.dumps(json.loads(path.read_text()) | keys), encoding="utf-8")


def page_of(folder: Path) -> str:
    return write_report(folder).read_text(encoding="utf-8")


class Outline(HTMLParser):
    """Tags, addresses, texts of pictures and headings of a page."""

    def __init__(self, page: str):
        super().__init__()
        self.tags: list[str] = []
        self.addresses: list[str] = []
        self.alts: list[str] = []
        self.headings: list[tuple[str, str]] = []
        self.language = ""
        self._open: list[str] = []
        self.feed(page)

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.tags.append(tag)
        if tag not in ("meta", "img", "link"):
            self._open.append(tag)
        for name, value in attrs:
            if name in ("src", "href", "action", "data", "srcset"):
                self.addresses.append(value or "")
            if name == "alt":
                self.alts.append(value or "")
            if tag == "html" and name == "lang":
                self.language = value or ""

    def handle_endtag(self, tag: str) -> None:
        assert self._open.pop() == tag

    def handle_data(self, data: str) -> None:
        if self._open and self._open[-1] in ("h1", "h2", "h3"):
            self.headings.append((self._open[-1], data.strip()))


def test_the_answer_comes_first_with_time_place_verdict_and_margin(finished: Path) -> None:
    summary = open_run(finished).summary
    first = Outline(page_of(finished)).headings[0]
    assert first[0] == "h1"
    minutes = f"{summary['aim']['time_s'] / 60:.1f}"
    text = first[1].replace("\N{NO-BREAK SPACE}", " ")
    assert text.startswith(
        f"The slowest point, at (0.0, 0.0) mm, reaches −12 °C after {minutes} min (likely "
    )
    margin = f"{100 * (1 - summary['aim']['time_s'] / 600):.0f} % to spare"
    assert text.endswith(f"; yes, 10 min is enough, {margin}; it hangs on agitation first.")


def test_the_page_is_whole_in_itself(finished: Path) -> None:
    page = Outline(page_of(finished))
    assert page.language == "en-GB"
    assert "script" not in page.tags
    assert all(address.startswith("data:") for address in page.addresses)
    assert page.tags.count("img") == 8
    assert len(page.alts) == 8
    assert all(len(alt) > 20 for alt in page.alts)
    assert [level for level, _ in page.headings].count("h1") == 1


def test_everything_that_a_meeting_asks_for_has_its_heading(finished: Path) -> None:
    text = [heading for _, heading in Outline(page_of(finished)).headings]
    wanted = (
        "The time and its estimates",
        "What the time hangs on",
        "Temperatures",
        "Fronts",
        "Heat, per piece",
        "Stage ends",
        "Heat removed and ledger",
        "Temperature",
    )
    wanted += ("Ice", "Local freezing time", "Estimates, beside the run", "Taken for granted, and validity")
    wanted += ("Cautions", "Check in the plant", "How it was made", "The case as run")
    assert [heading for heading in text if heading in wanted] == list(wanted)


def test_tables_show_the_numbers_of_the_run(finished: Path) -> None:
    summary, page = open_run(finished).summary, page_of(finished)
    stage = summary["stages"][0]
    for number in (stage["slowest_degC"], stage["mean_degC"]):
        assert f"<td>{number:.1f}<small>".replace("-", "−") in page
    assert f"<td>{100 * stage['ice']:.0f}</td>" in page
    for region in ("product", "wall"):
        assert f"<td>{summary['heat_J'][region] / 1e3:.2f}</td>" in page
    assert f"<td>{summary['heat_removed_J'] / 1e3:.2f}<small>± " in page


def test_it_works_on_a_folder_from_elsewhere_and_changes_only_its_page(folder: Path, tmp_path: Path) -> None:
    before = {p.name: p.read_bytes() for p in folder.iterdir() if p.is_file()}
    moved = shutil.move(folder, tmp_path / "last year" / "ünter.wegs" / "run")
    write_report(Path(moved))
    after = {p.name: p.read_bytes() for p in Path(moved).iterdir() if p.is_file()}
    assert after.keys() - before.keys() <= {"report.html"}
    assert all(after[name] == content for name, content in before.items() if name != "report.html")


def test_the_same_folder_gives_the_same_page(folder: Path, tmp_path: Path) -> None:
    assert page_of(folder) == write_report(folder, tmp_path / "again.html").read_text(encoding="utf-8")


def test_what_a_user_writes_stays_text(folder: Path) -> None:
    evil = "<script>alert(1)</script>"
    change(folder, title=evil, cautions=[f"{evil} & more"])
    (folder / "case.toml").write_text(f"# {evil}\n", encoding="utf-8")
    curves = (
        (folder / "curves.csv")
        .read_text()
        .replace("point.centre", f"point.{evil}$_x$")
        .replace("outside", evil)
    )
    (folder / "curves.csv").write_text(curves, encoding="utf-8")
    page = page_of(folder)
    assert "<script" not in page
    assert page.count("&lt;script&gt;alert(1)&lt;/script&gt;") >= 5


def test_estimates_stand_beside_the_run(folder: Path) -> None:
    own = open_run(folder).summary["aim"]["time_s"]
    change(
        folder,
        estimates=[
            {"method": "Plank", "time_s": 0.8 * own, "in_range": True, "remarks": ["a lower bound"]},
            {"method": "Pham", "time_s": 1.1 * own, "in_range": False, "remarks": "Bi = 0.01 is outside"},
        ],
    )
    page = page_of(folder)
    assert "<td>1.25</td><td>in range</td>" in page
    assert "<td>0.91</td><td>out of range</td>" in page
    assert "a lower bound" in page
    assert "Bi = 0.01 is outside" in page
    assert page.index(">Pham<") < page.index(">Plank<")
    assert "No estimates" not in page


def test_without_estimates_it_says_so(folder: Path) -> None:
    change(folder, estimates=[])
    assert "No estimates were made with this run." in page_of(folder)


def test_what_a_later_run_finds_is_shown_too(folder: Path) -> None:
    change(folder, range={"low_s": 300.0, "high_s": 540.0})
    page = page_of(folder).replace("\N{NO-BREAK SPACE}", " ")
    assert "<dt>range, low</dt><dd>5 min</dd>" in page
    assert "<dt>range, high</dt><dd>9 min</dd>" in page


@pytest.mark.parametrize("outcome", ["running", "failed", "interrupted"])
def test_a_run_that_did_not_finish_says_so_on_top(folder: Path, outcome: str) -> None:
    change(folder, outcome=outcome, why="the coolant ran out", stages=[])
    page = page_of(folder)
    assert page.index("the coolant ran out") < page.index("<figure")
    assert "The run is not complete" in page
    assert "No stage has ended yet" in page


def test_a_kill_leaves_half_a_row_and_the_page_still_stands(folder: Path) -> None:
    path = folder / "curves.csv"
    path.write_text(path.read_text()[:-7], encoding="utf-8")
    assert "Left out" not in page_of(folder)


def cut_fields(folder: Path) -> None:
    shutil.rmtree(folder / "fields")
    (folder / "fields.pvd").unlink()


def cut_frame(folder: Path) -> None:
    path = max((folder / "fields").iterdir())
    path.write_bytes(path.read_bytes()[: path.stat().st_size // 2])


def lose_frame(folder: Path) -> None:
    max((folder / "fields").iterdir()).unlink()


def garble_frame(folder: Path) -> None:
    path = max((folder / "fields").iterdir())
    path.write_text(path.read_text().replace("==eA", "==AA"), encoding="utf-8")


def lose_region(folder: Path) -> None:
    path = max((folder / "fields").iterdir())
    path.write_text(path.read_text().replace('Name="region"', 'Name="other"'), encoding="utf-8")


def leave_folder(folder: Path) -> None:
    path = folder / "fields.pvd"
    path.write_text(re.sub(r'file="[^"]*"', 'file="../../secret.vtu"', path.read_text()), encoding="utf-8")


def empty_index(folder: Path) -> None:
    (folder / "fields.pvd").write_text("<VTKFile/>", encoding="utf-8")


def halve_index(folder: Path) -> None:
    (folder / "fields.pvd").write_text("<VTKFile><Collection>", encoding="utf-8")


@pytest.mark.parametrize(
    ("damage", "why"),
    [
        (cut_fields, "neither fields.pvd nor fields.vtkhdf is in the folder"),
        (cut_frame, "is cut short or damaged"),
        (lose_frame, "which is not in the folder"),
        (garble_frame, "is cut short or damaged"),
        (lose_region, "has no cell array &#34;region&#34;"),
        (leave_folder, "outside the run folder"),
        (empty_index, "names no frame"),
        (halve_index, "fields.pvd cannot be read"),
    ],
)
def test_maps_that_cannot_be_drawn_are_left_out_and_the_page_says_why(
    folder: Path, damage: Callable[[Path], None], why: str
) -> None:
    damage(folder)
    page = page_of(folder)
    assert "Left out of this page" in page
    assert why in page
    assert Outline(page).tags.count("img") == 5


def test_a_frame_of_a_run_that_was_killed_has_no_map_of_freezing_times(folder: Path) -> None:
    path = max((folder / "fields").iterdir())
    path.write_text(path.read_text().replace("local_freezing_time_s", "something_else"), encoding="utf-8")
    page = page_of(folder)
    assert "Map of local freezing time: only the last frame of a run that came to its end holds it." in page
    assert Outline(page).tags.count("img") == 7


def test_curves_fronts_and_case_that_are_missing_are_said(folder: Path) -> None:
    for name in ("curves.csv", "fronts.csv", "case.toml"):
        (folder / name).unlink()
    page = page_of(folder)
    assert "curves.csv is not in the folder" in page
    assert "case.toml is not in the folder" in page
    assert Outline(page).tags.count("img") == 5


def write(name: str, text: str | bytes) -> Callable[[Path], None]:
    def damage(folder: Path) -> None:
        (folder / name).write_bytes(text.encode() if isinstance(text, str) else text)

    return damage


def keys(**found: Any) -> Callable[[Path], None]:
    return lambda folder: change(folder, **found)


def without(key: str) -> Callable[[Path], None]:
    def damage(folder: Path) -> None:
        path = folder / "summary.json"
        summary = json.loads(path.read_text())
        del summary[key]
        path.write_text(json.dumps(summary))

    return damage


def lose_summary(folder: Path) -> None:
    (folder / "summary.json").unlink()


def halve_summary(folder: Path) -> None:
    path = folder / "summary.json"
    path.write_text(path.read_text()[:200])


def times_fall(folder: Path) -> None:
    path = folder / "curves.csv"
    lines = path.read_text().splitlines()
    path.write_text("\n".join([lines[0], *reversed(lines[1:])]) + "\n")


def rename(name: str, old: str, new: str) -> Callable[[Path], None]:
    def damage(folder: Path) -> None:
        (folder / name).write_text((folder / name).read_text().replace(old, new, 1))

    return damage


BROKEN = {
    "no summary": (lose_summary, "folder", "is no run folder: it holds no summary.json"),
    "half a summary": (halve_summary, "summary.json", "cannot be read"),
    "no object": (write("summary.json", "[1, 2]"), "summary.json", "not an object"),
    "nested without end": (write("summary.json", "[" * 100_000), "summary.json", "cannot be read"),
    "not text": (write("summary.json", b"\xff\xfe\x00"), "summary.json", "cannot be read"),
    "later version": (keys(schema=2), "summary.json", "was written by a later version (schema 2"),
    "odd version": (keys(schema="new"), "summary.json", 'schema has to be 1, found "new"'),
    "outcome": (keys(outcome="splendid"), "summary.json", "outcome has to be one of running, finished"),
    "temperature": (
        keys(slowest={"at_m": [0, 0], "temperature_degC": "cold"}),
        "summary.json",
        'slowest.temperature_degC has to be a number, found "cold"',
    ),
    "not finite": (
        keys(heat_removed_J=float("nan")),
        "summary.json",
        "heat_removed_J has to be a finite number",
    ),
    "too large": (keys(time_s=1e300), "summary.json", "time_s has to be a number below 1e+12, found 1e+300"),
    "place": (
        keys(slowest={"at_m": [0.0], "temperature_degC": 1.0}),
        "summary.json",
        "slowest.at_m has to be two numbers",
    ),
    "regions": (keys(mass_kg={"stick": 0.1}), "summary.json", "have to name the same regions"),
    "key is gone": (without("stages"), "summary.json", "stages is missing"),
    "aim at odds": (
        keys(aim={"at": "slowest", "reach_degC": -12.0, "met": True, "time_s": None, "within_s": None}),
        "summary.json",
        "aim.met is true, yet aim.time_s says that it was never reached",
    ),
    "column is gone": (
        rename("curves.csv", "slowest [degC]", "s"),
        "curves.csv",
        'has no column "slowest [degC]"',
    ),
    "word in a column": (rename("curves.csv", "\n0,", "\nzero,"), "curves.csv", "cannot be read"),
    "curves are no text": (write("curves.csv", b"time [s]\n\xff\xfe"), "curves.csv", "cannot be read"),
    "times fall": (times_fall, "curves.csv", "do not rise from row to row"),
    "without bound": (rename("curves.csv", "\n0,4,", "\n0,1e300,"), "curves.csv", "numbers without bound"),
    "fronts without times": (rename("fronts.csv", "time [s]", "t"), "fronts.csv", 'has no column "time [s]"'),
}


@pytest.mark.parametrize("name", BROKEN)
def test_a_folder_that_was_broken_gets_one_plain_sentence(folder: Path, name: str) -> None:
    damage, place, said = BROKEN[name]
    damage(folder)
    with pytest.raises(CaseError) as caught:
        write_report(folder)
    assert [problem.place for problem in caught.value.problems] == [place]
    assert said in caught.value.problems[0].message
    assert "\n" not in caught.value.problems[0].message
    assert not (folder / "report.html").exists()


def test_every_mistake_in_a_summary_is_named_at_once(folder: Path) -> None:
    change(folder, title=3, time_s="long")
    with pytest.raises(CaseError) as caught:
        write_report(folder)
    assert [p.message for p in caught.value.problems] == [
        "title has to be a text, found 3",
        'time_s has to be a number, found "long"',
    ]


def test_cautions_follow_the_case(folder: Path) -> None:
    contents = read_contents(folder)
    said = " ".join(advice.cautions(contents, -20.0))
    assert "Freezing kills no germs" in said
    assert "glycol freezes skin" in said
    assert "Plain salt brine (NaCl) cannot serve here" in said
    assert "not a certificate" in said
    for absent in ("Cold burns", "nitrogen", "ammonia", "sealed pack"):
        assert absent not in said


def test_colder_plants_and_sealed_packs_get_their_own(folder: Path) -> None:
    path = folder / "case.toml"
    text = path.read_text().replace('"bar"', '"rod"')
    for coolant, words in (("-36 degC", "ammonia"), ("-80 degC", "nitrogen")):
        path.write_text(text.replace('"-22 degC"', f'"{coolant}"'))
        said = " ".join(advice.cautions(read_contents(folder), -30.0))
        assert words in said
        assert "Cold burns: parts of the piece or its mould come to -30 degC" in said
        assert "sealed pack" in said


def test_still_air_is_not_taken_for_brine(folder: Path) -> None:
    path = folder / "case.toml"
    path.write_text(path.read_text().replace('"250 W/m2/K"', '"9 W/m2/K"'))
    contents = read_contents(folder)
    assert "glycol" not in " ".join(advice.cautions(contents, -20.0))
    assert "Air speed: the case takes h = 9 W/m2/K" in " ".join(advice.checks(contents))


def test_what_to_check_names_the_numbers_of_the_case(folder: Path) -> None:
    change(folder, uncertainty=None)
    said = " ".join(advice.checks(read_contents(folder)))
    assert "the case takes -22 degC" in said
    assert "h = 250 W/m2/K; seldom known better than by a factor of 1.5" in said
    assert "drawn as 12 mm; half a millimetre more takes 4 to 8 % more time" in said
    assert "at (0.0, 0.0) mm" in said


def test_a_signal_counts_with_its_extremes(folder: Path) -> None:
    path = folder / "case.toml"
    signal = '{ time = { unit = "min", values = [0, 5] }, value = { unit = "degC", values = [-22, -30] } }'
    path.write_text(path.read_text().replace('"-22 degC"', signal))
    assert contacts(read_contents(folder).case)[0].coolant == (-30.0, -22.0)


def test_a_frame_is_read_whole_with_its_names(finished: Path) -> None:
    frame = last_frame(finished)
    assert frame.time == pytest.approx(open_run(finished).summary["time_s"])
    assert frame.names == ("product", "wall")
    assert frame.frozen_through == pytest.approx(-12.0)
    assert np.ptp(frame.points, axis=0) == pytest.approx([0.0136, 0.0256], rel=1e-6)
    a, b, c = (frame.points[frame.triangles[:, i]] for i in range(3))
    area = 0.5 * np.abs((b - a)[:, 0] * (c - a)[:, 1] - (b - a)[:, 1] * (c - a)[:, 0])
    # A rectangle of 12 mm by 24 mm without its four corners, (4 - pi) r2, of 3 mm.
    assert area[frame.region == 0].sum() == pytest.approx(288e-6 - (4 - np.pi) * 9e-6, rel=0.01)


def test_an_outline_is_drawn_round_each_region_and_not_across(finished: Path) -> None:
    frame = last_frame(finished)
    ends = frame.points[frame.outline]
    length = np.hypot(*(ends[:, 1] - ends[:, 0]).T).sum()
    # Round a rectangle with corners of radius r: 2 (a + b) - (8 - 2 pi) r, inside and outside of the wall.
    inner = 2 * 36e-3 - (8 - 2 * np.pi) * 3e-3
    outer = 2 * 39.2e-3 - (8 - 2 * np.pi) * 3.8e-3
    assert length == pytest.approx(inner + outer, rel=0.01)


def test_a_folder_without_frames_says_why(tmp_path: Path) -> None:
    with pytest.raises(NoMaps, match=r"neither fields.pvd nor fields.vtkhdf is in the folder"):
        last_frame(tmp_path)


def test_limits_of_a_series_are_kept(folder: Path) -> None:
    frame = last_frame(folder)
    own = map_pictures.nice_limits(frame.values["temperature_degC"], 5.0)
    assert own[0] % 5.0 == 0.0
    assert own[1] % 5.0 == 0.0
    assert page_of(folder) != write_report(folder, limits={"temperature_degC": (-40.0, 5.0)}).read_text()
    assert page_of(folder) == write_report(folder, limits={"temperature_degC": own}).read_text()


def test_a_running_mean_keeps_a_straight_line_and_its_gaps() -> None:
    seconds = np.arange(0.0, 100.0, 5.0)
    values = np.where(seconds < 20.0, np.nan, 2.0)
    smooth = pictures._running_mean(seconds, values, 30.0)
    assert np.array_equal(np.isnan(smooth), np.isnan(values))
    assert smooth[~np.isnan(smooth)] == pytest.approx(2.0)


def test_more_points_and_odd_names_than_a_picture_takes(folder: Path) -> None:
    table = open_run(folder).curves
    names = [f"_point {n} with a name much longer than a legend bears $\\frac$ 氷" for n in range(9)]
    more = table | {f"point.{name} [degC]": table["mean [degC]"] + 3.0 for name in names}
    svg = pictures.curves(more, [], None)
    assert svg.count("with a name much longer") == 0
    assert svg.count("with a name much") == pictures.MOST_LINES - 2


def test_several_stages_have_bands_with_their_names(tmp_path: Path) -> None:
    second = '[[stages]]\nname = "hold in air"\nlasts = "5 min"\n[watch]'
    run(small(text=SMALL.replace("[watch]", second, 1)), tmp_path / "two")
    contents = read_contents(tmp_path / "two")
    svg = pictures.curves(contents.curves, contents.summary["stages"], contents.summary["aim"])
    assert ">freeze<" in svg
    assert ">hold in air<" in svg
    assert page_of(tmp_path / "two").count('<th scope="row">hold in air') == 1


def test_signs_are_set_as_print_has_them() -> None:
    assert (
        typeset("slowest <= -12 degC at 7e-15").replace("\N{NO-BREAK SPACE}", " ")
        == "slowest ≤ −12 °C at 7e-15"
    )


def test_the_workshop_bar_is_small_and_quick(cases: Path, tmp_path: Path) -> None:
    run(load(cases / "workshop_bar.toml"), tmp_path / "bar")
    # Time of the processor: what others do on the machine meanwhile is not the page's doing.
    began = resource.getrusage(resource.RUSAGE_CHILDREN)
    command = [sys.executable, "-m", "fem.cli", "report", str(tmp_path / "bar")]
    done = subprocess.run(command, capture_output=True, text=True, timeout=60, check=True)
    ended = resource.getrusage(resource.RUSAGE_CHILDREN)
    page = tmp_path / "bar" / "report.html"
    assert done.stdout.strip() == str(page)
    assert done.stderr == ""
    assert page.stat().st_size < 3e6
    assert ended.ru_utime + ended.ru_stime - began.ru_utime - began.ru_stime < 4.0


def test_the_command_says_what_is_wrong_without_a_traceback(folder: Path) -> None:
    change(folder, schema=7)
    command = [sys.executable, "-m", "fem.cli", "report", str(folder)]
    done = subprocess.run(command, capture_output=True, text=True, timeout=60, check=False)
    assert done.returncode == 2
    assert "was written by a later version" in done.stderr
    assert "Traceback" not in done.stderr


def test_a_run_ends_with_its_report_unless_told_otherwise(tmp_path: Path) -> None:
    (tmp_path / "pop.toml").write_text(SMALL, encoding="utf-8")
    command = [
        sys.executable,
        "-m",
        "fem.cli",
        "run",
        "pop.toml",
        "--set",
        "stages.freeze.lasts=20 s",
        "--into",
    ]
    for more in (["with"], ["without", "--no-report"]):
        subprocess.run([*command, *more], cwd=tmp_path, capture_output=True, timeout=60, check=True)
    assert (tmp_path / "with" / "report.html").exists()
    assert not (tmp_path / "without" / "report.html").exists()


def test_a_run_whose_page_fails_still_gives_its_answer(tmp_path: Path) -> None:
    (tmp_path / "pop.toml").write_text(SMALL, encoding="utf-8")
    spoilt = "import fem.result.report as r\ndef write_report(f): raise RuntimeError('no ink')\n"
    spoilt += "r.write_report = write_report\nfrom fem.cli import main\nmain()"
    command = [
        sys.executable,
        "-c",
        spoilt,
        "run",
        "pop.toml",
        "--set",
        "stages.freeze.lasts=20 s",
        "--into",
        "out",
    ]
    done = subprocess.run(command, cwd=tmp_path, capture_output=True, text=True, timeout=60, check=False)
    assert done.returncode == 0
    assert "report.html is left out: no ink" in done.stderr
    assert done.stdout.startswith("The slowest point")
