from __future__ import annotations

import json
import subprocess
import sys
import tomllib
from pathlib import Path

import pytest
from jsonschema import Draft202012Validator

from fem.case.draft import PRODUCTS, draft
from fem.case.read import loads
from fem.case.schema import schema
from fem.errors import CaseError


def rimefront(*args: str, cwd: Path) -> subprocess.CompletedProcess[str]:
    command = [sys.executable, "-m", "fem.cli", *args]
    return subprocess.run(command, cwd=cwd, capture_output=True, text=True, timeout=120, check=False)


# The two starter cases ask what the workshop bar and the tube in blast air ask.
@pytest.mark.parametrize(("product", "time"), [("bar", 1178.0), ("tube", 3000.0)])
def test_a_draft_runs_as_pasted_and_answers(tmp_path: Path, product: str, time: float) -> None:
    written = rimefront("draft", product, cwd=tmp_path)
    assert (written.returncode, written.stderr) == (0, "")
    (tmp_path / "a.toml").write_text(written.stdout, encoding="utf-8")
    done = rimefront("run", "a.toml", "--json", cwd=tmp_path)
    assert done.returncode == 0
    summary = json.loads(done.stdout)
    assert summary["aim"]["time_s"] == pytest.approx(time, rel=0.05)
    assert summary["aim"]["met"] is True


@pytest.mark.parametrize("product", PRODUCTS)
def test_a_draft_fits_the_schema_and_says_where_its_numbers_come_from(product: str) -> None:
    text = draft(product)
    assert list(Draft202012Validator(schema()).iter_errors(tomllib.loads(text))) == []
    for source in ("calliper", "refractometer", "recipe sheet", "log"):
        assert source in text
    assert [e.cautions() for stage in loads(text).stages for e in stage.surfaces.values()] == [[]]


@pytest.mark.parametrize("product", PRODUCTS)
def test_what_a_draft_leaves_commented_out_reads_too(product: str) -> None:
    lines = draft(product).splitlines()
    offered = [line.removeprefix("# ") if " = " in line and line.startswith("# ") else line for line in lines]
    assert offered != lines
    case = loads("\n".join(line for line in offered if not line.startswith(("with k", "freezer"))))
    assert case.materials["mix"].freezing_point == -1.3


def test_a_draft_into_a_file_leaves_what_is_there_alone(tmp_path: Path) -> None:
    first = rimefront("draft", "bar", "--into", "pop.toml", cwd=tmp_path)
    assert (first.returncode, first.stdout) == (0, "")
    assert "rimefront run pop.toml" in first.stderr
    assert (tmp_path / "pop.toml").read_text(encoding="utf-8") == draft("bar")
    again = rimefront("draft", "tube", "--into", "pop.toml", cwd=tmp_path)
    assert again.returncode == 2
    assert "exists already" in again.stderr
    assert (tmp_path / "pop.toml").read_text(encoding="utf-8") == draft("bar")


def test_an_unknown_product_is_said_with_the_nearest(tmp_path: Path) -> None:
    with pytest.raises(CaseError, match='no starter case "tub"'):
        draft("tub")
    done = rimefront("draft", "tub", cwd=tmp_path)
    assert done.returncode == 2
    assert 'did you mean "tube"?' in done.stderr
    assert "Traceback" not in done.stderr
