from __future__ import annotations

from pathlib import Path

import numpy as np

from fem.case.portable import portable
from fem.case.read import load
from fem.run import run
from tests.pieces import SMALL, small

LOGGED = SMALL.replace('coolant = "-22 degC"', 'coolant = { log = "../bath.csv", column = "bath" }')


def test_a_case_without_files_is_kept_to_the_letter() -> None:
    assert portable(SMALL, Path()) == (SMALL, {})


def test_a_run_folder_runs_again_wherever_it_is_carried(tmp_path: Path) -> None:
    (tmp_path / "bath.csv").write_text("time [s],bath [degC]\n0,-10\n60,-30\n")
    (tmp_path / "case").mkdir()
    first = run(small("stages.freeze.lasts=2 min", text=LOGGED, folder=tmp_path / "case"), tmp_path / "out")
    carried = (tmp_path / "out").rename(tmp_path / "elsewhere")
    (tmp_path / "bath.csv").unlink()
    again = run(load(carried / "case.toml"))
    np.testing.assert_array_equal(again.curves["mean [degC]"], first.curves["mean [degC]"])


def test_two_files_of_one_name_are_both_kept(tmp_path: Path) -> None:
    text = '[a]\nfile = "one/x.csv"\n[b]\nfile = "two/x.csv"\n[c]\nfile = "one/x.csv"\n'
    renamed, files = portable(text, tmp_path)
    assert files == {"inputs/x.csv": tmp_path / "one/x.csv", "inputs/x-2.csv": tmp_path / "two/x.csv"}
    assert renamed == text.replace("one/x.csv", "inputs/x.csv").replace("two/x.csv", "inputs/x-2.csv")
