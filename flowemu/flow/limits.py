"""The `limits:` section: the keys of the checks' limits, and what a limit may be measured in.

    limits: {foot: {warning: 1.5 um}, unmeant_loss: {error: [30 %, 50 nm]}, play: {note: off}}

Each key takes the severities that it overrides. A limit is one value, a list of values that must all be passed, or
`off`. What the keys mean and their usual values, which are common practice, is said by the checks that use them.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Annotated, Any

from pydantic import Field, create_model
from pydantic_core import core_schema

from flowemu import units
from flowemu.flow.quantities import complaint, shape
from flowemu.flow.settings import Settings

OFF = "off"
NUMBER = "number"
LIMITS: dict[str, tuple[str, ...]] = {
    "part": (),
    "expectation": (),
    "unresolved": (),
    "foot": ("length", "fraction"),
    "insulator_foot": ("length", NUMBER),
    "window_margin": ("fraction",),
    "mask_left": ("fraction", "length"),
    "stop_left": ("fraction",),
    "unmeant_loss": ("fraction", "length"),
    "stringer": ("length",),
    "enclosure": ("length",),
    "undercut": ("fraction", NUMBER),
    "resist_aspect": (NUMBER,),
    "trench_aspect": (NUMBER,),
    "refill_aspect": (NUMBER,),
    "coverage": ("fraction",),
    "lift_off": (NUMBER, "angle"),
    "gap_left": ("length", NUMBER),
    "hole_left": ("length",),
    "play": ("length", "fraction"),
    "capillary": (NUMBER,),
    "adhesion": (NUMBER,),
    "temperature": ("temperature",),
    "bow": ("length",),
    "open_area": ("fraction",),
    "open_side": ("fraction",),
    "sealed_void": (),
}

Limit = tuple[tuple[str, float], ...]
"""(kind, number) pairs, all of which must be passed; empty for `off`. The kind is a unit's, or `number`."""


@dataclass(frozen=True)
class LimitOf:
    """What a limit may be measured in; stands as metadata in an `Annotated` type."""

    kinds: tuple[str, ...]

    def read(self, value: Any) -> Limit:
        if value == OFF:
            return ()
        texts = value if isinstance(value, list) else [value]
        return tuple(self._measure(text) for text in texts)

    def _measure(self, text: Any) -> tuple[str, float]:
        for kind in self.kinds:
            try:
                return kind, float(text) if kind == NUMBER else units.parse(text, kind)
            except (TypeError, ValueError):
                continue
        wanted = [_example(kind) for kind in self.kinds] + [f"'{OFF}'"]
        raise complaint(f"expected {' or '.join(wanted)}, found {shape(text)}")

    def __get_pydantic_core_schema__(self, source: Any, handler: Any) -> core_schema.CoreSchema:
        return core_schema.no_info_plain_validator_function(self.read)

    def __get_pydantic_json_schema__(self, schema: Any, handler: Any) -> dict[str, Any]:
        choices: list[dict[str, Any]] = [{"enum": [OFF, False]}]
        for kind in self.kinds:
            one = {"type": "number"} if kind == NUMBER else {"type": "string", "pattern": units.pattern(kind)}
            choices.append(one)
        return {"anyOf": [*choices, {"type": "array", "items": {"anyOf": choices[1:] or [{"type": "string"}]}}]}


def _example(kind: str) -> str:
    return "a number such as '2.5'" if kind == NUMBER else units.expected(kind)


def _levels(kinds: tuple[str, ...]) -> Any:
    """The model of one key's three severities."""
    limit: Any = Annotated[Limit, LimitOf(kinds)] | None
    title = "Levels of " + (" or ".join(kinds) or "nothing but off")
    note, warning, error = ((limit, Field(None, description=f"Where a {word} begins.")) for word in _SEVERITIES)
    return create_model(title, __base__=Settings, note=note, warning=warning, error=error)


_SEVERITIES = ("note", "warning", "error")
_BY_KINDS = {kinds: _levels(kinds) for kinds in dict.fromkeys(LIMITS.values())}
_FIELDS: dict[str, Any] = {key: (_BY_KINDS[kinds] | None, None) for key, kinds in LIMITS.items()}
Limits: Any = create_model("Limits", __base__=Settings, __doc__="Limits of the checks.", **_FIELDS)
