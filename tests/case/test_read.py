"""A case as the case language gives it, and every way of getting one wrong."""

from __future__ import annotations

import re
from pathlib import Path

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from fem.case.case import Until
from fem.case.read import load, loads
from fem.errors import CaseError
from fem.heat.exchange import Fluid, Radiant
from fem.mesh.shape import Bar
from fem.watch.schedule import Level

BAR = """\
schema = 1
title  = "Workshop bar: is 20 minutes enough?"

[piece]
section           = "plane"        # a comment
length            = "83 mm"
start_temperature = "4 degC"

[shape]
form      = "bar"
thickness = "22 mm"
width     = "50 mm"
corner    = "6 mm"
wall      = "0.8 mm"
cell      = "0.8 mm"

[regions]
product = "mix"
wall    = "stainless"

[materials.mix]
kind    = "recipe"
sucrose = "18 %"
density = "1075 kg/m3"

[materials.stainless]
kind          = "plain"
density       = "7900 kg/m3"
heat_capacity = "480 J/kg/K"
conductivity  = "16 W/m/K"

[[stages]]
name  = "freeze"
lasts = "40 min"
until = "slowest <= -12 degC"

[stages.surfaces.outside]
exchange = "fluid"
h        = "250 W/m2/K"
coolant  = "-22 degC"

[watch]
every  = "5 s"
frames = "60 s"
front = "freezing point"

[watch.points]
centre = ["0 mm", "0 mm"]

[watch.rays]
flat = { from = ["11 mm", "0 mm"], to = ["0 mm", "0 mm"] }

[aim]
at     = "slowest"
reach  = "-12 degC"
within = "20 min"

[stepping]
accuracy = "standard"
"""

ROD = """\
schema = 1
[piece]
section = "axisymmetric"
start_temperature = "10 degC"
[shape]
form = "rod"
radius = "14 mm"
height = "180 mm"
[regions]
product = "mix"
[materials.mix]
kind = "table"
density = "1000 kg/m3"
temperature = { unit = "degC", values = [-30, -1, 0, 20] }
enthalpy = { unit = "kJ/kg", values = [-380, -300, 0, 80] }
conductivity = { unit = "W/m/K", values = [2.0, 2.0, 0.5, 0.5] }
[[stages]]
name = "freeze"
lasts = "20 min"
[stages.surfaces.side]
exchange = "fluid"
h = "30 W/m2/K"
coolant = "-32 degC"
"""


def edited(text: str, *changes: tuple[str, str]) -> str:
    for old, new in changes:
        assert re.search(old, text, re.MULTILINE), old
        text = re.sub(old, lambda _, new=new: new, text, count=1, flags=re.MULTILINE)
    return text


def problems(
    text: str, overrides: tuple[str, ...] = (), folder: Path = Path()
) -> list[tuple[str, str, int | None]]:
    with pytest.raises(CaseError) as caught:
        loads(text, "pop.toml", folder, overrides)
    return [(p.place, p.message, p.line) for p in caught.value.problems]


def test_the_example_of_the_case_language_reads_in_si() -> None:
    case = loads(BAR, "bar.toml")
    assert case.title == "Workshop bar: is 20 minutes enough?"
    assert (case.piece.section, case.piece.length) == ("plane", pytest.approx(0.083))
    assert case.piece.start_of("wall") == 4.0
    shape = case.shape
    assert isinstance(shape, Bar)
    assert (shape.thickness, shape.width, shape.corner, shape.wall) == pytest.approx(
        (0.022, 0.05, 0.006, 0.0008)
    )
    assert shape.cells() == pytest.approx((0.0008, 0.0008))
    assert case.regions == {"product": "mix", "wall": "stainless"}
    assert case.materials["mix"].density == 1075.0
    (stage,) = case.stages
    assert (stage.name, stage.lasts) == ("freeze", 2400.0)
    assert stage.until == Until("slowest", True, -12.0)
    outside = stage.surfaces["outside"]
    assert isinstance(outside, Fluid)
    assert (outside.h.at(0.0), outside.coolant.at(1e4)) == (250.0, -22.0)
    assert (case.watch.every, case.watch.frames, case.watch.front) == (5.0, 60.0, Level("freezing point"))
    assert case.watch.points == {"centre": (0.0, 0.0)}
    assert case.watch.rays["flat"].from_ == pytest.approx((0.011, 0.0))
    assert case.aim is not None
    assert (case.aim.at, case.aim.reach, case.aim.within) == ("slowest", -12.0, 1200.0)
    assert case.stepping.accuracy == "standard"
    assert (case.text, case.source, case.lasts) == (BAR, "bar.toml", 2400.0)


