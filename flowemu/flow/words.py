"""Typed names, places and short forms of the flow file; read from text, each with its JSON Schema."""

from __future__ import annotations

import re
from collections.abc import Callable
from datetime import date
from typing import Annotated, Any

from pydantic import BeforeValidator, WithJsonSchema

from flowemu.flow.quantities import Length, complaint, shape

MAX_NAME = 60
NAME_PATTERN = r"^(?=.*[A-Za-z])[A-Za-z0-9_][A-Za-z0-9_ .+-]*$"
LAYER_PATTERN = r"^\s*[0-9]{1,5}\s*/\s*[0-9]{1,5}\s*$"
ORIENTATIONS = ("100", "110", "111")


def _name(value: Any) -> str:
    if not isinstance(value, str):
        raise complaint(f"expected a name, found {shape(value)}")
    if not re.match(NAME_PATTERN, value) or len(value) > MAX_NAME:
        raise complaint(
            f"'{value[:MAX_NAME]}' is not a name; expected up to {MAX_NAME} letters, digits, spaces or _ . + -, "
            "with a letter among them"
        )
    return value


def _text(value: Any) -> str:
    if not isinstance(value, str):
        raise complaint(f"expected a text, found {shape(value)}")
    return value


def _listed(value: Any) -> Any:
    if isinstance(value, list | tuple) and not value:
        raise complaint("expected at least one name")
    return value if isinstance(value, list | tuple) else [value]


def _layer(value: Any) -> tuple[int, int]:
    if isinstance(value, tuple) and len(value) == 2:
        return value
    if not isinstance(value, str) or not re.match(LAYER_PATTERN, value):
        raise complaint(f"expected layer/datatype such as '10/0', found {shape(value)}")
    layer, datatype = (int(part) for part in value.split("/"))
    if max(layer, datatype) > 65535:
        raise complaint(f"'{value}' is beyond layer/datatype 65535/65535")
    return layer, datatype


def _orientation(value: Any) -> str:
    bare = str(value).strip().removeprefix("(").removesuffix(")") if isinstance(value, str | int) else ""
    if bare not in ORIENTATIONS:
        raise complaint(f"expected an orientation, one of {', '.join(ORIENTATIONS)}, found {shape(value)}")
    return bare


def _date(value: Any) -> str:
    try:
        return date.fromisoformat(value).isoformat()
    except (TypeError, ValueError):
        raise complaint(f"expected a date such as '2026-03-31', found {shape(value)}") from None


def _long(count: int, what: str) -> Callable[[Any], Any]:
    def check(value: Any) -> Any:
        if not isinstance(value, list | tuple) or len(value) != count:
            raise complaint(f"expected {what}, found {shape(value)}")
        return value

    return check


Name = Annotated[
    str,
    BeforeValidator(_name),
    WithJsonSchema({"type": "string", "pattern": NAME_PATTERN, "maxLength": MAX_NAME, "description": "a name"}),
]
Text = Annotated[str, BeforeValidator(_text), WithJsonSchema({"type": ["string", "number", "boolean"]})]
Names = Annotated[
    tuple[Name, ...],
    BeforeValidator(_listed),
    WithJsonSchema(
        {
            "anyOf": [
                {"type": "string", "pattern": NAME_PATTERN},
                {"type": "array", "items": {"type": "string", "pattern": NAME_PATTERN}, "minItems": 1},
            ],
            "description": "a name or a list of names",
        }
    ),
]
Layer = Annotated[
    tuple[int, int],
    BeforeValidator(_layer),
    WithJsonSchema({"type": "string", "pattern": LAYER_PATTERN, "description": "layer/datatype", "examples": ["10/0"]}),
]
Orientation = Annotated[
    str,
    BeforeValidator(_orientation),
    WithJsonSchema({"enum": [*ORIENTATIONS, *(int(o) for o in ORIENTATIONS), *(f"({o})" for o in ORIENTATIONS)]}),
]
Date = Annotated[
    str, BeforeValidator(_date), WithJsonSchema({"type": "string", "pattern": "^[0-9]{4}-[0-9]{2}-[0-9]{2}$"})
]
Point = Annotated[tuple[Length, Length], BeforeValidator(_long(2, "a place such as '[25 um, 0 um]'"))]
Box = Annotated[
    tuple[Length, Length, Length, Length],
    BeforeValidator(_long(4, "a box such as '[-70 um, -70 um, 70 um, 70 um]', left, bottom, right, top")),
]
