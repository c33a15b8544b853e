"""A flow that has been read and checked: what the rest of the program works on."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from flowemu.errors import Fault, InputError, hint
from flowemu.flow.document import Document
from flowemu.flow.sections import (
    Expectation,
    FlowFile,
    GridSection,
    LayoutSection,
    PartSection,
    WaferSection,
    Waiver,
)
from flowemu.registry import StepKind, step_kinds


@dataclass(frozen=True, eq=False)
class Step:
    """One step of the flow.

    Attributes
    ----------
    index : int
        Its number, from 1.
    settings : pydantic model
        Of its kind; every number in the program's own unit.
    where : tuple
        The path of its settings in the document, such as `("steps", 3, "etch")`.
    """

    index: int
    verb: str
    settings: Any
    where: tuple[str | int, ...]

    @property
    def name(self) -> str | None:
        name: str | None = self.settings.name
        return name

    @property
    def note(self) -> str | None:
        note: str | None = self.settings.note
        return note

    @property
    def kind(self) -> StepKind:
        return step_kinds()[self.verb]

    @property
    def title(self) -> str:
        """How complaints and findings call it: `step 4 (etch)`."""
        return f"step {self.index} ({self.verb})"


@dataclass(frozen=True, eq=False)
class Flow:
    """A flow file whose every entry has been read; see `load.load_flow`.

    Attributes
    ----------
    path : Path
        The flow file.
    layout_path : Path
        The layout file, resolved and inside the project folder or an allowed one.
    file : FlowFile
        The sections.
    limits : limits.Limits or None
        The flow's own limits of the checks; read by `limit`.
    """

    path: Path
    layout_path: Path
    document: Document
    file: FlowFile
    steps: tuple[Step, ...]
    limits: Any = None

    @property
    def title(self) -> str:
        return self.file.flow

    @property
    def about(self) -> str:
        return self.file.about

    @property
    def layout(self) -> LayoutSection:
        return self.file.layout

    @property
    def masks(self) -> dict[str, tuple[int, int]]:
        """Layer and datatype by the masks' names."""
        return self.file.layout.masks

    @property
    def parts(self) -> dict[str, PartSection]:
        return self.file.parts

    @property
    def wafer(self) -> WaferSection:
        return self.file.wafer

    @property
    def grid(self) -> GridSection:
        return self.file.grid

    @property
    def expect(self) -> tuple[Expectation, ...]:
        return self.file.expect

    @property
    def accept(self) -> tuple[Waiver, ...]:
        return self.file.accept

    @property
    def data(self) -> dict[str, Any]:
        """Own process data, as text; read by `process.load_process_data`."""
        return self.file.data

    def limit(self, key: str, severity: str) -> tuple[tuple[str, float], ...] | None:
        """The flow's own limit: (kind, number) pairs that must all be passed, empty for `off`; None if not given."""
        levels = getattr(self.limits, key, None)
        limit: tuple[tuple[str, float], ...] | None = getattr(levels, severity, None)
        return limit

    def fault(self, path: Sequence[str | int], text: str, at_key: bool = False) -> Fault:
        """A complaint placed at the nearest known entry of `path`, such as `("steps", 3, "etch", "with")`."""
        return self.document.fault(path, text, at_key)

    def step_fault(self, step: Step, setting: str | None, text: str) -> Fault:
        """A complaint about a step, or about one of its settings."""
        if setting is None:
            return self.fault(step.where, f"{step.title}: {text}", at_key=True)
        return self.fault((*step.where, *setting.split(".")), f"{step.title}: {text}")

    def find_step(self, reference: str) -> int:
        """The number of the step that the user means by a number or a name; 0 is the bare wafer."""
        if reference.isdecimal() and int(reference) <= len(self.steps):
            return int(reference)
        named = {step.name: step.index for step in self.steps if step.name}
        if reference in named:
            return named[reference]
        tail = hint(reference, named, "the named ones are") if named and not reference.isdecimal() else ""
        tail = tail or f"; the flow has steps 0 to {len(self.steps)}"
        raise InputError([Fault(None, None, None, f"there is no step '{reference}'{tail}")])