def test_a_case_without_the_optional_tables_reads() -> None:
    case = loads(ROD)
    assert case.aim is None
    assert (case.watch.every, case.watch.frames) == (5.0, 60.0)
    assert case.title == ""


def test_units_of_coefficients_are_never_offset() -> None:
    case = loads(edited(BAR, ("250 W/m2/K", "300 W/m2/degC")))
    outside = case.stages[0].surfaces["outside"]
    assert isinstance(outside, Fluid)
    assert outside.h.at(0.0) == pytest.approx(300.0, rel=1e-12)


def test_start_temperatures_by_region() -> None:
    text = edited(BAR, (r"^start_temperature.*", 'start = { product = "4 degC", wall = "-20 degC" }'))
    piece = loads(text).piece
    assert (piece.start_of("product"), piece.start_of("wall")) == (4.0, -20.0)


# What is changed in BAR (pattern, replacement); the key at fault; words of the message.
BAD_BAR = {
    "unknown section": (r"^\[stepping\]", "[steping]", "steping", ["steping", 'did you mean "stepping"?']),
    "unknown key": (
        "^thickness",
        "thicknes",
        "shape.thicknes",
        ['no key "thicknes"', 'did you mean "thickness"?'],
    ),
    "missing key": ("^thickness.*", "", "shape.thickness", ["is missing", 'thickness = "22 mm"']),
    "unknown form": ('form      = "bar"', 'form = "bra"', "shape.form", ["rod", 'did you mean "bar"?']),
    "unknown exchange": ('"fluid"', '"fluids"', "stages.freeze.surfaces.outside.exchange", ['mean "fluid"?']),
    "exchange missing": (
        "^exchange.*",
        "",
        "stages.freeze.surfaces.outside.exchange",
        ["is missing", '"radiant"'],
    ),
    "unknown kind": ('"recipe"', '"receipt"', "materials.mix.kind", ['did you mean "recipe"?']),
    "kind not text": ('"recipe"', "3", "materials.mix.kind", ["must be one of", "got 3"]),
    "unknown accuracy": (
        '"standard"',
        '"standart"',
        "stepping.accuracy",
        ["quick", 'did you mean "standard"?'],
    ),
    "missing unit": ('"22 mm"', '"22"', "shape.thickness", ["has no unit", '"22 mm"']),
    "wrong unit": ('"22 mm"', '"22 kg"', "shape.thickness", ['"kg" is no unit of length']),
    "unknown unit": ('"22 mm"', '"22 furlog"', "shape.thickness", ["furlog"]),
    "bare number": ('"22 mm"', "22", "shape.thickness", ["bare number (22)", '"22 mm"']),
    "a bare h": ('"250 W/m2/K"', "250", "stages.freeze.surfaces.outside.h", ["bare number (250)", "W/m2/K"]),
    "a decimal comma": ('"0.8 mm"', '"0,8 mm"', "shape.wall", ["0,8 mm", "decimal sign as a point"]),
    "a difference for a temperature": (
        '"-22 degC"',
        '"-22 delta_degC"',
        "stages.freeze.surfaces.outside.coolant",
        [],
    ),
    "below absolute zero": (
        '"-22 degC"',
        '"-300 degC"',
        "stages.freeze.surfaces.outside.coolant",
        ["at least -273.1", "got -300 degC"],
    ),
    "negative h": (
        '"250 W/m2/K"',
        '"-35 W/m2/K"',
        "stages.freeze.surfaces.outside.h",
        ["above 0", "-35 W/m2/K"],
    ),
    "Brix as a fraction": ('"18 %"', "0.18", "materials.mix.sucrose", ["bare number (0.18)", '"18 %"']),
    "Brix beyond all": ('"18 %"', '"180 %"', "materials.mix.sucrose", ["at most 100 %", "180 %"]),
    "Brix bare beyond all": ('"18 %"', "180", "materials.mix.sucrose", ["bare number (180)"]),
    "fractions over 100 %": ('"18 %"', '"70 %"\nglucose = "40 %"', "materials.mix.sucrose", ["100 %", "110"]),
    "nan": ('"22 mm"', "nan", "shape.thickness", ["nan", '"22 mm"']),
    "nan as text": ('"22 mm"', '"nan mm"', "shape.thickness", ["not a finite number"]),
    "infinity as text": ('"40 min"', '"inf min"', "stages.freeze.lasts", ["not a finite number"]),
    "a date": ('"22 mm"', "2024-01-01", "shape.thickness", ["must be a length with its unit"]),
    "unknown surface": (
        "surfaces.outside",
        "surfaces.outsid",
        "stages.freeze.surfaces.outsid",
        ['no surface "outsid" (there is: outside)', 'did you mean "outside"?'],
    ),
    "unknown region": ("^wall    = ", "wal = ", "regions.wal", ['no region "wal"', 'did you mean "wall"?']),
    "region without material": ("^wall    = .*", "", "regions", ['region "wall" has no material']),
    "unknown material": (
        'product = "mix"',
        'product = "mx"',
        "regions.product",
        ['no material "mx"', '"mix"?'],
    ),
    "material not text": (
        'product = "mix"',
        "product = 3",
        "regions.product",
        ["name of a material", "got 3"],
    ),
    "start of no region": (
        r"^\[shape\]",
        '[piece.start]\nwal = "3 degC"\n[shape]',
        "piece.start.wal",
        ['did you mean "wall"?'],
    ),
    "no start temperature": (
        r"^start_temp.*",
        "",
        "piece.start_temperature",
        ["is missing", "product, wall"],
    ),
    "corner beyond half": (
        '"6 mm"',
        '"12 mm"',
        "shape.corner",
        ["half of the thickness (22 mm / 2 = 11 mm)", "got 12 mm"],
    ),
    "no wall": ('"0.8 mm"\ncell', '"0 mm"\ncell', "shape.wall", ["above 0", "0 mm"]),
    "cell too large": ('cell      = "0.8 mm"', 'cell = "60 mm"', "shape.cell", ["23.6 mm", "got 60 mm"]),
    "cell too fine": ('cell      = "0.8 mm"', 'cell = "0.8 um"', "shape.cell", ["cells", "or more"]),
    "three cells": ('cell      = "0.8 mm"', 'cell = ["1 mm", "1 mm", "1 mm"]', "shape.cell", ["got 3"]),
    "length missing": ("^length.*", "", "piece.length", ["is missing", '"83 mm"']),
    "wrong section": ('"plane"  ', '"axisymmetric"', "piece.length", ["leave it out"]),
    "stage without time": ("^lasts.*", "", "stages.freeze.lasts", ["is missing", 'lasts = "20 min"']),
    "until unreadable": ("slowest <= ", "slowest < ", "stages.freeze.until", ['"slowest <= -12 degC"']),
    "until of no point": (
        "slowest <= ",
        "core <= ",
        "stages.freeze.until",
        ['no watched point "core"', "centre"],
    ),
    "until without unit": ("<= -12 degC", "<= -12", "stages.freeze.until", ["has no unit"]),
    "rows beyond the run": (
        '"5 s"',
        '"50 min"',
        "watch.every",
        ["50 min is longer than the whole run (40 min)"],
    ),
    "frames beyond the run": (
        '"60 s"',
        '"1 h"',
        "watch.frames",
        ["1 h is longer than the whole run (40 min)"],
    ),
    "front unreadable": ('"freezing point"', '"icy"', "watch.front", ['"ice 0.3"', 'got "icy"']),
    "front of too much ice": ('"freezing point"', '"ice 30"', "watch.front", ["between 0 and 1"]),
    "point outside": (
        r'centre = \["0 mm"',
        'centre = ["30 mm"',
        "watch.points.centre",
        ["(30, 0) mm", "outside"],
    ),
    "point of one number": (r'centre = \["0 mm", ', "centre = [", "watch.points.centre", ["two lengths"]),
    "point name": ("^centre", '"a b"', 'watch.points."a b"', ["letters, digits"]),
    "point called slowest": ("^centre", "slowest", "watch.points.slowest", ["another name"]),
    "ray of no length": (r'"11 mm", "0 mm"', '"0 mm", "0 mm"', "watch.rays.flat.to", ["same point"]),
    "ray outside": (
        r'"11 mm", "0 mm"',
        '"11 mm", "26 mm"',
        "watch.rays.flat.from",
        ["(11, 26) mm", "outside"],
    ),
    "ray key": ("to = ", "too = ", "watch.rays.flat.too", ["(there is: from, to)", 'did you mean "to"?']),
    "aim at no point": ('at     = "slowest"', 'at = "centr"', "aim.at", ['did you mean "centre"?']),
    "aim beyond the run": ('"20 min"', '"2 h"', "aim.within", ["2 h", "all stages together (40 min)"]),
    "table for a value": ('"22 mm"', "{ mm = 22 }", "shape.thickness", ["must be a length with its unit"]),
    "title not text": ("^title.*", "title = 3", "title", ["must be text", "got 3"]),
    "newer schema": ("^schema = 1", "schema = 2", "schema", ["newer than this program", "schema = 1"]),
    "schema not a number": ("^schema = 1", 'schema = "one"', "schema", ["must be 1", '"one"']),
    "steps in the wrong order": (
        'accuracy = "standard"',
        'first_step = "3 s"\nlargest_step = "1 s"',
        "stepping.first_step",
        ["largest_step (1 s)", "got 3 s"],
    ),
    "a line break in a value": ('"22 mm"', '"22 m\\nx"', "shape.thickness", ["22 m\\x0ax"]),
    "a line break in a key": ("^thickness", '"thick\\nness"', 'shape."thick\\u000aness"', ["thick\\x0aness"]),
    "schema missing": ("^schema = 1", "", "schema", ["is missing", "schema = 1"]),
    "ring of layers": (
        '"250 W/m2/K"',
        "{ time = 3 }",
        "stages.freeze.surfaces.outside.h",
        ["value is missing"],
    ),
    "time that falls": (
        '"-22 degC"',
        '{ time = { unit = "s", values = [0, 60, 30] }, value = { unit = "degC", values = [1, 2, 3] } }',
        "stages.freeze.surfaces.outside.coolant",
        ["time has to rise", "row 3 (30 s)", "row 2 (60 s)"],
    ),
    "columns that differ": (
        '"-22 degC"',
        '{ time = { unit = "s", values = [0, 60] }, value = { unit = "degC", values = [1] } }',
        "stages.freeze.surfaces.outside.coolant",
        ["time has 2 rows and value has 1"],
    ),
    "an empty column": (
        '"-22 degC"',
        '{ time = { unit = "s", values = [] }, value = { unit = "degC", values = [] } }',
        "stages.freeze.surfaces.outside.coolant.time.values",
        ["no values"],
    ),
    "nan in a column": (
        '"-22 degC"',
        '{ time = { unit = "s", values = [0, 60] }, value = { unit = "degC", values = [1, nan] } }',
        "stages.freeze.surfaces.outside.coolant.value.values",
        ["row 2", "nan"],
    ),
    "a log that is not there": (
        '"-22 degC"',
        '{ log = "no.csv", column = "bath" }',
        "stages.freeze.surfaces.outside.coolant",
        ["no.csv"],
    ),
    "h without air": (
        '"fluid"',
        '"radiant"\nemissivity = "0.9"\nsurroundings = "-20 degC"',
        "stages.freeze.surfaces.outside.coolant",
        ['no key "coolant"', "surroundings"],
    ),
}


