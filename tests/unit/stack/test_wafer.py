"""The one-dimensional ledger of the wafer's back, and the record of what was done."""

from __future__ import annotations

import pytest

from flowemu.stack.wafer import Coat, Cut, Wafer
from flowemu.steps.models.coating import coat
from tests import stacks

BACK = (Coat("nitride", "nitride", None, 0.6, 1), Coat("glass", "psg", None, 1.8, 2))


def wafer() -> Wafer:
    return Wafer(coat(stacks.bare(stacks.even_grid(4, -3, 6)), stacks.blank("film"), 1.0), back=BACK)


@pytest.mark.parametrize(
    ("time", "left"),
    [(0.0, [0.6, 1.8]), (1.0, [0.6, 0.8]), (2.0, [0.58]), (100.0, [])],
)
def test_a_bath_takes_the_outer_film_first(time, left):
    """Glass at 1 um/s for 1.8 s, then nitride at 0.1 um/s: thickness less rate x the time that is left."""
    found = wafer().thinned_back({"glass": 1.0, "nitride": 0.1}, time)
    assert [c.thickness for c in found] == pytest.approx(left)


def test_a_film_without_a_rate_shields_what_lies_below():
    assert wafer().thinned_back({"nitride": 0.1}, 50.0) == BACK


def test_a_change_adds_its_events_and_keeps_the_old_wafer():
    before = wafer()
    cut = Cut(3, "etch", "bath", 60.0, None)
    after = before.now(before.stack, cut, back=BACK[:1])
    assert (after.events, after.back) == ((cut,), BACK[:1])
    assert (before.events, before.back) == ((), BACK)
