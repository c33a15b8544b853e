"""What the order of the steps alone tells: masks, films and parts that are named but not there."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator
from dataclasses import dataclass, field
from itertools import pairwise
from typing import Any

from flowemu.errors import Fault, hint
from flowemu.flow.flow import Flow, Step
from flowemu.registry import finding_codes

WAFER = "wafer"
RESIST = "resist"
BARE = "bare"
RESERVED = {
    WAFER: "the wafer's own film",
    RESIST: "the coats that a pattern step puts down",
    "others": "every film without a rate",
}
_SLACK = 1e-9


@dataclass
class Present:
    """What stands on the wafer before a step, as far as names go.

    `films` is what is there, `ever` every film with the step that put it down, `printed` the masks on the wafer,
    `named` the steps by their own names.
    """

    films: list[str] = field(default_factory=lambda: [WAFER])
    ever: dict[str, int] = field(default_factory=lambda: {WAFER: 0})
    printed: list[str] = field(default_factory=list)
    named: dict[str, int] = field(default_factory=dict)


def order_faults(flow: Flow, complete: bool = True) -> list[Fault]:
    """Every fault in the order of the steps.

    `complete` is False where some step could not be read: then only what no other step can change is judged, so that
    one slip is not reported twice.
    """
    faults = [*_window(flow), *_masks(flow)]
    if complete:
        present = Present()
        for step in flow.steps:
            faults += _named(flow, step, present)
            faults += _RULES.get(step.verb, _nothing)(flow, step, present)
        faults += [*_parts(flow, present), *_expectations(flow, present)]
    return faults


def _window(flow: Flow) -> Iterator[Fault]:
    window = flow.layout.window
    planes = flow.grid.planes
    if planes is not None and (len(planes) < 2 or any(b <= a for a, b in pairwise(planes))):
        yield flow.fault(("grid", "planes"), "grid.planes: expected two or more heights, each above the one before")
    if window is None:
        return
    left, bottom, right, top = window.box
    where = ("layout", "window")
    if right <= left or top <= bottom:
        yield flow.fault(where, "layout.window: it is empty; expected left, bottom, right, top")
        return
    least, cell = min(right - left, top - bottom), flow.grid.cell
    if least < cell * (1.0 - _SLACK):
        yield flow.fault(where, f"layout.window: it is {least:g} um wide, less than the cell of {cell:g} um")


def _masks(flow: Flow) -> Iterator[Fault]:
    for step in flow.steps:
        if step.verb != "pattern":
            continue
        for setting, allowed in (("mask", ()), ("align", (BARE,))):
            name = getattr(step.settings, setting)
            if name is not None and name not in flow.masks and name not in allowed:
                known = [*flow.masks, *allowed]
                text = f"{setting}: mask '{name}' is not declared under layout.masks{hint(name, known, 'declared are')}"
                yield flow.step_fault(step, setting, text)


def _named(flow: Flow, step: Step, present: Present) -> Iterator[Fault]:
    if step.name is None:
        return
    if step.name in present.named:
        text = f"name: '{step.name}' is already the name of step {present.named[step.name]}"
        yield flow.step_fault(step, "name", text)
    present.named.setdefault(step.name, step.index)


def _nothing(flow: Flow, step: Step, present: Present) -> Iterator[Fault]:
    return iter(())


def _deposit(flow: Flow, step: Step, present: Present) -> Iterator[Fault]:
    film = step.settings.film
    if film in RESERVED:
        yield flow.step_fault(step, "film", f"film: the name '{film}' is taken, for {RESERVED[film]}")
    elif film in present.ever:
        yield flow.step_fault(step, "film", f"film: step {present.ever[film]} already put down a film named '{film}'")
    present.ever.setdefault(film, step.index)
    if film not in present.films:
        present.films.append(film)


def _pattern(flow: Flow, step: Step, present: Present) -> Iterator[Fault]:
    align = step.settings.align
    if align in flow.masks and align not in present.printed:
        tail = hint(align, [*present.printed, BARE], "possible are")
        text = f"align: mask '{align}' is not on the wafer yet{tail}"
        yield flow.step_fault(step, "align", text)
    present.printed.append(step.settings.mask)
    present.ever.setdefault(RESIST, step.index)
    if RESIST not in present.films:
        present.films.append(RESIST)


def _etch(flow: Flow, step: Step, present: Present) -> Iterator[Fault]:
    settings = step.settings
    for name in settings.clears or ():
        yield from _there(flow, step, "clears", name, present)
    if settings.until is not None:
        yield from _there(flow, step, "until", settings.until, present)
    for name in getattr(settings, "frees", None) or ():
        yield from _part(flow, lambda text: flow.step_fault(step, "frees", f"frees: {text}"), name)


def _strip(flow: Flow, step: Step, present: Present) -> Iterator[Fault]:
    film = step.settings.film
    yield from _there(flow, step, "film", film, present)
    if film == WAFER:
        yield flow.step_fault(step, "film", "film: the wafer itself cannot be stripped")
    elif film in present.films:
        present.films.remove(film)


def _polish(flow: Flow, step: Step, present: Present) -> Iterator[Fault]:
    if step.settings.to is not None:
        yield from _there(flow, step, "to", step.settings.to, present)


def _there(flow: Flow, step: Step, setting: str, film: str, present: Present) -> Iterator[Fault]:
    """A fault where the film is not on the wafer at this step."""
    if film not in present.films:
        was = " any more" if film in present.ever else ""
        text = f"{setting}: there is no film '{film}' at this step{was}{hint(film, present.films, 'there are')}"
        yield flow.step_fault(step, setting, text)


def _part(flow: Flow, complain: Callable[[str], Fault], name: str) -> Iterator[Fault]:
    """A fault where the part is not named; labels of the layout may name it too, which is for lint to see."""
    if name not in flow.parts and flow.layout.labels is None:
        yield complain(f"there is no part '{name}' under parts{hint(name, flow.parts, 'named are')}")


def _film_ever(flow: Flow, path: tuple[Any, ...], label: str, film: str | None, present: Present) -> Iterator[Fault]:
    if film is not None and film not in present.ever:
        text = f"{label}: no step puts down a film '{film}'{hint(film, present.ever, 'there are')}"
        yield flow.fault(path, text)


def _parts(flow: Flow, present: Present) -> Iterator[Fault]:
    for name, part in flow.parts.items():
        yield from _film_ever(flow, ("parts", name, "film"), f"parts.{name}.film", part.film, present)


def _expectations(flow: Flow, present: Present) -> Iterable[Fault]:
    for index, expectation in enumerate(flow.expect):
        kind, subject = expectation.kind, expectation.subject
        path: tuple[Any, ...] = ("expect", index, kind)
        label = f"expect[{index + 1}].{kind}"
        if kind == "thickness":
            yield from _film_ever(flow, (*path, "film"), f"{label}.film", subject.film, present)
        else:
            where = (*path, "part")
            yield from _part(flow, lambda text, w=where, n=label: flow.fault(w, f"{n}.part: {text}"), subject.part)  # type: ignore[misc]
    codes = finding_codes()
    for index, waiver in enumerate(flow.accept):
        if waiver.code not in codes:
            text = f"accept[{index + 1}].code: no check reports '{waiver.code}'{hint(waiver.code, codes)}"
            yield flow.fault(("accept", index, "code"), text)
        label = f"accept[{index + 1}]"
        yield from _film_ever(flow, ("accept", index, "film"), f"{label}.film", waiver.film, present)


_RULES: dict[str, Callable[[Flow, Step, Present], Iterator[Fault]]] = {
    "deposit": _deposit,
    "pattern": _pattern,
    "etch": _etch,
    "release": _etch,
    "strip": _strip,
    "polish": _polish,
}