@pytest.mark.parametrize("name", BAD_BAR)
def test_bad_input_is_said_at_its_key(name: str) -> None:
    pattern, new, place, words = BAD_BAR[name]
    found = [(at, message) for at, message, _ in problems(edited(BAR, (pattern, new)))]
    messages = [message for at, message in found if at == place]
    assert messages, found
    assert any(all(word in message for word in words) for message in messages), found
    assert not any("Input should" in message or "Field required" in message for _, message in found)


BAD_ROD = {
    "falling enthalpy": ("-380, -300", "-300, -380", "materials.mix.enthalpy", ["must rise", "-380 kJ/kg"]),
    "inner beyond outer": (
        'form = "rod"\nradius = "14 mm"',
        'form = "ring"\ninner = "15 mm"\nouter = "14 mm"',
        "shape.inner",
        ["smaller than outer (14 mm)", "got 15 mm"],
    ),
    "section of a rod": (
        'section = "axisymmetric"',
        'section = "plane"\nlength = "1 m"',
        "piece.section",
        ['a rod is "axisymmetric"'],
    ),
    "surface of a bar": (
        r"surfaces\.side",
        "surfaces.outside",
        "stages.freeze.surfaces.outside",
        ["side, bottom, top"],
    ),
    "front without freezing point": (
        r"^\[regions\]",
        '[watch]\nfront = "freezing point"\n[regions]',
        "watch.front",
        ['material "mix" has no freezing point', "state its freezing_point"],
    ),
    "front of unknown ice": (
        r"^\[regions\]",
        '[watch]\nfront = "ice 0.3"\n[regions]',
        "watch.front",
        ["does not say its ice"],
    ),
    "ray without freezing point": (
        r"^\[regions\]",
        '[watch.rays]\nr = { from = ["0 mm", "0 mm"], to = ["14 mm", "0 mm"] }\n[regions]',
        "watch.front",
        ["no freezing point"],
    ),
    "two stages of one name": (
        r"^\[\[stages\]\]",
        '[[stages]]\nname = "freeze"\nlasts = "1 s"\n[[stages]]',
        "stages[2].name",
        ["stage 1", '"freeze" too'],
    ),
    "empty stages": (r"(?s)\[\[stages\]\].*", "", "stages", ["is missing"]),
    "a stage that is one table": (r"\[\[stages\]\]", "[stages]", "stages", ["[[stages]]", "got a table"]),
    "value for a table": ("^schema = 1", "schema = 1\nstepping = 3", "stepping", ["is a table, got 3"]),
    "value for an exchange": (
        r"(?s)\[stages\.surf.*",
        "surfaces = { side = 3 }",
        "stages.freeze.surfaces.side",
        ["exchange", "got 3"],
    ),
    "value for all surfaces": (
        r"(?s)\[stages\.surf.*",
        "surfaces = 3",
        "stages.freeze.surfaces",
        ["must be a table, got 3"],
    ),
    "a number no machine holds": (
        "^schema = 1",
        "schema = 0x" + "f" * 4000,
        "schema",
        ["beyond 64 bits"],
    ),
    "nameless stage": ('name = "freeze"', 'name = ""', "stages[1].name", ["must not be empty"]),
}


