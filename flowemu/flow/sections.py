"""The sections of the flow file other than its steps, as checked records."""

from __future__ import annotations

from typing import Annotated, Any, ClassVar, Literal

from pydantic import ConfigDict, Field, WithJsonSchema

from flowemu.flow.quantities import CellLength, Length, LengthFromZero, PositiveLength
from flowemu.flow.settings import OrShort, Settings
from flowemu.flow.words import Box, Date, Layer, Name, Orientation, Point, Text

WindowSide = Literal["left", "bottom", "right", "top"]


class Window(Settings):
    """The part of the cell that is run."""

    box: Box = Field(description="Left, bottom, right and top of the window.")
    symmetry: tuple[WindowSide, ...] = Field((), description="Sides that are real mirrors of the device.")


class LayoutSection(Settings):
    """Where the masks come from."""

    file: Text = Field(description="GDSII or OASIS file, relative to the flow file.")
    cell: Text | None = Field(None, description="The cell; the only top cell if left out.")
    window: Annotated[Window, OrShort("box")] | None = Field(
        None, description="A box [left, bottom, right, top], or {box, symmetry}; the cell's own box if left out."
    )
    masks: dict[Name, Layer] = Field(default_factory=dict, description="Each mask's layer/datatype.")
    labels: Layer | None = Field(None, description="Layer/texttype whose texts name parts and nets.")


class PartSection(Settings):
    """A part: the connected piece of a film at a place."""

    film: Name = Field(description="The film that the part is made of.")
    at: Point = Field(description="A place in the part, [x, y].")


class WaferSection(Settings):
    """The wafer that the flow begins with."""

    material: Text = Field("silicon", description="Material of the wafer.")
    orientation: Orientation = Field("100", description="Crystal orientation of its face.")
    diameter: PositiveLength = Field(100e3, description="Its diameter.")
    thickness: PositiveLength = Field(525.0, description="Its thickness.")
    depth: PositiveLength | None = Field(
        None, description="How much of it is modelled; the deepest reach of any step plus 5 um if left out."
    )


class GridSection(Settings):
    """The cells that the geometry is sampled on."""

    cell: CellLength = Field(description="Edge of a cell in x and y.")
    planes: tuple[Length, ...] | None = Field(None, description="Boundaries of the cells in z, rising.")


class PartExpectation(Settings):
    """A part of which a state is expected."""

    part: Name = Field(description="The part's name.")


class ThicknessExpectation(Settings):
    """A thickness that is expected at a place, between one or two bounds."""

    model_config = ConfigDict(
        json_schema_extra={"anyOf": [{"required": ["at_least"]}, {"required": ["at_most"]}]},
    )

    film: Name = Field(description="The film.")
    at: Point = Field(description="The place, [x, y].")
    at_least: LengthFromZero | None = Field(None, description="Least thickness there.")
    at_most: LengthFromZero | None = Field(None, description="Greatest thickness there.")

    @classmethod
    def broken_rules(cls, given: Any) -> list[str]:
        return [] if {"at_least", "at_most"} & set(given) else ["expected at_least, at_most or both"]


class Expectation(Settings):
    """One thing that must be so at the end; exactly one of its settings is given."""

    exactly_one: ClassVar[tuple[tuple[str, ...], ...]] = (("held", "free", "captive", "thickness"),)

    held: PartExpectation | None = Field(None, description="The part is joined to the wafer.")
    free: PartExpectation | None = Field(None, description="No film that the release etches touches the part.")
    captive: PartExpectation | None = Field(None, description="The part is loose but cannot leave.")
    thickness: ThicknessExpectation | None = Field(None, description="A film's thickness at a place.")

    @property
    def kind(self) -> str:
        return next(name for name in self.exactly_one[0] if getattr(self, name) is not None)

    @property
    def subject(self) -> Any:
        return getattr(self, self.kind)


class Waiver(Settings):
    """A finding that is known and accepted."""

    exactly_one: ClassVar[tuple[tuple[str, ...], ...]] = (("part", "film"),)

    code: Text = Field(description="Code of the finding.")
    part: Name | None = Field(None, description="The part that it is about.")
    film: Name | None = Field(None, description="The film that it is about.")
    reason: Text = Field(description="Why it is accepted.")
    by: Text = Field(description="Who accepted it.")
    date: Date = Field(description="When, as 2026-03-31.")


_FREE_FORM = WithJsonSchema({"type": "object"})


class FlowFile(Settings):
    """The whole file; its steps are read one by one, each by its own kind."""

    flow: Text = Field(description="Title of the flow.")
    about: Text = Field("", description="What the device is.")
    layout: LayoutSection = Field(description="Where the masks come from.")
    parts: dict[Name, PartSection] = Field(default_factory=dict, description="Names of parts.")
    wafer: WaferSection = Field(default_factory=WaferSection, description="The wafer.")
    grid: GridSection = Field(description="The cells.")
    steps: Annotated[list[Any], Field(min_length=1)] = Field(description="The steps, in order.")
    expect: tuple[Expectation, ...] = Field((), description="What must be so at the end.")
    accept: tuple[Waiver, ...] = Field((), description="Findings that are accepted.")
    limits: Annotated[dict[str, Any], _FREE_FORM] = Field(
        default_factory=dict, description="Limits of the checks, over the usual ones."
    )
    data: Annotated[dict[str, Any], _FREE_FORM] = Field(default_factory=dict, description="Own process data.")
    tolerances: Annotated[dict[str, Any], _FREE_FORM] = Field(
        default_factory=dict, description="For variations of the flow; read, but not used by this version."
    )
