"""What differs between cases, as their texts have it."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

# Words of a case that change nothing of what comes out.
WORDLESS = ("title",)
MISSING = "–"
LONGEST = 60


def differences(cases: Sequence[Mapping[str, Any]]) -> dict[str, tuple[str, ...]]:
    """Return dotted key -> its value in each case, for the keys whose values differ.

    Parameters
    ----------
    cases
        As TOML gives them; an empty one has no keys.

    """
    settings = [_flat(case) for case in cases]
    known = dict.fromkeys(key for one in settings for key in one)
    return {
        key: tuple(one.get(key, MISSING) for one in settings)
        for key in known
        if key not in WORDLESS and len({one.get(key) for one in settings}) > 1
    }


def _flat(tree: Any, above: str = "") -> dict[str, str]:
    """Return dotted key -> value as text; entries of a list by their name."""
    if isinstance(tree, dict):
        pairs = [(f"{above}.{key}" if above else key, value) for key, value in tree.items()]
    elif isinstance(tree, list) and tree and all(isinstance(entry, dict) for entry in tree):
        names = [str(entry.get("name", n + 1)) for n, entry in enumerate(tree)]
        pairs = [
            (f"{above}.{name}", {k: v for k, v in entry.items() if k != "name"})
            for name, entry in zip(names, tree, strict=True)
        ]
    else:
        return {above: _text(tree)}
    out: dict[str, str] = {}
    for key, value in pairs:
        out |= _flat(value, key)
    return out


def _text(value: Any) -> str:
    text = ", ".join(map(str, value)) if isinstance(value, list) else str(value)
    return text if len(text) <= LONGEST else text[: LONGEST - 1] + "…"
