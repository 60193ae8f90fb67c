"""A page of HTML from what a report has to say; every text that comes from a user is escaped."""

from __future__ import annotations

import base64
import math
import re
from pathlib import Path
from typing import Any

from fem.result.answer import duration

_HERE = Path(__file__).parent
_DEGREES = re.compile(r"(?<=[\d ])degC\b")
_MINUS = re.compile(r"(?<![\w.\-])-(?=\d)")
_SPAN = re.compile(r"(?<=\d)-(?=[\d.]+ (?:s|min|h)\b)")
_UNIT = re.compile(r"(?<=\d) (?=(?:°C|%|mm|min|kJ|kW|W|K|J|g|h|s)\b|%)")


def render(content: dict[str, Any], template: str = "report.html.j2") -> str:
    """Return the page.

    Parameters
    ----------
    content
        What the template names.
    template
        Its file, beside this module.

    """
    from jinja2 import Environment, FileSystemLoader, StrictUndefined
    from markupsafe import Markup

    environment = Environment(
        loader=FileSystemLoader(_HERE),
        autoescape=True,
        undefined=StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
    )
    environment.filters |= {
        "typeset": typeset,
        "number": number,
        "duration": lambda seconds: typeset(duration(seconds)),
        "power": power,
        "image": image,
    }
    style = Markup((_HERE / "report.css").read_text(encoding="utf-8"))
    return environment.get_template(template).render(style=style, **content)


def typeset(text: str) -> str:
    """Return a sentence as it is printed: its signs, and numbers kept with their units.

    >>> typeset("reaches -12 degC after 19.3 min").replace(chr(160), "_")
    'reaches −12_°C after 19.3_min'
    >>> typeset("likely 16-24 min").replace(chr(160), "_")
    'likely 16–24_min'
    """
    text = _SPAN.sub("\N{EN DASH}", text)
    text = _MINUS.sub("\N{MINUS SIGN}", _DEGREES.sub("°C", text)).replace("<=", "≤").replace(">=", "≥")
    return _UNIT.sub("\N{NO-BREAK SPACE}", text)


def number(value: float | None, digits: int = 1) -> str:
    """Return a number with so many decimals and a true minus sign; a dash where there is none.

    >>> number(-0.04), number(-16.39), number(None)
    ('0.0', '−16.4', '–')
    """
    if value is None or not math.isfinite(value):
        return "–"
    text = f"{value:.{digits}f}" if abs(value) < 1e7 else f"{value:.3g}"
    if float(text) == 0.0:
        text = text.lstrip("-")
    return text.replace("-", "\N{MINUS SIGN}")


def power(value: float) -> str:
    """Return the size of a small number in tens.

    >>> power(-7.07e-15), power(0.0), power(0.012)
    ('7·10⁻¹⁵', '0', '1·10⁻²')
    """
    if value == 0.0 or not math.isfinite(value):
        return "0" if value == 0.0 else "–"
    digit, exponent = f"{abs(value):.0e}".split("e")
    raised = str(int(exponent)).translate(str.maketrans("-0123456789", "⁻⁰¹²³⁴⁵⁶⁷⁸⁹"))
    return f"{digit}·10{raised}"


def image(svg: str) -> str:
    """Return the address of a picture that lies in the page itself."""
    return "data:image/svg+xml;base64," + base64.b64encode(svg.encode()).decode()
