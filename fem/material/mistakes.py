"""Mistakes of a whole table of the case file, put at the keys that hold them."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from pydantic import ValidationError
from pydantic_core import InitErrorDetails, PydanticCustomError


def wrong(message: str) -> PydanticCustomError:
    """Return the error of one field, for a field validator to raise."""
    # Braces would be read as fields of the message's template.
    return PydanticCustomError("material", "{said}", {"said": message})


def refuse(title: str, mistakes: Mapping[str, str], found: Mapping[str, Any] | None = None) -> None:
    """Raise all mistakes of a table at once; do nothing where there are none.

    Parameters
    ----------
    title
        The table, in words.
    mistakes
        Message by key; "" is the table itself.
    found
        Values by key, as far as they are known.

    Raises
    ------
    pydantic.ValidationError
        With one line a mistake. Raised in a validator it keeps its keys: pydantic puts the
        place of the table before them.

    """
    if not mistakes:
        return
    lines = [
        InitErrorDetails(type=wrong(message), loc=(key,) if key else (), input=(found or {}).get(key))
        for key, message in mistakes.items()
    ]
    raise ValidationError.from_exception_data(title, lines)
