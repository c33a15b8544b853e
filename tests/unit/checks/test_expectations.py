"""Expectations that fail are errors, those that hold are silent, and before the end nothing is said."""

from __future__ import annotations

import pytest

from flowemu.record import PartRow
from flowemu.stack.wafer import Freed
from tests.unit.checks.situations import cut, flow, saying

expectations = saying("expectations")


def plate(state: str) -> tuple[PartRow, ...]:
    return (PartRow("plate", ("poly",), 1.0, None, state),)


def expecting(line: str) -> object:
    return flow(expect=f"expect:\n  - {line}\n")


@pytest.mark.parametrize("wanted", ["held", "captive"])
def test_a_part_in_another_state_is_an_error(wanted: str) -> None:
    of = expecting(f"{wanted}: {{part: plate}}")
    assert expectations(of=of, parts=plate(wanted)) == []
    (finding,) = expectations(of=of, parts=plate("adrift"))
    assert (finding.code, finding.severity, finding.part, finding.step) == ("expectation-failed", "error", "plate", 11)
    assert finding.text == f"part plate is expected to be {wanted}, but it is adrift"


def test_a_part_that_is_not_there_is_gone() -> None:
    (finding,) = expectations(of=expecting("held: {part: plate}"), parts=())
    assert finding.text.endswith("but it is gone")


@pytest.mark.parametrize(("time", "count"), [(59.0, 0), (60.0, 0), (61.0, 1)])
def test_free_is_free_by_the_end_of_the_release(time: float, count: int) -> None:
    release = cut(step=11, verb="release", freed=(Freed("plate", time, "glass", None),))
    found = expectations(release, of=expecting("free: {part: plate}"), parts=plate("held"))
    assert len(found) == count
    assert all(f.text.endswith("but glass still touches it") for f in found)


def test_a_part_that_no_release_met_is_not_free() -> None:
    (finding,) = expectations(of=expecting("free: {part: plate}"), parts=plate("held"))
    assert finding.text.endswith("but no release has freed it")


def test_a_part_that_came_free_and_was_washed_away_is_not_free() -> None:
    release = cut(step=11, verb="release", freed=(Freed("plate", 10.0, "glass", None),))
    (finding,) = expectations(release, of=expecting("free: {part: plate}"), parts=plate("gone"))
    assert finding.text.endswith("but it is gone")


@pytest.mark.parametrize(
    ("bounds", "says"),
    [
        ("at_least: 1 um", "at least 1 um"),
        ("at_least: 0.5 um, at_most: 2 um", "at least 0.5 um and at most 2 um"),
        ("at_most: 0 um", None),
    ],
)
def test_a_thickness_is_held_against_its_bounds(bounds: str, says: str | None) -> None:
    """The wafer is bare, so the film measures nothing."""
    found = expectations(of=expecting(f"thickness: {{film: poly, at: [2 um, 3 um], {bounds}}}"))
    assert [f.text for f in found] == (
        [f"film poly is expected to measure {says} at (2, 3) um, but it is 0 um"] if says else []
    )
    assert all(f.at_um == (2.0, 3.0) and f.film == "poly" for f in found)


def test_nothing_is_said_before_the_flows_end() -> None:
    assert expectations(of=expecting("held: {part: plate}"), parts=(), ended=False) == []
