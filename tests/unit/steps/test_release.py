"""Releases: timed by the parts they free, and what is then neither held nor captive is gone."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest

from flowemu.errors import StepError
from flowemu.stack.film import Film
from flowemu.stack.wafer import Cut, Loosened, Wafer
from flowemu.steps.models.coating import coat
from tests import stacks
from tests.unit.steps.shop import do

RATES = {"psg": "6 um/min", "polysilicon": "0 nm/min", "silicon": "0 nm/min"}  # 0.1 um/s
PLACES = {"held": ("poly", (9.5, 8.5)), "loose": ("poly", (25.5, 8.5))}


def plates(gap: float = 1.2, plate: float = 1.6) -> Wafer:
    """Two plates 10 x 10 over a glass, about (9, 8) and (25, 8); the first one on a post 3 wide."""
    grid = stacks.even_grid(34, -3, 10, ny=16)
    x, y = np.meshgrid(grid.x, grid.y)

    def square(at: float, half: float) -> np.ndarray:
        return np.maximum(np.abs(x - at), np.abs(y - 8.0)) - half

    stack = stacks.bare(grid, 0.3)
    stack = coat(stack, Film("glass", "psg", "as deposited", 1, stack.surface), gap)
    stack = stacks.printed(stack, -square(9.2, 1.5))
    stack = stacks.stripped(stacks.beam_etch(stack, {"glass": 1.0}, 1.1 * gap))
    stack = coat(stack, Film("poly", "polysilicon", "n+", 4, stack.surface), plate)
    stack = stacks.printed(stack, np.minimum(square(9.2, 5.0), square(25.2, 5.0)))
    return Wafer(stacks.stripped(stacks.beam_etch(stack, {"poly": 1.0}, 1.2 * plate + gap)))


def released(**settings: Any) -> Wafer:
    return do(plates(), "release", places=PLACES, with_="hf 49", rates=RATES, **settings)


def last(wafer: Wafer, kind: type) -> Any:
    return [event for event in wafer.events if isinstance(event, kind)][-1]


def test_a_plate_without_an_anchor_is_washed_away_and_the_other_stays() -> None:
    wafer = released(time="120 s")
    assert stacks.thickness(wafer.stack, "poly", 6.5, 8.5) == pytest.approx(1.6, abs=0.02)
    assert stacks.thickness(wafer.stack, "poly", 25.5, 8.5) == 0.0
    event = last(wafer, Loosened)
    assert (event.part, event.films, event.state) == ("loose", ("poly",), "adrift")
    assert event.volume == pytest.approx(160.0, rel=0.03)


def test_the_time_to_free_is_that_of_the_last_contact() -> None:
    """From all four sides to the middle of 10 um at 0.1 um/s: 50 s, to a cell; the held plate's last is nearer."""
    times = {freed.part: freed.time for freed in last(released(time="5 s"), Cut).freed}
    assert times["loose"] == pytest.approx(50.0, abs=6.0)
    assert times["held"] < times["loose"]


def test_frees_runs_until_the_parts_are_free_and_over_beyond() -> None:
    wafer = released(frees=["held"], over="50 %")
    cut = last(wafer, Cut)
    freed = {f.part: f.time for f in cut.freed}
    assert cut.time == pytest.approx(1.5 * freed["held"], rel=1e-3)
    assert stacks.thickness(wafer.stack, "glass", 6.5, 8.5) == 0.0


def test_a_short_release_leaves_the_plate_where_it_is() -> None:
    wafer = released(time="20 s")
    assert stacks.thickness(wafer.stack, "poly", 25.5, 8.5) == pytest.approx(1.6, abs=0.02)
    assert not any(isinstance(event, Loosened) for event in wafer.events)
    freed = {f.part: f for f in last(wafer, Cut).freed}
    assert freed["loose"].film == "glass"
    assert freed["loose"].time > 20.0
    assert freed["loose"].at[:2] == pytest.approx((25.2, 8.0), abs=1.5)


def test_a_part_that_is_not_there_cannot_be_freed() -> None:
    with pytest.raises(StepError, match="part 'other' is not there"):
        released(frees=["other"])


def test_a_plate_that_hangs_together_with_the_wafer_stays_held() -> None:
    """Not even the loose plate goes while glass holds it; nothing is adrift and the held one is never listed."""
    events = [event for event in released(time="120 s").events if isinstance(event, Loosened)]
    assert [event.part for event in events] == ["loose"]


def test_a_nameless_loose_body_is_found_too() -> None:
    wafer = do(plates(), "release", places={}, with_="hf 49", rates=RATES, time="120 s")
    event = last(wafer, Loosened)
    assert (event.films, event.state, event.sliver) == (("poly",), "adrift", False)
    assert event.part.startswith("poly piece")


def test_over_only_follows_an_amount_that_it_is_a_share_of() -> None:
    with pytest.raises(ValueError, match="'over' may only follow clears or until or frees"):
        released(time="1 s", over="10 %")
    with pytest.raises(ValueError, match="expected exactly one of time, depth, clears, until, frees"):
        released(frees=["held"], time="1 s")


def test_a_beam_cannot_be_timed_by_the_parts_that_it_frees() -> None:
    with pytest.raises(StepError, match="a directional etch cannot be timed by the parts that it frees"):
        released(frees=["held"], profile="directional")


def test_a_part_that_the_etchant_never_gets_to_is_refused() -> None:
    rates = {**RATES, "psg": "0 nm/min", "others": "0 nm/min", "nitride": "1 um/min"}
    wafer = plates()
    stack = coat(wafer.stack, Film("seal", "gold", None, 6, wafer.stack.surface), 1.1)
    with pytest.raises(StepError, match="frees held: the etchant never gets there"):
        do(Wafer(stack), "release", places=PLACES, with_="hf 49", rates={**rates, "psg": "6 um/min"}, frees=["held"])
