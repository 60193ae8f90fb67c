"""The case language as a JSON Schema, drawn from the models, for editors and for the reference.

What a key is for is said in one place, the "Parameters" section of its model's docstring, and so is
an example of it (``such as "50 mm"``) where that of its quantity would not do.
"""

from __future__ import annotations

import inspect
import json
import re
from collections.abc import Mapping
from typing import Any

from docstring_parser import DocstringStyle, parse
from pydantic import BaseModel
from pydantic.fields import FieldInfo
from pydantic.json_schema import GenerateJsonSchema, JsonSchemaValue, models_json_schema
from pydantic_core import core_schema

from fem.case.case import Aim, Piece, Stage
from fem.case.read import REQUIRED, SCHEMA
from fem.heat.exchange import EXCHANGES
from fem.march.control import Stepping
from fem.material import MATERIALS
from fem.mesh.shape import SHAPES
from fem.quantity import Kind
from fem.watch.schedule import Watch

DIALECT = "https://json-schema.org/draft/2020-12/schema"
_PLACE = "#/$defs/{model}"
_EXAMPLE = re.compile(r',? such as "([^"]+)"')


def schema() -> dict[str, Any]:
    """Return the JSON Schema (draft 2020-12) of a case file.

    It knows words, kinds of tables and how a quantity is written. What the parts of a case have to
    do with each other (names of regions, bounds, lengths of lists) only reading a case tells.
    """
    kinds: list[type[BaseModel]] = [*SHAPES.values(), *MATERIALS.values(), *EXCHANGES.values()]
    tables: list[type[BaseModel]] = [Piece, Stage, Watch, Aim, Stepping]
    _, drawn = models_json_schema(
        [(model, "validation") for model in (*kinds, *tables)],
        ref_template=_PLACE,
        schema_generator=_Drawn,
    )
    definitions = drawn["$defs"]
    definitions["Stage"]["properties"]["surfaces"]["additionalProperties"] = _one_of(EXCHANGES)
    properties = {
        "schema": {"const": SCHEMA, "description": "Version of the case language."},
        "title": {
            "type": "string",
            "description": "What is asked, in your words.",
            "examples": ["Are 20 minutes enough?"],
        },
        "piece": {"$ref": _place(Piece)},
        "shape": _one_of(SHAPES),
        "regions": {
            "type": "object",
            "additionalProperties": {"type": "string"},
            "minProperties": 1,
            "description": "Material of each region of the shape.",
        },
        "materials": {
            "type": "object",
            "additionalProperties": _one_of(MATERIALS),
            "minProperties": 1,
            "description": "What the regions are made of, by names of your choice.",
        },
        "stages": {
            "type": "array",
            "items": {"$ref": _place(Stage)},
            "minItems": 1,
            "description": "What happens to the piece, in order.",
        },
        "watch": {"$ref": _place(Watch)},
        "aim": {"$ref": _place(Aim)},
        "stepping": {"$ref": _place(Stepping)},
        "uncertainty": {
            "type": "object",
            "additionalProperties": {"type": "string"},
            "description": "Half-width of the interval that a key's value lies in 19 times out of 20, by its "
            "dotted key in quotes: a share of the value or an amount in its unit. Left out, what the trade "
            "knows of h, coolant, thickness, conductivity and freezing point is used.",
        },
    }
    # What a text is read into has a definition too, which no key refers to.
    used = re.findall(r"#/\$defs/(\w+)", json.dumps([properties, definitions]))
    return {
        "$schema": DIALECT,
        "title": "Case file of rimefront",
        "description": "Mould, recipe, coolant and stages of one moulded frozen piece.",
        "type": "object",
        "properties": properties,
        "required": list(REQUIRED),
        "additionalProperties": False,
        "$defs": {name: drawn for name, drawn in definitions.items() if name in used},
    }


def _place(model: type[BaseModel]) -> str:
    return _PLACE.format(model=model.__name__)


def _one_of(kinds: Mapping[str, Any]) -> dict[str, Any]:
    return {"oneOf": [{"$ref": _place(model)} for model in kinds.values()]}


class _Drawn(GenerateJsonSchema):
    """Draws tables as a TOML file has them: no null, values with units, the kind always named."""

    def model_schema(self, schema: core_schema.ModelSchema) -> JsonSchemaValue:
        drawn = super().model_schema(schema)
        model = schema["cls"]
        said = meanings(model)
        properties: dict[str, Any] = drawn.get("properties", {})
        for name, field in model.model_fields.items():
            key = field.alias or name
            if key not in properties:
                continue
            described = properties[key]
            if name in said:
                described["description"] = _EXAMPLE.sub("", said[name])
                if examples := _EXAMPLE.findall(said[name]):
                    described["examples"] = examples
            if "const" in described:
                drawn["required"] = [key, *drawn.get("required", [])]
            elif (written := _written(field)) is not None:
                described["default"] = written
        drawn["title"] = model.__name__
        drawn["description"] = summary(model)
        return drawn

    def dict_schema(self, schema: core_schema.DictSchema) -> JsonSchemaValue:
        # The titles, which name the quantity, are taken off by default.
        inner = self.generate_inner(schema["values_schema"])
        return {**super().dict_schema(schema), "additionalProperties": inner}

    def nullable_schema(self, schema: core_schema.NullableSchema) -> JsonSchemaValue:
        return self.generate_inner(schema["schema"])

    def default_schema(self, schema: core_schema.WithDefaultSchema) -> JsonSchemaValue:
        return self.generate_inner(schema["schema"])

    def field_title_should_be_set(self, schema: Any) -> bool:
        return False


def _written(field: FieldInfo) -> str | None:
    """Write a default as a case would have it; None for one that is no single value."""
    kind = next((mark for mark in field.metadata if isinstance(mark, Kind)), None)
    if kind is not None and isinstance(field.default, float):
        return kind.written(field.default)
    return field.default if isinstance(field.default, str) else None


def meanings(model: type[BaseModel]) -> dict[str, str]:
    """Return what each key of a table is for, by its name in Python.

    Units in brackets are left out: they are those inside the program, and a case names its own.
    """
    found: dict[str, str] = {}
    for owner in reversed(model.__mro__):
        if not (issubclass(owner, BaseModel) and owner is not BaseModel):
            continue
        for parameter in parse(inspect.cleandoc(owner.__doc__ or ""), DocstringStyle.NUMPYDOC).params:
            for name in parameter.arg_name.split(","):
                found[name.strip()] = _plain(parameter.description or "")
    return found


def summary(model: type[BaseModel]) -> str:
    """Return what a table is, as its docstring says before its keys."""
    doc = parse(inspect.cleandoc(model.__doc__ or ""), DocstringStyle.NUMPYDOC)
    return _plain(" ".join(part for part in (doc.short_description, doc.long_description) if part))


def _plain(text: str) -> str:
    return re.sub(r"\s+", " ", re.sub(r"\s*\[[^\[\]]*\]|`", "", text)).strip()
