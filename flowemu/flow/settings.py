"""The common ground of every section and step of the flow file."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from typing import Any, ClassVar, Literal

from pydantic import BaseModel, ConfigDict, Field, model_validator
from pydantic_core import core_schema

from flowemu.flow.quantities import complaint
from flowemu.flow.words import Name, Text

Side = Literal["front", "back", "both"]


class Settings(BaseModel):
    """A mapping of the flow file; frozen, and without room for unknown settings.

    `exactly_one` lists groups of settings of which one and only one must be given; `only_with` names settings that
    make sense only beside one of others.
    """

    model_config = ConfigDict(
        extra="forbid", frozen=True, json_schema_extra=lambda schema, cls: _state_rules(schema, cls)
    )

    exactly_one: ClassVar[tuple[tuple[str, ...], ...]] = ()
    only_with: ClassVar[dict[str, tuple[str, ...]]] = {}

    @classmethod
    def broken_rules(cls, given: Iterable[str]) -> list[str]:
        """What is wrong with this choice of settings, by their names in the flow file."""
        names = set(given)
        texts = []
        for group in cls.exactly_one:
            found = [name for name in group if name in names]
            if len(found) != 1:
                have = f"; found {' and '.join(found)}" if found else ""
                texts.append(f"expected exactly one of {', '.join(group)}{have}")
        for name, others in cls.only_with.items():
            if name in names and not names & set(others):
                texts.append(f"'{name}' may only follow {' or '.join(others)}")
        return texts

    @model_validator(mode="after")
    def _keeps_rules(self) -> Settings:
        fields = type(self).model_fields
        given = (name for name in self.model_fields_set if getattr(self, name) is not None)
        broken = self.broken_rules(fields[name].alias or name for name in given)
        if broken:
            raise complaint("; ".join(broken))
        return self

    @classmethod
    def names(cls) -> list[str]:
        """The settings' names as they stand in the flow file."""
        return [field.alias or name for name, field in cls.model_fields.items()]

    @classmethod
    def build(cls, **given: Any) -> Any:
        """The settings from Python, numbers in the program's own units; `with_` stands for `with`."""
        return cls.model_validate({name.removesuffix("_"): value for name, value in given.items()})


@dataclass(frozen=True)
class OrShort:
    """Lets the value of one setting stand for its whole mapping; stands as metadata in an `Annotated` type."""

    setting: str

    def read(self, value: Any) -> Any:
        return value if isinstance(value, dict | Settings) else {self.setting: value}

    def __get_pydantic_core_schema__(self, source: Any, handler: Any) -> core_schema.CoreSchema:
        return core_schema.no_info_before_validator_function(self.read, handler(source))

    def __get_pydantic_json_schema__(self, schema: Any, handler: Any) -> dict[str, Any]:
        mapping = handler(schema)
        short = handler.resolve_ref_schema(mapping)["properties"][self.setting]
        return {"anyOf": [short, mapping]}


def _state_rules(schema: dict[str, Any], model: Any) -> None:
    """Adds a model's rules between settings to its JSON Schema."""
    rules: list[dict[str, Any]] = [{"oneOf": [{"required": [name]} for name in group]} for group in model.exactly_one]
    for name, others in model.only_with.items():
        beside = [{"required": [other]} for other in others]
        rules.append({"if": {"required": [name]}, "then": {"anyOf": beside}})
    if rules:
        schema["allOf"] = rules


class StepSettings(Settings):
    """What every step may carry."""

    name: Name | None = Field(None, description="A name for the step, for --until and --after.")
    note: Text | None = Field(None, description="A remark; printed on the run sheet.")
