"""Values written into a case together with where they come from."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import tomlkit
from tomlkit.items import InlineTable

from fem.case.locate import split
from fem.case.override import apply


@dataclass(frozen=True)
class Origin:
    """A value and its story.

    Parameters
    ----------
    key
        Dotted, as the case has it.
    value
        As the case writes it, without quotes.
    comment
        Where it comes from.

    """

    key: str
    value: str
    comment: str


def with_origins(text: str, origins: Sequence[Origin], source: str = "<text>") -> str:
    """Return a case with values set, each with a comment behind it.

    Parameters
    ----------
    text
        A TOML text that can be read.
    origins
        What to set; earlier comments on the same lines go.
    source
        What messages call the case.

    Raises
    ------
    CaseError
        Where a key cannot be set.

    """
    document = tomlkit.parse(apply(text, [f'{o.key}="{o.value}"' for o in origins], source))
    for origin in origins:
        _comment(document, split(origin.key), origin.comment)
    return tomlkit.dumps(document)


def _comment(tree: Any, path: Sequence[str], comment: str) -> None:
    """Put a comment behind a value, or behind the inline table that holds it."""
    for word in path:
        if isinstance(tree, list):
            inner = next(entry for entry in tree if str(entry.get("name")) == word)
        else:
            inner = tree.item(word) if hasattr(tree, "item") else tree[word]
        if isinstance(inner, InlineTable):
            inner.comment(comment)
            return
        tree = inner
    tree.comment(comment)