@pytest.mark.parametrize("name", BAD_ROD)
def test_bad_input_of_a_rod_is_said_at_its_key(name: str) -> None:
    pattern, new, place, words = BAD_ROD[name]
    text = re.sub(r"(?s)\[stages\.s.*", "", ROD) if name == "a stage that is one table" else ROD
    found = [(at, message) for at, message, _ in problems(edited(text, (pattern, new)))]
    assert any(at == place and all(word in message for word in words) for at, message in found), found


def test_an_empty_list_of_stages() -> None:
    text = "stages = []\n" + re.sub(r"(?s)\[\[stages\]\].*", "", ROD)
    assert problems(text) == [("stages", "is empty; open one [[stages]] at least, with name and lasts", 1)]


def test_everything_wrong_is_said_at_once_with_its_line() -> None:
    text = edited(
        BAR,
        ('"22 mm"', '"22"'),
        ('"250 W/m2/K"', '"-35 W/m2/K"'),
        ("surfaces.outside", "surfaces.outsid"),
        ('"40 min"', '"20 min"'),
        ('"5 s"', '"30 min"'),
        ('product = "mix"', 'product = "mixx"'),
    )
    with pytest.raises(CaseError) as caught:
        loads(text, "cases/pop.toml")
    said = str(caught.value).splitlines()
    assert said[0] == "cases/pop.toml: 5 problems"
    assert [line.split()[:2] for line in said[1:]] == [
        ["11", "shape.thickness"],
        ["18", "regions.product"],
        ["37", "stages.freeze.surfaces.outsid"],
        ["39", "stages.freeze.surfaces.outsid.h"],
        ["43", "watch.every"],
    ]
    assert said[3].endswith('no surface "outsid" (there is: outside); did you mean "outside"?')
    assert said[4].endswith("must be above 0, got -35 W/m2/K")
    assert said[5].endswith("30 min is longer than the whole run (20 min)")


