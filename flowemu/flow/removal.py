"""The settings that an etch and a release share."""

from __future__ import annotations

from typing import Any, ClassVar, Literal

from pydantic import Field

from flowemu.flow.process_values import name_key
from flowemu.flow.quantities import (
    Concentration,
    Duration,
    Fraction,
    PositiveLength,
    Rate,
    Share,
    Temperature,
    WallAngle,
)
from flowemu.flow.settings import Side, StepSettings
from flowemu.flow.words import Name, Names, Text

OTHERS = "others"


class RemovalSettings(StepSettings):
    """What is removed, with what, and for how long."""

    exactly_one: ClassVar[tuple[tuple[str, ...], ...]] = (("time", "depth", "clears", "until"),)
    only_with: ClassVar[dict[str, tuple[str, ...]]] = {"over": ("clears", "until")}

    etchant: Text = Field(alias="with", description="The etchant, by its name in the process data.")
    time: Duration | None = Field(None, description="How long the etch runs.")
    depth: PositiveLength | None = Field(None, description="How deep the open, flat area is etched.")
    clears: Names | None = Field(None, description="Runs until these films' open flats are gone.")
    until: Name | None = Field(None, description="Runs to the endpoint: the film shows over 90 % of the open area.")
    over: Share = Field(0.0, description="Overetch, as a share of the time to clear or to the endpoint.")
    profile: Literal["isotropic", "directional", "deep", "crystal"] | None = Field(
        None, description="How the etchant acts; its own data unless given."
    )
    rates: dict[Text, Rate] = Field(
        default_factory=dict,
        description="Rates by film or material, over the data; `others` is for every film without a rate.",
    )
    wall: WallAngle | None = Field(None, description="Angle of the etched wall; 90 deg is upright.")
    lateral: Share | None = Field(None, description="Sideways etch per side, as a share of the depth.")
    uniformity: Fraction | None = Field(None, description="Half the range of the rate over the wafer.")
    side: Side | None = Field(None, description="The side that is etched; what the real tool does unless given.")
    concentration: Concentration | None = Field(None, description="Of the etchant in its bath.")
    temperature: Temperature | None = Field(None, description="Of the bath or chuck.")

    def stated_rate(self, film: str, material: str) -> float | None:
        """The rate that the step itself gives for a film by its name or its material, um/s; it goes before the data."""
        own = {name_key(name): rate for name, rate in self.rates.items()}
        return next((own[key] for name in (film, material) if (key := name_key(name)) in own), None)

    @property
    def rate_of_others(self) -> float | None:
        """The rate for every film that has one neither here nor in the data, um/s; None where it is not given."""
        return self.rates.get(OTHERS)

    def stated_amount(self) -> tuple[str, Any]:
        """Which setting gives the amount, and its value."""
        for name in self.exactly_one[0]:
            value = getattr(self, name)
            if value is not None:
                return name, value
        raise ValueError("the settings were built without an amount")
