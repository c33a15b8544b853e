"""The JSON Schema of the flow file, from the same models that read it; for editors."""

from __future__ import annotations

from typing import Any

from flowemu.flow.limits import Limits
from flowemu.flow.sections import FlowFile
from flowemu.registry import StepKind, step_kinds

DIALECT = "https://json-schema.org/draft/2020-12/schema"


def flow_schema() -> dict[str, Any]:
    """The schema of the whole file, every step kind included."""
    schema: dict[str, Any] = FlowFile.model_json_schema(by_alias=True)
    definitions = schema.setdefault("$defs", {})
    kinds = step_kinds()
    for kind in kinds.values():
        own = kind.settings.model_json_schema(by_alias=True)
        definitions |= own.pop("$defs", {})
        definitions[_key(kind)] = own | {"description": kind.doc, "title": kind.verb}
    schema["properties"]["steps"]["items"] = _step(kinds)
    limits = Limits.model_json_schema()
    definitions |= limits.pop("$defs")
    schema["properties"]["limits"] = limits
    cleaned: dict[str, Any] = _tightened(schema)
    return {"$schema": DIALECT, **cleaned, "title": "flowemu flow", "description": FlowFile.__doc__}


def _key(kind: StepKind) -> str:
    return f"step {kind.verb}"


def _bare(kinds: dict[str, StepKind]) -> list[str]:
    """The verbs that need no settings."""
    return [verb for verb, kind in kinds.items() if not kind.settings.model_json_schema().get("required")]


def _step(kinds: dict[str, StepKind]) -> dict[str, Any]:
    """One verb with its settings, in its short form, or bare where it needs none."""
    bare = _bare(kinds)
    verbs = {}
    for kind in kinds.values():
        forms: list[dict[str, Any]] = [{"$ref": f"#/$defs/{_key(kind).replace(' ', '%20')}"}]
        if kind.short is not None:
            forms.append({"type": "string"})
        if kind.verb in bare:
            forms.append({"const": None})
        verbs[kind.verb] = {"anyOf": forms, "description": kind.doc}
    mapping = {
        "type": "object", "properties": verbs, "additionalProperties": False, "minProperties": 1, "maxProperties": 1,
    }  # fmt: skip
    return {"anyOf": [mapping, {"enum": bare}]}


def _tightened(value: Any) -> Any:
    """The schema without what stands for a setting left out, and with no room for names that do not fit."""
    if isinstance(value, list):
        return [_tightened(item) for item in value if item != {"type": "null"}]
    if not isinstance(value, dict):
        return value
    kept = {key: _tightened(item) for key, item in value.items() if not (key == "default" and not _plain(item))}
    if "patternProperties" in kept:
        kept["additionalProperties"] = False
    one = kept.get("anyOf")
    if isinstance(one, list) and len(one) == 1:
        return {**kept.pop("anyOf")[0], **kept}
    return kept


def _plain(default: Any) -> bool:
    """Whether a default reads the same in the flow file; numbers there carry units."""
    return isinstance(default, str)
