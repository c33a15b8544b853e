"""The records of the process data as they stand in the files: materials, etchants, methods, anneals and rates."""

from __future__ import annotations

from typing import Literal

from pydantic import Field, model_validator

from flowemu.errors import hint
from flowemu.flow.process_values import (
    Cited,
    CitedAngle,
    CitedFraction,
    CitedRate,
    CitedTemperature,
    Named,
    Names,
    Record,
    Standing,
    UnknownNameError,
    check_span,
    name_key,
    stated,
)
from flowemu.flow.quantities import Concentration, Temperature, complaint

UPRIGHT_DEG = 90.0
Sides = Literal["front", "back", "both"]
CODES = {
    "S": "slow, not measured",
    "W": "etches, not measured",
    "F": "fast, not measured",
    "P": "part of the film peels",
    "A": "attacked and roughened",
    "R": "roughened",
}
Code = Literal["S", "W", "F", "P", "A", "R"]


class Source(Record):
    """A work, and how its numbers were seen."""

    citation: str
    reached: str = ""


class Hazard(Record):
    """A caution about one chemical, with its hazard statements."""

    statements: str
    text: str
    source: str
    standing: Standing
    note: str = ""


class Material(Named):
    """What a film is made of. `needs_coverage_when` names the methods, else conformal, that thin it on walls."""

    kind: Literal["semiconductor", "oxide", "glass", "nitride", "metal", "resist", "polymer"]
    conductor: bool
    states: Names = ()
    default_state: str | None = None
    needs_coverage_when: Names = ()
    typical_coverage: CitedFraction | None = None
    density: Cited | None = None
    temperature_limit: CitedTemperature | None = None

    @model_validator(mode="after")
    def _has_its_default(self) -> Material:
        if (self.default_state is None) is not (not self.states) or self.default_state not in (None, *self.states):
            raise complaint(f"default_state must be one of its states{hint(self.default_state or '', self.states)}")
        return self

    def state(self, name: str | None = None) -> str | None:
        """The state of that name as the data spell it; the default where none is given.

        Raises
        ------
        UnknownNameError
            Where the material has no such state.
        """
        if name is None:
            return self.default_state
        for state in self.states:
            if name_key(state) == name_key(name):
                return state
        raise UnknownNameError(f"state of {self.name}", name, self.states)


class Etchant(Named):
    """How an etchant works; `sides` is what it wets, `uniformity` the half range of its rate within the wafer."""

    kind: Literal["wet", "vapour", "plasma"]
    profile: Literal["isotropic", "directional", "deep", "crystal"] = "isotropic"
    sides: Sides
    uniformity: CitedFraction
    wall: CitedAngle | None = None
    lateral: CitedFraction | None = None
    conditions: str = ""
    temperature: Temperature | None = None
    concentration: Concentration | None = None
    hazards: Names = ()
    cautions: Names = ()

    @property
    def wall_angle(self) -> float:
        """Angle of an etched wall, deg; upright where the data state none."""
        return self.wall.low if self.wall else UPRIGHT_DEG

    @property
    def lateral_share(self) -> float:
        """Sideways etch per side as a share of the depth; zero where the data state none."""
        return self.lateral.low if self.lateral else 0.0


class Deposit(Record):
    """How a method puts one material down: temperature in degC and growth rate, each one value or a range."""

    material: str
    temperature: str | None = None
    rate: str | None = None
    source: str
    standing: Standing
    note: str = ""

    _flow = model_validator(mode="before")(stated)

    @model_validator(mode="after")
    def _reads(self) -> Deposit:
        for text, kind in ((self.temperature, "temperature"), (self.rate, "rate")):
            if text is not None:
                check_span(text, kind)
        return self


class Method(Named):
    """A way to put a film down; `growth` says how it follows walls, `sides` what it coats."""

    growth: Literal["conformal", "flux", "level"]
    sides: Sides
    temperature: CitedTemperature | None = None
    typical_coverage: CitedFraction | None = None
    rate: CitedRate | None = None
    deposits: tuple[Deposit, ...] = ()

    @property
    def conformal(self) -> bool:
        return self.growth == "conformal"


class Anneal(Record):
    """A change of state: at or above a temperature, `before` becomes `after`."""

    material: str
    before: str = Field(alias="from")
    after: str = Field(alias="to")
    at_least: CitedTemperature


class RateRow(Record):
    """A published rate, a published code, or both, of one or several materials in an etchant."""

    material: Names
    state: str | None = None
    rate: str | None = None
    range: str | None = None
    bound: Literal["at least", "at most"] | None = None
    code: Code | None = None
    conditions: str = ""
    source: str
    standing: Standing
    note: str = ""
    overridden: bool = False

    _flow = model_validator(mode="before")(stated)

    @model_validator(mode="after")
    def _reads(self) -> RateRow:
        if self.rate is None and self.code is None:
            raise complaint("expected a rate, a code or both")
        for text in (self.rate, self.range):
            if text is not None:
                check_span(text, "rate")
        return self
