from __future__ import annotations

import json

import pytest

from fem.series.verdict import Verdict
from fem.terminal import show_verdicts


def verdict(check: str, quantity: str, passed: bool = True) -> Verdict:
    return Verdict(check, "a source", quantity, "mm", 5.0, 5.01, 0.002, 0.005, 1.1, 0.7, passed)


def test_verdicts_stand_under_their_check_in_80_columns(capsys: pytest.CaptureFixture[str]) -> None:
    assert show_verdicts([verdict("one", "front"), verdict("one", "front of the liquidus")], as_json=False)
    out = capsys.readouterr().out
    assert out.count("one: a source") == 1
    assert max(map(len, out.splitlines())) <= 80
    assert "2 of 2 lines pass" in out


def test_one_failure_fails_all_and_is_named(capsys: pytest.CaptureFixture[str]) -> None:
    assert not show_verdicts([verdict("one", "front"), verdict("two", "front", passed=False)], as_json=False)
    assert "FAILS" in capsys.readouterr().out


def test_json_stands_alone_on_standard_output(capsys: pytest.CaptureFixture[str]) -> None:
    show_verdicts([verdict("one", "front")], as_json=True)
    captured = capsys.readouterr()
    assert json.loads(captured.out)[0]["check"] == "one"
    assert "1 of 1 lines pass" in captured.err
