"""Lines of keys, in every way that TOML lets a key be written."""

from __future__ import annotations

import tomllib

import pytest

from fem.case.locate import dotted, line_of, lines, split

TEXT = """\
title = "a"
a.b.c = 1
[piece]
start = { wall = 1, product = { x = 2 } }
values = [
  1, # a comment
  { deep = 2 },
]
[materials."mix 1"]
kind = "x"
[materials]
'odd.key' = 1
[[stages]]
name = "one"
[stages.surfaces.outside]
h = 1
[[stages]]
name = "two"
long = '''
[not a table]
'''
[stages.surfaces.outside]
h = 2
[[stages.parts]]
x = 1
[[stages.parts]]
x = 2
"""


@pytest.mark.parametrize(
    ("path", "line"),
    [
        (("title",), 1),
        (("a", "b", "c"), 2),
        (("a", "b"), 2),
        (("piece",), 3),
        (("piece", "start", "product", "x"), 4),
        (("piece", "values", 0), 6),
        (("piece", "values", 1, "deep"), 7),
        (("materials", "mix 1", "kind"), 10),
        (("materials", "odd.key"), 12),
        (("stages", 0), 13),
        (("stages", 0, "surfaces", "outside", "h"), 16),
        (("stages", 1, "name"), 18),
        (("stages", 1, "surfaces", "outside", "h"), 23),
        (("stages", 1, "parts", 1, "x"), 27),
        (("stages", 1, "surfaces", "outside", "missing"), 22),
        (("stages", 0, "missing"), 13),
        (("missing",), None),
    ],
)
def test_each_key_has_its_line(path: tuple[str | int, ...], line: int | None) -> None:
    tomllib.loads(TEXT)
    assert line_of(path, lines(TEXT)) == line


def test_places_are_written_as_the_case_writes_them() -> None:
    tree = tomllib.loads(TEXT)
    assert dotted(("stages", 1, "surfaces", "outside"), tree) == "stages.two.surfaces.outside"
    assert dotted(("materials", "mix 1", "kind"), tree) == 'materials."mix 1".kind'
    assert dotted(("stages", 1, "parts", 0), tree) == "stages.two.parts[1]"
    assert dotted(("new\nline",), tree) == '"new\\u000aline"'


def test_keys_split_at_their_dots() -> None:
    assert split("a.b") == ("a", "b")
    assert split('a . "b.c"') == ("a", "b.c")
    for wrong in ("", "a.", "a b", "a = 1\nb", "[a]"):
        with pytest.raises(ValueError, match="is no key"):
            split(wrong)
