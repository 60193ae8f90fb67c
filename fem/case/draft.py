"""Starter cases: every key that a user will want to change, with where the number comes from."""

from __future__ import annotations

from importlib.resources import files

from fem.errors import CaseError, Problem, unknown

PRODUCTS = ("bar", "tube")


def draft(product: str) -> str:
    """Return the text of a starter case that runs as it is.

    Parameters
    ----------
    product
        One of `PRODUCTS`.

    Raises
    ------
    CaseError
        Another product; says which there are.

    """
    if product not in PRODUCTS:
        raise CaseError("draft", [Problem("product", unknown("starter case", product, PRODUCTS))])
    return (files("fem.case") / "drafts" / f"{product}.toml").read_text(encoding="utf-8")
