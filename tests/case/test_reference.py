from __future__ import annotations

import tomllib
from typing import Any

import pytest

from fem.case.read import SECTIONS, loads
from fem.case.reference import reference
from fem.case.schema import schema
from fem.heat.exchange import EXCHANGES
from fem.material import MATERIALS
from fem.mesh.shape import SHAPES
from tests.conftest import CASES

PAGE = reference()


def test_the_page_in_cases_is_what_the_models_say() -> None:
    stale = "run `python -m fem.case.reference > cases/README.md`"
    assert (CASES / "README.md").read_text(encoding="utf-8") == PAGE, stale


@pytest.mark.parametrize("section", SECTIONS)
def test_every_section_is_there(section: str) -> None:
    assert f"[{section}" in PAGE or f"`{section} = " in PAGE


def test_every_form_kind_and_exchange_is_there_with_its_names() -> None:
    for word, kinds in (("form", SHAPES), ("kind", MATERIALS), ("exchange", EXCHANGES)):
        for kind in kinds:
            assert f'### `{word} = "{kind}"`' in PAGE
    assert '| `bar` | `"plane"` | `outside` | `product`, `wall` (if `wall` is given) |' in PAGE
    assert '| `slab` | `"plane"` | `left`, `right`, `bottom`, `top` | `product` |' in PAGE


def test_every_key_has_a_row() -> None:
    tables = schema()["$defs"]
    del tables["Column"]  # its two keys are said under the rules, once for all lists
    rows = {key for table in tables.values() for key in table.get("properties", {})}
    missing = [key for key in rows - {"form", "kind", "exchange"} if f"| `{key}` |" not in PAGE]
    assert not missing


def test_a_row_says_value_default_meaning_and_example() -> None:
    assert '| `corner` | length | `"0 mm"` | Radius of the product\'s corners. | `corner = "6 mm"` |' in PAGE
    assert '| `reach` | temperature | **required** | Temperature to reach. | `reach = "-12 degC"` |' in PAGE


def examples(heading: str) -> dict[str, Any]:
    """Read every example under a heading, each as TOML."""
    body = PAGE.split(f"\n{heading}\n", 1)[1]
    table = next(part for part in body.split("\n\n") if part.startswith("| key |"))
    rows = [line for line in table.splitlines() if line.startswith("| `")]
    return tomllib.loads("\n".join(row.rsplit(" | ", 1)[1].strip("|` ") for row in rows))


def test_the_examples_of_the_page_make_a_case_that_reads() -> None:
    shape = examples('### `form = "bar"`')
    recipe = examples('### `kind = "recipe"`')
    recipe = {k: v for k, v in recipe.items() if k not in ("density", "freezing_point")}
    piece = {k: v for k, v in examples("## `[piece]`").items() if k != "start"}
    steel = examples('### `kind = "plain"`')
    fluid = examples('### `exchange = "fluid"`')
    aim, stepping = examples("## `[aim]`"), examples("## `[stepping]`")
    stage = {k: v for k, v in examples("## `[[stages]]`").items() if k != "surfaces"}
    text = "\n".join(
        [
            "schema = 1",
            *(f"{name} = {inline(table)}" for name, table in {
                "piece": piece,
                "shape": {"form": "bar", **shape},
                "regions": {"product": "mix", "wall": "steel"},
                "materials": {"mix": {"kind": "recipe", **recipe}, "steel": {"kind": "plain", **steel}},
                "aim": aim,
                "stepping": stepping,
            }.items()),
            f"stages = [{inline({**stage, 'surfaces': {'outside': {'exchange': 'fluid', **fluid}}})}]",
        ]
    )  # fmt: skip
    case = loads(text)
    assert case.stages[0].lasts == 1200.0


def inline(table: dict[str, Any]) -> str:
    def value(v: Any) -> str:
        return inline(v) if isinstance(v, dict) else f'"{v}"' if isinstance(v, str) else str(v)

    return "{ " + ", ".join(f"{key} = {value(v)}" for key, v in table.items()) + " }"
