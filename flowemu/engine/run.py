"""Runs a flow: step by step on the wafer, then the checks, into a record for the output."""

from __future__ import annotations

import hashlib
import time
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from typing import Any

from flowemu import __version__
from flowemu.engine.memory import refuse_if_too_large
from flowemu.engine.parts import part_rows
from flowemu.engine.planes import make_grid
from flowemu.engine.rates import deciding_rates
from flowemu.engine.tools import Tools
from flowemu.engine.view import View, judge_flow
from flowemu.errors import InputError, RunError, StepError
from flowemu.flow.drawn import read_drawn, window_box
from flowemu.flow.flow import Flow, Step
from flowemu.flow.process import ProcessDataError, load_process_data
from flowemu.layout import Layout, MissingCell, read_layout
from flowemu.record import FilmRow, FreeRow, RunRecord, Shot, StepRow
from flowemu.stack.bodies import Place
from flowemu.stack.grid import Grid
from flowemu.stack.measure import film_volume
from flowemu.stack.stack import FilmStack
from flowemu.stack.wafer import Cut, Wafer

Report = Callable[[int, int, str], None]


def _silent(done: int, total: int, text: str) -> None:
    """No report."""


def _content(grid: Grid) -> None:
    """No objection to the grid."""


@dataclass(frozen=True, eq=False)
class Run:
    """A finished run: the flow, the wafer as it is at the end, and the record for the output."""

    flow: Flow
    wafer: Wafer
    record: RunRecord


def volume_change(before: FilmStack, after: FilmStack) -> tuple[float, float]:
    """Volume removed and volume added between two stacks, um3."""
    old = {(f.name, f.step): film_volume(f, before.grid) for f in before.films}
    new = {(f.name, f.step): film_volume(f, after.grid) for f in after.films}
    removed = sum(max(volume - new.get(key, 0.0), 0.0) for key, volume in old.items())
    added = sum(max(volume - old.get(key, 0.0), 0.0) for key, volume in new.items())
    return removed, added


def run_flow(
    flow: Flow,
    until: int | None = None,
    cell: float | None = None,
    keep: tuple[int, ...] = (),
    progress: Report = _silent,
    checks: bool = True,
    ready: Callable[[Grid], None] = _content,
) -> Run:
    """Run a flow up to a step.

    Parameters
    ----------
    until : number of the last step, 0 for the bare wafer; all if left out
    cell : um, in place of the flow's own
    keep : steps after which the structure is kept for figures, beside the last one
    checks : whether to look for faults at the end and at every `inspect`
    ready : called with the grid before the first step; may raise what stops the run

    Raises
    ------
    InputError
        Something in the flow or the layout is wrong, placed in the flow file.
    """
    began = time.perf_counter()
    layout = read_drawn(flow, read_layout, MissingCell)
    tools = _tools(flow, layout)
    box = window_box(flow, layout)
    assert box is not None
    grid, said = make_grid(flow, box, cell if cell is not None else flow.grid.cell, tools)
    refuse_if_too_large(flow, grid, lambda other: make_grid(flow, box, other, tools)[0])
    ready(grid)
    tools = Tools(flow, tools.data, layout, tools.places, grid)
    last = len(flow.steps) if until is None else until
    wafer = Wafer(FilmStack.bare(grid, *_wafer_material(flow, tools)))
    rows, shots, findings = [], [], []
    if 0 in keep and last > 0:
        shots.append(Shot(0, "the bare wafer", wafer.stack))
    for step in flow.steps[:last]:
        progress(step.index - 1, last, step.title)
        before = wafer
        wafer = _apply(flow, step, wafer, tools)
        rows.append(_step_row(step, before, wafer))
        if step.index < last and (step.index in keep or step.verb == "inspect"):
            shots.append(Shot(step.index, step.title, wafer.stack))
        if step.verb == "inspect" and checks and step.index < last:
            findings += judge_flow(View(flow, layout, tools, wafer, step.index))
    progress(last, last, "checks")
    title = flow.steps[last - 1].title if last else "the bare wafer"
    shots.append(Shot(last, title, wafer.stack))
    view = View(flow, layout, tools, wafer, last, ended=last == len(flow.steps))
    parts = part_rows(view)
    view = View(flow, layout, tools, wafer, last, ended=view.ended, parts=parts)
    if checks:
        findings += [f for f in judge_flow(view) if f not in findings]
    overridden, from_memory = deciding_rates(flow, tools, wafer)
    record = RunRecord(
        flow=flow.title,
        version=__version__,
        revision=hashlib.sha256(flow.path.read_bytes()).hexdigest(),
        masks_sha256=_masks_hash(flow, layout),
        grid=grid,
        steps=tuple(rows),
        films=tuple(FilmRow(f.name, f.material, f.step, film_volume(f, grid)) for f in wafer.stack.films),
        parts=parts,
        findings=tuple(findings),
        shots=tuple(shots),
        masks=_mask_loops(flow, layout),
        frees=_frees(flow, wafer),
        expectations=view.expectations() if view.ended else (0, 0),
        run_seconds=time.perf_counter() - began,
        notes=tuple(said),
        overridden=overridden,
        from_memory=from_memory,
    )
    return Run(flow, wafer, record)


