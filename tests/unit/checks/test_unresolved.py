"""Places that the grid cannot tell are told with the cell that would do."""

from __future__ import annotations

from flowemu.stack.wafer import Unresolved
from tests.unit.checks.situations import cut, saying

unresolved = saying("unresolved")


def test_silent_where_there_are_none() -> None:
    assert unresolved() == []
    assert unresolved(cut()) == []


def test_a_place_is_a_warning_with_half_its_size_as_the_cell() -> None:
    (finding,) = unresolved(Unresolved(7, "poly", "mask PLATE has a line of 0.8 um", (1.0, 2.0, 0.0), 0.8))
    assert (finding.code, finding.severity, finding.step, finding.film) == ("unresolved", "warning", 7, "poly")
    assert finding.at_um == (1.0, 2.0, 0.0)
    assert finding.text == "mask PLATE has a line of 0.8 um"
    assert finding.cause.startswith("A cell of 0.4 um would tell")
    assert finding.size_um == 0.8
