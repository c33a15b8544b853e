"""Each kind of expectation on a wafer made by hand."""

from __future__ import annotations

import pytest

from flowemu.engine.expected import outcomes
from flowemu.record import PartRow
from flowemu.stack.wafer import Cut, Freed, Wafer
from tests import stacks
from tests.unit.checks.situations import flow
from tests.unit.steps.shop import layered


def outcome(line: str, wafer: Wafer | None = None, state: str | None = None) -> tuple[bool, str]:
    of = flow(expect=f"expect:\n  - {line}\n")
    parts = [PartRow("plate", ("poly",), 1.0, None, state)] if state else []
    (found,) = outcomes(of, wafer or Wafer(stacks.bare(stacks.even_grid(4, -2, 2))), parts)
    return found.holds, found.found


@pytest.mark.parametrize(
    ("bounds", "holds"),
    [
        ("at_least: 1 um", True), ("at_least: 1.49 um", True), ("at_least: 1.52 um", False),
        ("at_most: 1.51 um", True), ("at_most: 1.4 um", False), ("at_least: 1 um, at_most: 2 um", True),
        ("at_least: 1.6 um, at_most: 2 um", False),
    ],
)  # fmt: skip
def test_a_thickness_is_that_of_all_layers_of_the_film_at_the_place(bounds: str, holds: bool) -> None:
    wafer = layered(("poly", "polysilicon", "n+", 1.5))
    assert outcome(f"thickness: {{film: poly, at: [6 um, 0.5 um], {bounds}}}", wafer) == (holds, "it is 1.5 um")


def test_a_film_that_is_not_there_measures_nothing() -> None:
    assert outcome("thickness: {film: poly, at: [1 um, 0.5 um], at_most: 0 um}") == (True, "it is 0 um")


@pytest.mark.parametrize("state", ["held", "captive", "adrift", "cut by the window", None])
@pytest.mark.parametrize("wanted", ["held", "captive"])
def test_a_state_holds_if_it_is_that_one(wanted: str, state: str | None) -> None:
    assert outcome(f"{wanted}: {{part: plate}}", state=state) == (wanted == state, f"it is {state or 'gone'}")


def released(*times: float) -> Wafer:
    """Releases of 60 s in which the plate came free after these times."""
    cuts = tuple(Cut(11, "release", "hf 49", 60.0, None, (), (Freed("plate", t, "glass", None),)) for t in times)
    return Wafer(stacks.bare(stacks.even_grid(4, -2, 2)), events=cuts)


@pytest.mark.parametrize(
    ("times", "state", "expected"),
    [
        ((60.0,), "held", (True, "it is free")),
        ((60.1,), "held", (False, "glass still touches it")),
        ((90.0, 10.0), "captive", (True, "it is free")),
        ((10.0, 90.0), "captive", (False, "glass still touches it")),
        ((), "held", (False, "no release has freed it")),
        ((10.0,), None, (False, "it is gone")),
    ],
)
def test_free_is_free_in_the_last_release(
    times: tuple[float, ...], state: str | None, expected: tuple[bool, str]
) -> None:
    assert outcome("free: {part: plate}", released(*times), state) == expected
