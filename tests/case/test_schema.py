from __future__ import annotations

import json
import re
import subprocess
import sys
import tomllib
from pathlib import Path
from typing import Any

import pytest
from jsonschema import Draft202012Validator

from fem.case.read import load
from fem.case.schema import schema
from fem.errors import CaseError
from tests.conftest import CASES

BAR = (CASES / "workshop_bar.toml").read_text(encoding="utf-8")
VALID = Draft202012Validator(schema())


def mistakes(text: str) -> list[str]:
    return [error.json_path for error in VALID.iter_errors(tomllib.loads(text))]


def changed(old: str, new: str) -> str:
    assert old in BAR
    return BAR.replace(old, new)


def test_it_is_a_schema_of_the_draft_that_it_names() -> None:
    Draft202012Validator.check_schema(schema())
    assert schema()["$schema"] == "https://json-schema.org/draft/2020-12/schema"


@pytest.mark.parametrize("path", sorted(CASES.glob("*.toml")), ids=lambda path: path.stem)
def test_every_shipped_case_fits(path: Path) -> None:
    assert mistakes(path.read_text(encoding="utf-8")) == []


H = 'h        = "250 W/m2/K"'
STEEL = 'conductivity  = "16 W/m/K"'
WRITTEN = {
    "a changing value": (
        H,
        'h = { time = { unit = "min", values = [0, 5] }, value = { unit = "W/m2/K", values = [200, 250] } }',
    ),
    "a log": (H, 'h = { log = "tank.csv", column = "h" }'),
    "a bare pair of cells": ('wall      = "0.8 mm"', 'cell = ["0.5 mm", "1 mm"]'),
    "a property against temperature": (
        STEEL,
        'conductivity = { temperature = { unit = "degC", values = [-40, 20] }, '
        'value = { unit = "W/m/K", values = [14, 16] } }',
    ),
    "an isotherm": ('"freezing point"', '"-3 degC"'),
    "a typographic minus": ('"-22 degC"', '"\N{MINUS SIGN}22 °C"'),
    "a factor is a number": ('"1075 kg/m3"', '"1075 kg/m3"\nconductivity_factor = 1.1'),
    "a start for each region": ("[shape]", '[piece.start]\nwall = "20 degC"\n\n[shape]'),
}


@pytest.mark.parametrize("name", WRITTEN)
def test_every_way_to_write_a_value_fits(name: str) -> None:
    assert mistakes(changed(*WRITTEN[name])) == []


WRONG = {
    "unknown key": ('corner    = "6 mm"', 'korner = "6 mm"', "$.shape"),
    "unknown section": ("[aim]", "[goal]", "$"),
    "bare number": ('"22 mm"', "22", "$.shape"),
    "number without unit": ('"4 degC"', '"4"', "$.piece.start_temperature"),
    "power of ten without unit": ('"4 degC"', '"4e0"', "$.piece.start_temperature"),
    "decimal comma": ('"20 min"', '"20,5 min"', "$.aim.within"),
    "unit alone": ('"20 min"', '"min"', "$.aim.within"),
    "bare number in a ray": ('from = ["11 mm", "0 mm"]', 'from = [11, "0 mm"]', "$.watch.rays.flat.from[0]"),
    "unknown kind": ('"recipe"', '"receipt"', "$.materials.mix"),
    "unknown form": ('"bar"', '"cone"', "$.shape"),
    "kind left out": ('exchange = "fluid"', "", "$.stages[0].surfaces.outside"),
    "required key left out": ('width     = "50 mm"', "", "$.shape"),
    "no stage": (BAR[BAR.index("[[stages]]") : BAR.index("[watch]")], "", "$"),
    "wrong version": ("schema = 1", "schema = 2", "$.schema"),
    "unknown front": ('"freezing point"', '"melting"', "$.watch.front"),
    "condition without sign": ('"slowest <= -12 degC"', '"slowest -12 degC"', "$.stages[0].until"),
    "half a log": (H, 'h = { log = "tank.csv" }', "$.stages[0].surfaces.outside"),
}


@pytest.mark.parametrize("name", WRONG)
def test_what_the_program_refuses_does_not_fit(name: str, tmp_path: Path) -> None:
    old, new, place = WRONG[name]
    assert mistakes(changed(old, new)) == [place]
    (tmp_path / "case.toml").write_text(changed(old, new), encoding="utf-8")
    with pytest.raises(CaseError):
        load(tmp_path / "case.toml")


def every_key() -> list[tuple[str, dict[str, Any]]]:
    drawn = schema()
    tables = {"the case": drawn, **drawn["$defs"]}
    return [
        (f"{name}.{key}", described)
        for name, table in tables.items()
        for key, described in table.get("properties", {}).items()
    ]


def test_every_key_has_a_meaning_in_a_sentence_without_inner_units() -> None:
    for key, described in every_key():
        if "const" in described or key == "the case.shape":
            continue
        if "$ref" in described and "description" not in described:
            continue  # a section: its own table says what it is
        said = described.get("description", "")
        assert re.fullmatch(r"[A-Z].{5,}[.]", said), f"{key}: {said!r}"
        assert "[" not in said, key


def test_every_example_and_default_of_a_quantity_can_be_written() -> None:
    drawn = schema()
    for key, described in every_key():
        default = [described["default"]] if "default" in described else []
        for value in (*described.get("examples", ()), *default):
            judge = Draft202012Validator({**described, "$defs": drawn["$defs"]})
            assert judge.is_valid(value), f"{key}: {value!r}"


def test_the_command_prints_it() -> None:
    done = subprocess.run(
        [sys.executable, "-m", "fem.cli", "schema"], capture_output=True, text=True, timeout=60, check=True
    )
    assert json.loads(done.stdout) == schema()