def _tools(flow: Flow, layout: Layout) -> Tools:
    try:
        data = load_process_data(flow.data or None)
    except ProcessDataError as error:
        raise InputError([flow.fault(keys, text) for keys, text in error.problems]) from None
    return Tools(flow, data, layout, _places(flow, layout))


def _places(flow: Flow, layout: Layout) -> Mapping[str, Place]:
    """Where every named part is: those of `parts:`, then the layout's labels."""
    places: dict[str, Place] = {name: (part.film, part.at) for name, part in flow.parts.items()}
    if flow.layout.labels is not None:
        for text, x, y in layout.labels(*flow.layout.labels):
            places.setdefault(text, (None, (x, y)))
    return places


def _wafer_material(flow: Flow, tools: Tools) -> tuple[str, str | None]:
    try:
        material = tools.material(flow.wafer.material)
    except StepError as error:
        raise InputError([flow.fault(("wafer", "material"), f"wafer.material: {error}")]) from None
    return material.name, material.state(None)


def _apply(flow: Flow, step: Step, wafer: Wafer, tools: Tools) -> Wafer:
    try:
        result: Wafer = step.kind.apply(wafer, step.settings, tools.at(step.index, step.verb))
        return result
    except StepError as error:
        setting = _setting_of(str(error), step.settings)
        raise InputError([flow.step_fault(step, setting, str(error))]) from None
    except MemoryError:
        raise RunError(f"{step.title}: out of memory; use a larger cell or a smaller window") from None


def _setting_of(text: str, settings: Any) -> str | None:
    """The setting that a step's complaint begins with."""
    word = text.split(":", 1)[0].strip()
    given = {field.alias or name for name, field in type(settings).model_fields.items()}
    if word in given:
        return word
    for name in ("film", "with", "material"):
        if name in given and name in text.split("'", 1)[0]:
            return name
    return None


def _step_row(step: Step, before: Wafer, after: Wafer) -> StepRow:
    removed, added = volume_change(before.stack, after.stack)
    cuts = [event for event in after.events if isinstance(event, Cut) and event.step == step.index]
    seconds = cuts[0].time if cuts and cuts[0].time > 0 else None
    return StepRow(step.index, step.verb, step.name, seconds, removed, added)


def _mask_loops(flow: Flow, layout: Layout) -> dict[str, list[Any]]:
    used = [step.settings.mask for step in flow.steps if step.verb == "pattern"]
    return {name: layout.polygons(*pair) for name, pair in flow.masks.items() if name in used}


def _masks_hash(flow: Flow, layout: Layout) -> str:
    """Hash of the shapes of the masks that the flow uses."""
    digest = hashlib.sha256()
    for name, loops in sorted(_mask_loops(flow, layout).items()):
        digest.update(name.encode())
        for loop in loops:
            digest.update(loop.round(6).tobytes())
    return digest.hexdigest()


def _frees(flow: Flow, wafer: Wafer) -> tuple[FreeRow, ...]:
    """When each part that is meant to be free comes free in a release."""
    expected = {entry.subject.part for entry in flow.expect if entry.kind in ("free", "captive")}
    rows = []
    for event in wafer.events:
        if isinstance(event, Cut) and event.verb == "release":
            wanted = expected | set(flow.steps[event.step - 1].settings.frees or ())
            for freed in event.freed:
                if freed.part in wanted:
                    free = freed.time if freed.time < float("inf") else None
                    rows.append(FreeRow(freed.part, event.step, free, event.time))
    return tuple(rows)