@pytest.mark.parametrize(
    ("text", "line", "words"),
    [
        ("schema = 1\n[piece\n", 2, "is no TOML"),
        ("schema = 1\nlength = 22 mm\n", 2, "is no TOML"),
        ("schema = 1\nlength = mm\n", 2, "stand in quotes"),
        ("schema = 1\nschema = 1\n", 2, "is no TOML"),
        ('title = "open\n', 1, "is no TOML"),
        ("a = " + "[" * 5000, None, "nested too deeply"),
        ("a = " + "9" * 5000, None, ""),
    ],
)
def test_broken_toml_is_said_with_its_line(text: str, line: int | None, words: str) -> None:
    ((place, message, at),) = problems(text)[:1]
    assert place == "file"
    assert words in message
    assert at == line


def test_an_empty_file_names_what_is_missing() -> None:
    assert [place for place, _, _ in problems("")] == [
        "schema",
        "piece",
        "shape",
        "regions",
        "materials",
        "stages",
    ]


def test_unreadable_files_are_said(tmp_path: Path) -> None:
    for path, word in ((tmp_path / "no.toml", "cannot be read"), (tmp_path, "is a folder")):
        with pytest.raises(CaseError, match=word):
            load(path)
    (tmp_path / "latin.toml").write_bytes("title = 'Früchte'".encode("latin-1"))
    with pytest.raises(CaseError, match="is not UTF-8"):
        load(tmp_path / "latin.toml")
    with pytest.raises(CaseError, match="cannot be read"):
        load("a\0b.toml")


