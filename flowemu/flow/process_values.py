"""Values of the process data: forgiving names, ranges with a unit, and numbers that carry their citation."""

from __future__ import annotations

import re
from collections.abc import Iterable, Mapping
from typing import Annotated, Any, ClassVar, Literal, TypeVar

from pydantic import BaseModel, BeforeValidator, ConfigDict, ValidationInfo, model_validator

from flowemu import units
from flowemu.errors import FlowemuError, hint, near_miss
from flowemu.flow.quantities import complaint

Standing = Literal["read", "recomputed", "from memory", "unverified", "overridden"]


class UnknownNameError(FlowemuError):
    """A name that the process data do not have; `hint` is the near miss, or else what there is."""

    def __init__(self, what: str, name: str, known: Iterable[str], aliases: Iterable[str] = ()) -> None:
        names = list(known)
        words = [*names, *aliases]
        self.hint = hint(name, words if near_miss(name, words) else names).removeprefix("; ")
        super().__init__(f"unknown {what} '{name}'" + (f"; {self.hint}" if self.hint else ""))


def name_key(name: str) -> str:
    """The form in which names are compared: `Low stress_nitride` and `low-stress nitride` are one."""
    return re.sub(r"[\s_\u2010-\u2013-]+", "", name.casefold().replace("\u03bc", "u"))


def span(text: str, kind: str) -> tuple[float, float]:
    """The two ends of a text such as `580 to 630 degC`, equal for a single value, in the program's own unit.

    Raises
    ------
    ValueError
        Where the text is not such a quantity, is negative but for a temperature, or has its ends out of order.
    """
    first, to, last = text.rpartition(" to ")
    high = units.parse(last, kind)
    low = units.parse(first, kind, bare=re.sub(r"^[\s\d.+-]+", "", last)) if to else high
    if low > high:
        raise ValueError(f"'{text}' ends below its start")
    if low < 0.0 and kind != "temperature":
        raise ValueError(f"'{text}' is below zero")
    return low, high


def check_span(text: str, kind: str) -> None:
    """Complain, in pydantic's way, about a text that `span` cannot read."""
    try:
        span(text, kind)
    except ValueError as error:
        raise complaint(str(error)) from None


def stated(given: Any, info: ValidationInfo) -> Any:
    """A value that the flow states needs no citation; one of the files does."""
    if not info.context:
        return given
    entry = given if isinstance(given, dict) else {"value": given}
    return {"source": "flow", "standing": "overridden", **entry}


def _listed(value: Any) -> Any:
    return value if isinstance(value, list | tuple) else [value]


Names = Annotated[tuple[str, ...], BeforeValidator(_listed)]
N = TypeVar("N", bound="Named")


class Record(BaseModel):
    """One entry of the data; frozen, with no room for unknown keys."""

    model_config = ConfigDict(extra="forbid", frozen=True, coerce_numbers_to_str=True, populate_by_name=True)

    @classmethod
    def names(cls) -> list[str]:
        """The keys as they stand in the files."""
        return [field.alias or name for name, field in cls.model_fields.items()]


class Cited(Record):
    """A value as published: number and unit, conditions, source (a key of the sources) and standing."""

    kind: ClassVar[str] = ""
    value: str
    conditions: str = ""
    source: str
    standing: Standing
    note: str = ""

    _flow = model_validator(mode="before")(stated)

    @model_validator(mode="after")
    def _reads(self) -> Cited:
        if self.kind:
            check_span(self.value, self.kind)
        return self

    @property
    def low(self) -> float:
        """The lower end in the program's own unit; equal to `high` for a single value."""
        return span(self.value, self.kind)[0]

    @property
    def high(self) -> float:
        return span(self.value, self.kind)[1]


class CitedTemperature(Cited):
    kind = "temperature"


class CitedFraction(Cited):
    kind = "fraction"


class CitedAngle(Cited):
    kind = "angle"


class CitedRate(Cited):
    kind = "rate"


class Named(Record):
    """An entry found by its name; `overridden` says that the flow gave it or a part of it."""

    name: str
    about: str = ""
    aliases: Names = ()
    overridden: bool = False


def find(what: str, table: Mapping[str, N], name: str) -> N:
    """The record of that name or alias, in a table by `name_key`. Raises UnknownNameError."""
    key = name_key(name)
    if key in table:
        return table[key]
    for record in table.values():
        if any(name_key(alias) == key for alias in record.aliases):
            return record
    aliases = [alias for record in table.values() for alias in record.aliases if len(alias) > 3]
    raise UnknownNameError(what, name, [record.name for record in table.values()], aliases)
