"""The cases that are shipped read, say what they are for, and hold the stated masses."""

from __future__ import annotations

from pathlib import Path

import pytest

from fem.case.read import load

CASES = Path(__file__).parents[2] / "cases"


@pytest.mark.parametrize("path", sorted(CASES.glob("*.toml")), ids=lambda path: path.stem)
def test_a_case_reads_and_opens_with_what_why_and_expected(path: Path) -> None:
    case = load(path)
    assert case.title
    opening = [line.split(":")[0] for line in path.read_text(encoding="utf-8").splitlines()[:3]]
    assert opening == ["# What", "# Why", "# Expected"]
    # The trade would not raise an eyebrow at a case that is shown as an example.
    assert [e.cautions() for s in case.stages for e in s.surfaces.values()] == [[] for s in case.stages]


# Masses of a fill: common practice, no source.
@pytest.mark.parametrize(("name", "mass"), [("workshop_bar", 0.095), ("factory_bar", 0.078)])
def test_a_straight_bar_weighs_as_much_as_the_tapered_one(name: str, mass: float) -> None:
    case = load(CASES / f"{name}.toml")
    assert case.piece.length is not None
    volume = case.shape.volumes(case.piece.length)["product"]
    assert volume * case.materials["mix"].build().density == pytest.approx(mass, rel=5e-3)
