"""An anneal changes states on both sides, not shapes; the next etch sees the new state."""

from __future__ import annotations

import pytest

from flowemu.errors import InputError, StepError
from flowemu.registry import step_kinds
from flowemu.stack.wafer import Coat, Wafer
from tests import stacks
from tests.unit.steps.shop import do, layered, process_data, same_fields

FILMS = (("nitride", "low-stress nitride", None, 0.6), ("glass", "psg", "as deposited", 3.0))


def test_states_change_and_fields_do_not() -> None:
    before = layered(*FILMS)
    before = before.now(before.stack, back=(Coat("glass", "psg", "as deposited", 2.0, 2),))
    after = do(before, "anneal", temperature="1050 degC", time="60 min")
    assert [film.state for film in after.stack.films][2] == "annealed"
    assert after.back[0].state == "annealed"
    assert same_fields(before, after)


def test_a_cool_anneal_changes_nothing() -> None:
    before = layered(*FILMS)
    after = do(before, "anneal", temperature="200 degC", time="60 min")
    assert after.stack is before.stack


def test_the_next_etch_goes_at_the_annealed_rate() -> None:
    """In the time for 1.5 um as deposited the annealed glass loses less, by the ratio of the data's two rates."""
    slow, fast = (process_data().rate("bhf 5:1", "psg", state).value for state in ("annealed", "as deposited"))
    assert slow is not None and fast is not None and slow < fast
    annealed = do(layered(*FILMS), "anneal", temperature="1050 degC", time="60 min")
    etched = do(annealed, "etch", with_="bhf 5:1", time=f"{1.5 / fast:.6f} s")
    assert 3.0 - stacks.thickness(etched.stack, "glass", 6.0) == pytest.approx(1.5 * slow / fast, abs=0.02)


def test_resist_does_not_go_into_a_furnace() -> None:
    wafer = layered(*FILMS)
    coated = Wafer(stacks.printed(wafer.stack, wafer.stack.grid.x - 6.0))
    with pytest.raises(StepError, match="resist is still on the wafer and does not go into a furnace; strip it first"):
        do(coated, "anneal", temperature="1050 degC", time="60 min")


@pytest.mark.parametrize("given", [{"time": "60 min"}, {"temperature": "900 degC"}])
def test_a_missing_temperature_or_time_is_refused(given: dict[str, str]) -> None:
    with pytest.raises((InputError, ValueError), match="Field required"):
        step_kinds()["anneal"].settings.model_validate(given)
