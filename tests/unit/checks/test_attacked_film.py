"""Films that were eaten by the way: the limits from both sides, and who is not counted."""

from __future__ import annotations

import pytest

from tests.unit.checks.situations import cut, flow, loss, saying

attacked = saying("attacked film")


@pytest.mark.parametrize(
    ("depth", "severity"),
    [(0.009, None), (0.024, None), (0.026, "note"), (0.099, "note"), (0.101, "warning"), (0.49, "warning")],
)
def test_a_note_above_5_percent_and_a_warning_above_20(depth: float, severity: str | None) -> None:
    """Of a film of 0.5 um: 25 nm and 100 nm."""
    found = attacked(cut(loss(depth=depth)))
    assert [f.severity for f in found] == ([severity] if severity else [])


def test_both_limits_must_be_passed() -> None:
    """9 nm are 9 % of a film of 0.1 um, but below 10 nm."""
    assert attacked(cut(loss(depth=0.009, thickness=0.1))) == []
    assert [f.severity for f in attacked(cut(loss(depth=0.011, thickness=0.1)))] == ["note"]


@pytest.mark.parametrize(("through", "severity"), [(True, "error"), (False, "warning")])
def test_a_breached_film_is_an_error(through: bool, severity: str) -> None:
    (finding,) = attacked(cut(loss(depth=0.6, through=through)))
    assert (finding.severity, "it is breached" in finding.text) == (severity, through)


def test_the_finding_says_what_where_how_deep_and_why() -> None:
    (finding,) = attacked(cut(loss()))
    assert (finding.code, finding.step, finding.film, finding.part) == ("film-attacked", 8, "nitride", None)
    assert finding.at_um == (3.5, 4.5, 0.6)
    assert finding.text == "step 8 (etch, poly rie) eats film nitride (low-stress nitride): 30 nm of its 0.5 um"
    assert "30 nm/min" in finding.cause
    assert "the 1 min" in finding.cause
    assert finding.size_um == 0.030


def test_the_wafer_has_no_thickness_to_share() -> None:
    assert attacked(cut(loss("wafer", depth=0.009, thickness=6.0))) == []
    (finding,) = attacked(cut(loss("wafer", depth=0.2, thickness=6.0)))
    assert finding.severity == "note"
    assert finding.text.endswith("200 nm deep")


@pytest.mark.parametrize("silent", [cut(loss(meant=True, depth=0.4)), cut(loss(depth=0.4), verb="strip"),
                                    cut(loss(depth=0.4), verb="polish"), cut()])  # fmt: skip
def test_what_was_meant_and_what_no_etch_did_is_not_told(silent: object) -> None:
    assert attacked(silent) == []


def test_a_release_is_told_as_an_etch_is() -> None:
    assert [f.step for f in attacked(cut(loss(), step=11, verb="release"))] == [11]


def test_the_flows_own_limits_go_first() -> None:
    strict = flow("limits: {unmeant_loss: {error: [5 %, 10 nm]}}\n")
    off = flow("limits: {unmeant_loss: {note: off, warning: off}}\n")
    assert [f.severity for f in attacked(cut(loss()), of=strict)] == ["error"]
    assert attacked(cut(loss(depth=0.2)), of=off) == []
