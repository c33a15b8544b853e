"""Turns what the models found wrong into located faults in the trade's words."""

from __future__ import annotations

import re
from collections.abc import Collection, Iterator
from typing import Any, get_args

from pydantic import ValidationError

from flowemu.errors import Fault, hint, near_miss
from flowemu.flow.document import Document, Path, joined
from flowemu.flow.quantities import shape
from flowemu.flow.settings import Settings

_WANTED = {
    "model_type": "a mapping of settings",
    "model_attributes_type": "a mapping of settings",
    "dict_type": "a mapping",
    "list_type": "a list",
    "tuple_type": "a list",
    "string_type": "a text",
}


def faults_of(
    error: ValidationError, document: Document, model: type[Settings], base: Path = (), label: str = ""
) -> Iterator[Fault]:
    """Every fault in a failed validation of the data that stands at `base`, read as `model`.

    `label` begins each text, such as `step 4 (etch)`.
    """
    details = error.errors(include_url=False)
    meant = {_meant(detail, model) for detail in details if detail["type"] == "extra_forbidden"}
    for detail in details:
        loc = tuple(part for part in detail["loc"] if part != "[key]")
        if (detail["type"] == "missing" and loc in meant) or _empty_inside(document, base, loc):
            continue
        where, text, at_key = _complaint(detail, loc, model)
        name = joined(document.known((*base, *where))[len(base) :])
        yield document.fault((*base, *loc), ": ".join(part for part in (label, name, text) if part), at_key)


def _meant(detail: Any, model: type[Settings]) -> Path:
    """Where the misspelt setting should have stood, so that it is not called missing as well."""
    *outer, word = detail["loc"]
    owner = _model_at(model, tuple(outer))
    return (*outer, near_miss(str(word), owner.names() if owner else ()))


def _complaint(detail: Any, loc: Path, model: type[Settings]) -> tuple[Path, str, bool]:
    """What the complaint is about, what it says, and whether it stands at the key."""
    kind, value = detail["type"], detail["input"]
    entry = "section" if len(loc) == 1 and "steps" in model.names() else "setting"
    if kind == "extra_forbidden":
        owner = _model_at(model, loc[:-1])
        known = owner.names() if owner else []
        return loc[:-1], f"unknown {entry} '{loc[-1]}'{hint(str(loc[-1]), known, 'allowed here are')}", True
    if kind == "missing":
        return loc[:-1], f"missing {entry} '{loc[-1]}'", True
    if kind == "literal_error":
        known = re.findall(r"'([^']*)'", detail["ctx"]["expected"])
        return loc, f"unknown word {shape(value)}{hint(str(value), known)}", False
    if kind == "too_short":
        return loc, "expected at least one entry", False
    if kind in _WANTED:
        return loc, f"expected {_WANTED[kind]}, found {shape(value)}", False
    return loc, detail["msg"], not loc or detail["loc"][-1] == "[key]"


def _empty_inside(document: Document, base: Path, loc: Path) -> bool:
    """Whether the entry stands in the file without a value, which is complained of by `empty_values`."""
    path = document.known((*base, *loc))
    return len(path) > len(base) and _empty(document, path)


def _empty(document: Document, path: Path) -> bool:
    data: Any = document.data
    for part in document.known(path):
        data = data[part]
    return data is None


def empty_values(document: Document, skip: Collection[Path]) -> Iterator[Fault]:
    """A fault for every entry without a value, but for those in `skip`."""
    for path in document.marks:
        free_form = len(path) > 1 and path[0] in ("data", "tolerances")
        if path not in skip and not free_form and _empty(document, path):
            yield document.fault(path, f"{document.name_of(path)}: no value", at_key=True)


def _model_at(model: type[Settings], loc: Path) -> type[Settings] | None:
    """The model of the mapping at `loc` inside `model`."""
    found: type[Settings] | None = model
    for part in loc:
        if found is None or isinstance(part, int):
            continue
        fields = {field.alias or name: field for name, field in found.model_fields.items()}
        if part in fields:
            found = settings_in(fields[part].annotation)
    return found


def settings_in(annotation: Any) -> type[Settings] | None:
    """The settings model somewhere inside a type."""
    if isinstance(annotation, type) and issubclass(annotation, Settings):
        return annotation
    return next((found for part in get_args(annotation) if (found := settings_in(part))), None)
