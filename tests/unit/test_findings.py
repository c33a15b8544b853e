"""Findings: ordered with the worst first, and counted against a severity."""

from __future__ import annotations

import pytest

from flowemu.findings import Finding, at_or_above, worst_first
from flowemu.flow.sections import Waiver
from flowemu.flow.waivers import waived


def finding(severity: str, code: str = "film-attacked", **more: object) -> Finding:
    given: dict = {"step": 3, "film": "poly", "part": None, "at_um": None, "text": "t", "cause": "c"} | more
    return Finding(code, severity, **given)


def test_the_worst_comes_first() -> None:
    small, large = finding("error", size_um=0.1), finding("error", size_um=2.0)
    note, warning, accepted = finding("note"), finding("warning"), finding("error", waived=True)
    assert worst_first([accepted, note, small, warning, large]) == [large, small, warning, note, accepted]


def test_only_unwaived_findings_count() -> None:
    found = [finding("error", waived=True), finding("warning"), finding("note")]
    assert at_or_above(found, "error") == []
    assert at_or_above(found, "warning") == [found[1]]
    assert at_or_above(found, "note") == found[1:]


def test_an_unknown_severity_is_refused() -> None:
    with pytest.raises(ValueError, match="severity 'fatal'"):
        finding("fatal")


def test_a_waiver_covers_its_code_on_its_part_or_film_alone() -> None:
    signed = {"reason": "r", "by": "me", "date": "2026-03-31"}
    on_film = Waiver.build(code="film-attacked", film="poly", **signed)
    on_part = Waiver.build(code="film-attacked", part="rotor", **signed)
    found = [finding("error"), finding("error", film="nitride"), finding("error", "missing-anchor")]
    assert [f.waived for f in waived(found, [on_film])] == [True, False, False]
    assert [f.waived for f in waived(found, [on_part])] == [False, False, False]
    assert waived([finding("error", part="rotor")], [on_part])[0].waived
