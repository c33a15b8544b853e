"""Coats with resist, exposes through a mask and develops: leaves a film named `resist`.

    - pattern: {mask: DIMPLE, open: drawn, resist: 1.6 um, align: bare}
    - pattern: {mask: ROTOR, keep: drawn, resist: {thickness: 3 um, tone: positive}, align: DIMPLE, bias: -0.2 um}

What it models. The resist is spun on level; either the drawn or the undrawn area is opened down to the film below, in
trenches too. The edge is the exact outline of the mask, moved by bias, shift and rounding, and leans at the wall
angle about its foot.

mask : one of the names under `layout: masks`.
open, keep : exactly one of the two, `drawn` or `undrawn`: the area whose resist is removed, or stays.
resist : its thickness, such as `1.6 um`, by which its level top lies above the mean of the surface below it, so that
  it is thinner over high places; or a mapping {material, tone, thickness}.
align : the mask, printed earlier, that this one is aligned to; or `bare`, to the wafer itself.
shift : a deliberate displacement `[x, y]`, such as `[0.5 um, 0 um]`.
overlay : the three-sigma misplacement that is budgeted; a usual value for the tool unless given.
bias : what each edge of the resist moves outward; below zero the resist shrinks.
rounding : radius that the mask's corners take on.
wall : angle of the resist's wall; 90 deg is upright, below that it is wider at the foot.
side : front or back; a back mask is drawn as seen from the front.
name, note : as on every step.

What it refuses. A mask that is not declared; both or neither of `open` and `keep`; alignment to a mask that is not yet
on the wafer.
"""

from __future__ import annotations

from typing import Annotated, Any, ClassVar, Literal

from pydantic import Field

from flowemu.errors import StepError
from flowemu.flow.quantities import Length, LengthFromZero, PositiveLength, WallAngle
from flowemu.flow.settings import OrShort, Settings, StepSettings
from flowemu.flow.words import Name, Point, Text
from flowemu.registry import StepKind

Area = Literal["drawn", "undrawn"]


class Resist(Settings):
    """One coat of resist."""

    thickness: PositiveLength = Field(description="Thickness above the mean surface.")
    material: Text = Field("resist", description="A material of the process data.")
    tone: Literal["positive", "negative"] = Field("positive", description="Tone of the resist.")


class PatternSettings(StepSettings):
    """Which mask, what it opens, and in what resist."""

    exactly_one: ClassVar[tuple[tuple[str, ...], ...]] = (("open", "keep"),)

    mask: Name = Field(description="A mask of the layout section.")
    open: Area | None = Field(None, description="The area whose resist is removed.")
    keep: Area | None = Field(None, description="The area whose resist stays.")
    resist: Annotated[Resist, OrShort("thickness")] = Field(
        description="Thickness of the resist, or a mapping {material, tone, thickness}."
    )
    align: Name | None = Field(None, description="The mask that this one is aligned to, or `bare`.")
    shift: Point = Field((0.0, 0.0), description="Deliberate displacement in x and y.")
    overlay: LengthFromZero | None = Field(None, description="Three-sigma budget of misplacement.")
    bias: Length = Field(0.0, description="What each edge of the resist moves outward.")
    rounding: LengthFromZero = Field(0.0, description="Radius of the mask's corners.")
    wall: WallAngle = Field(90.0, description="Angle of the resist's wall.")
    side: Literal["front", "back"] = Field("front", description="The side that is patterned.")

    @property
    def keeps_drawn(self) -> bool:
        """Whether the resist stays where the mask is drawn."""
        return self.keep == "drawn" or self.open == "undrawn"


def apply(state: Any, settings: PatternSettings, tools: Any) -> Any:
    """The step on the structure."""
    from flowemu.stack.film import Film
    from flowemu.stack.wafer import Printed
    from flowemu.steps.models.masking import print_resist

    if settings.side == "back":
        raise StepError("side: back is not built yet; the grid reaches the front alone")
    material = tools.material(settings.resist.material)
    opened = tools.opened(settings)
    resist = Film("resist", material.name, material.state(None), tools.step, state.stack.surface)
    laid = tools.laid(state.stack, "resist")
    stack = print_resist(state.stack, resist, settings.resist.thickness, opened, settings.wall)
    printed = Printed(tools.step, settings.mask, opened)
    return state.now(stack, laid, printed, *tools.narrow(settings), printed=printed)


def heights(profile: Any, settings: PatternSettings, tools: Any) -> Any:
    """The step on a one-dimensional profile."""
    return profile.covered(settings.resist.thickness)


SOURCES = ("common practice: polarity, bias, overlay and wall angle as a traveler states them; resist is spun level",)
KIND = StepKind("pattern", PatternSettings, apply, heights, sources=SOURCES)