def test_a_log_is_read_from_beside_the_case(tmp_path: Path) -> None:
    (tmp_path / "bath.csv").write_text("time [min],bath [degC]\n0,-24\n10,-20\n", encoding="utf-8")
    text = edited(BAR, ('"-22 degC"', '{ log = "bath.csv", column = "bath" }'))
    (tmp_path / "pop.toml").write_text(text, encoding="utf-8")
    outside = load(tmp_path / "pop.toml").stages[0].surfaces["outside"]
    assert isinstance(outside, Fluid)
    assert outside.coolant.at(300.0) == pytest.approx(-22.0)
    ((place, message, _),) = problems(text.replace('"bath" }', '"bat" }'), folder=tmp_path)
    assert place == "stages.freeze.surfaces.outside.coolant"
    assert 'did you mean "bath"?' in message


def test_windows_line_ends_and_a_byte_order_mark_are_taken(tmp_path: Path) -> None:
    path = tmp_path / "pop.toml"
    path.write_bytes(b"\xef\xbb\xbf" + BAR.replace("\n", "\r\n").encode())
    assert load(path).lasts == 2400.0
    path.write_bytes(b"\xef\xbb\xbf" + edited(BAR, ('"250 W/m2/K"', "250")).replace("\n", "\r\n").encode())
    with pytest.raises(CaseError) as caught:
        load(path)
    assert caught.value.problems[0].line == 39


def test_radiant_takes_air() -> None:
    new = '"radiant"\nemissivity = "0.9"\nsurroundings = "-20 degC"\nair = "-18 degC"'
    text = edited(BAR, ('"fluid"', new), ("^coolant.*", ""))
    outside = loads(text).stages[0].surfaces["outside"]
    assert isinstance(outside, Radiant)
    assert outside.emissivity == 0.9
    assert problems(edited(text, ("^air.*", "")))[0][0] == "stages.freeze.surfaces.outside.air"


VALUES = [
    "3",
    "-1",
    "nan",
    '""',
    '"22 mm"',
    '"-5 degC"',
    "[]",
    "{}",
    "true",
    '"\\u0000"',
    "[[1]]",
    "1e400",
    "0x" + "f" * 4000,
]


@st.composite
def mutations(draw: st.DrawFn) -> str:
    """One to three changes of a valid case: lines dropped, doubled or moved, values or text replaced."""
    lines = draw(st.sampled_from([BAR, ROD])).splitlines()
    for _ in range(draw(st.integers(1, 3))):
        i = draw(st.integers(0, len(lines) - 1))
        change = draw(st.sampled_from(["drop", "double", "move", "value", "key", "text"]))
        if change == "drop" and len(lines) > 1:
            del lines[i]
        elif change == "double":
            lines.insert(i, lines[i])
        elif change == "move":
            lines.insert(draw(st.integers(0, len(lines) - 1)), lines.pop(i))
        elif change == "value" and "=" in lines[i]:
            lines[i] = lines[i].split("=")[0] + "= " + draw(st.sampled_from(VALUES))
        elif change == "key" and "=" in lines[i]:
            key = draw(st.sampled_from(["form", "kind", "name", "_fields_set", "cell", "time", '""', "self"]))
            lines[i] = key + " = " + lines[i].split("=", 1)[1]
        elif change == "text":
            at = draw(st.integers(0, len(lines[i])))
            lines[i] = lines[i][:at] + draw(st.text(max_size=3)) + lines[i][at + 1 :]
    return "\n".join(lines)


@settings(max_examples=300, deadline=None)
@given(mutations())
def test_a_mutilated_case_reads_or_says_why_not(text: str) -> None:
    said = None
    try:
        loads(text)
    except CaseError as error:
        said = error
    assert said is None or len(str(said).splitlines()) == 1 + len(said.problems) > 1
