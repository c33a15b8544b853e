"""What a run hands to the output: plain records, with every length in um and every time in seconds."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import TYPE_CHECKING

import numpy as np

from flowemu.findings import Finding
from flowemu.stack.grid import Grid

if TYPE_CHECKING:
    from flowemu.stack.stack import FilmStack

Box = tuple[float, float, float, float, float, float]
Line = Sequence[tuple[float, float]]


@dataclass(frozen=True)
class StepRow:
    """One step that was carried out; `seconds` is how long it ran in the tool, None where that is not known."""

    index: int
    verb: str
    name: str | None
    seconds: float | None
    removed_um3: float
    added_um3: float


@dataclass(frozen=True)
class FilmRow:
    """One film of the final stack; `step` is the number of the step that put it down, 0 for the wafer."""

    name: str
    material: str
    step: int
    volume_um3: float


@dataclass(frozen=True)
class PartRow:
    """One part; `state` is held, captive, adrift, gone or cut by the window; play is how
    far it can move in -x, +x, -y, +y, -z, +z, infinity where nothing stops it."""

    name: str
    films: tuple[str, ...]
    volume_um3: float | None
    box_um: Box | None
    state: str
    contact_um2: float | None = None
    play_um: Box | None = None


@dataclass(frozen=True)
class WindowRow:
    """One etch window: when the film is gone, the step's planned end, the first harm and what that is."""

    step: int
    film: str
    clears_s: float | None
    ends_s: float | None
    limit_s: float | None = None
    limited_by: str | None = None


@dataclass(frozen=True)
class FreeRow:
    """When a part comes free in a release, None if it does not, against the planned time."""

    part: str
    step: int
    free_s: float | None
    planned_s: float


@dataclass(frozen=True, eq=False)
class Shot:
    """The structure after a step (0: the bare wafer), for figures."""

    step: int
    title: str
    stack: FilmStack


@dataclass(frozen=True, eq=False)
class RunRecord:
    """A whole run.

    Attributes
    ----------
    flow : the flow's name; `revision` and `masks_sha256` : hashes of the flow file and of the masks
    shots : the structures to draw, the last one being the run's result
    masks : polygons `(n, 2)` um of the masks, by name, as the flow uses them
    cuts : cut lines for the figures; through the window's middle if there are none
    expectations : those that hold, and all
    overridden, from_memory : deciding rates that the flow states itself, or that no source backs
    run_seconds : how long the program took
    notes : what else the user must know, such as a window that grew
    """

    flow: str
    version: str
    revision: str
    masks_sha256: str
    grid: Grid
    steps: tuple[StepRow, ...]
    films: tuple[FilmRow, ...]
    parts: tuple[PartRow, ...]
    findings: tuple[Finding, ...]
    shots: tuple[Shot, ...] = ()
    masks: Mapping[str, Sequence[np.ndarray]] = field(default_factory=dict)
    cuts: tuple[Line, ...] = ()
    windows: tuple[WindowRow, ...] = ()
    frees: tuple[FreeRow, ...] = ()
    expectations: tuple[int, int] = (0, 0)
    overridden: tuple[str, ...] = ()
    from_memory: tuple[str, ...] = ()
    run_seconds: float = 0.0
    notes: tuple[str, ...] = ()
