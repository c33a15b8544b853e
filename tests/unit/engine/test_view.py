"""Findings gathered from all checks: told once, the worst first, explained ones as notes, waived ones marked."""

from __future__ import annotations

from flowemu.engine.view import judge_flow
from flowemu.record import PartRow
from tests.unit.checks.situations import cut, flow, laid, loosened, loss, printed, view

OPENING = cut(loss("glass", through=True, meant=True), step=3, mask="ANCHOR")
RELEASED = cut(loss("glass", meant=True), step=11, verb="release")
ADRIFT = (PartRow("plate", ("poly",), 1.0, None, "adrift"),)


def test_one_mistake_is_one_error_and_what_follows_from_it_a_note() -> None:
    of = flow(expect="expect:\n  - held: {part: plate}\n")
    seen = view(printed(13.0), OPENING, laid("glass"), RELEASED, loosened(), of=of, parts=ADRIFT)
    error, note = judge_flow(seen)
    assert (error.code, error.severity) == ("missing-anchor", "error")
    assert (note.code, note.severity) == ("expectation-failed", "note")
    assert note.cause.endswith("This follows from missing-anchor.")


def test_an_expectation_that_nothing_explains_stays_an_error() -> None:
    of = flow(expect="expect:\n  - held: {part: plate}\n")
    (finding,) = judge_flow(view(of=of, parts=ADRIFT))
    assert (finding.code, finding.severity) == ("expectation-failed", "error")


def test_the_worst_come_first_and_each_once() -> None:
    of = flow(expect="expect:\n  - held: {part: plate}\n")
    events = cut(loss(depth=0.03)), cut(loss("poly", depth=0.2)), cut(loss(depth=0.04))
    found = judge_flow(view(*events, of=of))
    assert [(f.severity, f.film) for f in found] == [("error", None), ("warning", "poly"), ("note", "nitride")]


def test_a_waived_finding_is_marked_and_comes_last() -> None:
    waiver = "accept:\n  - {code: film-attacked, film: poly, reason: thick, by: us, date: 2026-01-31}\n"
    of = flow(limits=waiver, expect="")
    found = judge_flow(view(cut(loss("poly", depth=0.2)), cut(loss(depth=0.03)), of=of))
    assert [(f.film, f.waived) for f in found] == [("nitride", False), ("poly", True)]


def test_a_steps_title_names_its_agent() -> None:
    assert view().step_title(3) == "step 3 (etch, oxide rie)"
    assert view().step_title(4) == "step 4 (strip)"
