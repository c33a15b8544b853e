"""Etches as a step: amounts, rates, what is refused, and what is put on record."""

from __future__ import annotations

import numpy as np
import pytest

from flowemu.errors import StepError
from flowemu.registry import step_kinds
from flowemu.stack.wafer import Coat, Wafer
from tests import stacks
from tests.unit.steps.shop import box, cut_of, do, layered, process_data

GLASS_ON_NITRIDE = (("nitride", "low-stress nitride", None, 0.6), ("glass", "psg", "as deposited", 2.1))
OWN = {"psg": "1 um/min", "low-stress nitride": "5 nm/min", "silicon": "0 nm/min"}
PROFILES = ("isotropic", "directional")


@pytest.mark.parametrize("profile", PROFILES)
@pytest.mark.parametrize("height", [0.2, 0.45, 0.8])
def test_a_time_takes_rate_times_time(profile: str, height: float) -> None:
    """66 s at 1 um/min take 1.1 of 2.1 um, to 0.01 cell, wherever the samples lie."""
    given = {"with_": "hf 49", "time": "66 s", "rates": OWN, "profile": profile}
    wafer = do(layered(*GLASS_ON_NITRIDE, height=height), "etch", **given)
    assert stacks.thickness(wafer.stack, "glass", 6.0) == pytest.approx(1.0, abs=0.01)
    assert cut_of(wafer).time == 66.0


@pytest.mark.parametrize("profile", PROFILES)
def test_a_depth_is_what_the_open_flat_loses(profile: str) -> None:
    wafer = do(layered(*GLASS_ON_NITRIDE), "etch", with_="hf 49", depth="0.9 um", profile=profile, rates=OWN)
    assert stacks.thickness(wafer.stack, "glass", 6.0) == pytest.approx(1.2, abs=0.01)
    assert cut_of(wafer).time == pytest.approx(54.0, rel=1e-3)


def test_clearing_takes_the_films_thickness_and_the_overetch_its_share() -> None:
    """2.1 um at 1 um/min and 20 % over: 151.2 s; the nitride loses 25.2 s at 5 nm/min, 2.1 nm."""
    given = {"clears": "glass", "over": "20 %", "profile": "directional", "rates": OWN}
    wafer = do(layered(*GLASS_ON_NITRIDE), "etch", with_="hf 49", **given)
    assert cut_of(wafer).time == pytest.approx(151.2, rel=0.01)
    assert wafer.stack.index("glass") is None
    assert stacks.thickness(wafer.stack, "nitride", 6.0) == pytest.approx(0.5979, abs=2e-3)


def test_clearing_two_films_takes_the_sum_of_their_times() -> None:
    """1.1 um at 2 um/min over 2.1 um at 1 um/min: 33 + 126 s."""
    films = (*GLASS_ON_NITRIDE, ("cap", "lto", None, 1.1))
    rates = {**OWN, "cap": "2 um/min"}
    wafer = do(layered(*films), "etch", with_="hf 49", clears=["cap", "glass"], profile="directional", rates=rates)
    assert cut_of(wafer).time == pytest.approx(159.0, rel=1e-3)


def test_clearing_means_the_flat_so_that_a_stringer_stays_on_the_wall() -> None:
    """A 3 um step under 1 um of film, 1.2 um taken: half a um off the wall 3 + sqrt(1 - 0.5^2) - 1.2 um are left."""
    wafer = layered(("block", "low-stress nitride", None, 3.0), nx=24)
    masks = {"EDGE": [box(-50, 12.0)]}
    wafer = do(wafer, "pattern", masks=masks, mask="EDGE", keep="drawn", resist="2 um")
    given = {"low-stress nitride": "1 um/min", "resist": "0 nm/min", "silicon": "0 nm/min"}
    wafer = do(wafer, "etch", with_="nitride rie", clears="block", over="10 %", rates=given)
    wafer = do(do(wafer, "strip", film="resist"), "deposit", 3, film="film", material="polysilicon", thickness="1 um",
               method="lpcvd")  # fmt: skip
    rates = {"polysilicon": "1 um/min", "low-stress nitride": "0 nm/min", "silicon": "0 nm/min"}
    wafer = do(wafer, "etch", with_="poly rie", clears="film", over="20 %", rates=rates)
    assert cut_of(wafer).time == pytest.approx(72.0, rel=0.01)
    assert stacks.thickness(wafer.stack, "film", 12.5) == pytest.approx(2.666, abs=0.1)
    assert stacks.thickness(wafer.stack, "film", 4.5) == 0.0
    assert stacks.thickness(wafer.stack, "film", 20.5) == 0.0


def test_an_endpoint_is_the_film_showing() -> None:
    given = {"until": "nitride", "over": "10 %", "rates": {"psg": "0.3 um/min"}}
    wafer = do(layered(*GLASS_ON_NITRIDE), "etch", with_="oxide rie", **given)
    assert cut_of(wafer).time == pytest.approx(1.1 * 7 * 60, rel=0.01)
    assert wafer.stack.index("glass") is None


def test_rates_of_a_film_go_before_those_of_its_material_and_both_before_the_data() -> None:
    """The upper glass, 1 um at its own 2 um/min, is gone in 30 s; the lower one loses 0.5 um in the other 30."""
    films = (("low", "psg", "annealed", 2.0), ("high", "psg", "annealed", 1.0))
    rates = {"psg": "1 um/min", "high": "2 um/min", "silicon": "0 nm/min"}
    wafer = do(layered(*films), "etch", with_="hf 49", time="60 s", rates=rates, profile="directional")
    assert wafer.stack.index("high") is None
    assert stacks.thickness(wafer.stack, "low", 6.0) == pytest.approx(1.5, abs=0.02)


def test_the_rate_of_others_is_for_films_that_have_none() -> None:
    """Gold has no datum in hf 10:1 and takes that of others; the nitride keeps its own, 1.1 nm/min."""
    films = (("metal", "gold", None, 2.0),)
    wafer = do(layered(*films), "etch", with_="hf 10:1", time="60 s", rates={"others": "0.5 um/min"})
    assert stacks.thickness(wafer.stack, "metal", 6.0) == pytest.approx(1.5, abs=0.01)
    wafer = do(layered(("film", "nitride", None, 2.0)), "etch", with_="hf 10:1", time="60 s",
               rates={"others": "0.5 um/min"})  # fmt: skip
    assert stacks.thickness(wafer.stack, "film", 6.0) == pytest.approx(1.9989, abs=2e-4)


def test_the_rate_is_the_datas_for_the_films_state() -> None:
    """Annealed psg is etched at the data's own rate for that state, not at the one as deposited."""
    for state in ("as deposited", "annealed"):
        rate = process_data().rate("bhf 5:1", "psg", state).value
        assert rate is not None
        wafer = do(layered(("glass", "psg", state, 3.0)), "etch", with_="bhf 5:1", time=f"{1.5 / rate:.6f} s")
        assert stacks.thickness(wafer.stack, "glass", 6.0) == pytest.approx(1.5, abs=0.02)


def test_a_film_that_it_meets_without_a_rate_is_refused_by_name() -> None:
    films = (("metal", "gold", None, 0.4), ("glass", "psg", "as deposited", 1.0))
    given = {"clears": "glass", "over": "10 %", "rates": {"psg": "1 um/min"}, "profile": "directional"}
    with pytest.raises(StepError, match=r"no rate for film 'metal' \(gold.*'hf 10:1'.*rates: \{metal: 5 nm/min\}"):
        do(layered(*films), "etch", with_="hf 10:1", **given)


def test_a_film_that_lies_bare_from_the_start_without_a_rate_is_refused() -> None:
    with pytest.raises(StepError, match="no rate for film 'metal'"):
        do(layered(("metal", "gold", None, 0.4)), "etch", with_="hf 10:1", time="1 s")


def test_a_film_without_a_rate_that_it_never_meets_is_no_fault() -> None:
    films = (("metal", "gold", None, 0.4), ("glass", "psg", "as deposited", 2.0))
    wafer = do(layered(*films), "etch", with_="hf 10:1", time="20 s", rates={"psg": "1 um/min"})
    assert stacks.thickness(wafer.stack, "glass", 6.0) == pytest.approx(2 - 1 / 3, abs=0.01)


@pytest.mark.parametrize("profile", PROFILES)
def test_a_film_that_is_not_there_is_refused(profile: str) -> None:
    for how in ("clears", "until"):
        with pytest.raises(StepError, match="there is no film 'lost' on the wafer any more"):
            do(layered(*GLASS_ON_NITRIDE), "etch", with_="hf 49", rates=OWN, profile=profile, **{how: "lost"})


def test_a_film_that_is_never_opened_is_refused() -> None:
    films = (*GLASS_ON_NITRIDE, ("lid", "gold", None, 0.5))
    rates = {**OWN, "gold": "0 nm/min"}
    with pytest.raises(StepError, match="clears glass: the etchant never gets there"):
        do(layered(*films), "etch", with_="hf 49", clears="glass", rates=rates)
    for how, named in (("clears", "glass"), ("until", "nitride")):
        with pytest.raises(StepError, match=f"{how} {named}: no open area leads there"):
            do(layered(*films), "etch", with_="hf 49", rates=rates, profile="directional", **{how: named})


def test_a_depth_into_a_film_that_is_not_etched_is_refused_with_the_reason() -> None:
    films = (*GLASS_ON_NITRIDE, ("lid", "gold", None, 0.5))
    with pytest.raises(StepError, match=r"depth: film 'lid' \(gold\), which covers the open area, is not etched by"):
        do(layered(*films), "etch", with_="hf 49", depth="0.1 um", rates={**OWN, "gold": "0 nm/min"})


def test_a_depth_where_resist_covers_all_is_refused() -> None:
    wafer = Wafer(stacks.printed(layered(*GLASS_ON_NITRIDE).stack, np.full(12, -5.0)))
    with pytest.raises(StepError, match="depth: nothing is open to the etch"):
        do(wafer, "etch", with_="oxide rie", depth="0.1 um", rates={"psg": "1 um/min"})


def test_a_profile_that_is_not_built_is_refused() -> None:
    with pytest.raises(StepError, match="profile 'deep' is not built yet; state profile: isotropic or directional"):
        do(layered(), "etch", with_="hf 49", time="1 s", profile="deep")


def test_an_etchant_that_is_not_known_is_refused() -> None:
    with pytest.raises(StepError, match="oxide ry"):
        do(layered(), "etch", with_="oxide ry", time="1 s")


@pytest.mark.parametrize(
    ("given", "says"),
    [
        ({}, "expected exactly one of time, depth, clears, until"),
        ({"time": "1 s", "depth": "1 um"}, "found time and depth"),
        ({"time": "1 s", "over": "10 %"}, "'over' may only follow clears or until"),
    ],
)
def test_more_or_less_than_one_amount_is_refused(given: dict[str, str], says: str) -> None:
    with pytest.raises(ValueError, match=says):
        step_kinds()["etch"].settings.model_validate({"with": "hf 49", **given})


def test_what_was_meant_and_what_was_eaten_by_the_way_are_on_record() -> None:
    """The cleared film is meant; the nitride below it lost 25.2 s at 50 nm/min, 21 nm."""
    rates = {**OWN, "low-stress nitride": "50 nm/min"}
    given = {"clears": "glass", "over": "20 %", "profile": "directional", "rates": rates}
    wafer = do(layered(*GLASS_ON_NITRIDE), "etch", with_="hf 49", **given)
    losses = {loss.film: loss for loss in cut_of(wafer).losses}
    assert losses["glass"].meant and losses["glass"].through
    assert losses["glass"].thickness == pytest.approx(2.1, abs=0.01)
    assert losses["glass"].volume == pytest.approx(2.1 * 12, rel=0.01)
    assert not losses["nitride"].meant and not losses["nitride"].through
    assert losses["nitride"].depth == pytest.approx(0.021, rel=0.05)
    assert losses["nitride"].volume == pytest.approx(0.021 * 12, rel=0.1)


def test_a_film_that_is_cut_through_by_the_way_is_on_record_as_such() -> None:
    """A skin of 0.3 um at half the rate of what is cleared: gone after 36 s of the 68 s of overetch."""
    films = (("skin", "low-stress nitride", None, 0.3), ("glass", "psg", "as deposited", 2.1))
    rates = {"psg": "1 um/min", "low-stress nitride": "0.5 um/min", "silicon": "0 nm/min"}
    wafer = do(layered(*films), "etch", with_="hf 49", clears="glass", over="50 %", profile="directional", rates=rates)
    (loss,) = [loss for loss in cut_of(wafer).losses if loss.film == "skin"]
    assert loss.through and not loss.meant
    assert wafer.stack.index("skin") is None


def test_the_mask_that_is_on_the_wafer_is_on_record() -> None:
    wafer = layered(*GLASS_ON_NITRIDE)
    masks = {"HOLE": [box(4.0, 8.0)]}
    wafer = do(wafer, "pattern", masks=masks, mask="HOLE", open="drawn", resist="2 um")
    wafer = do(wafer, "etch", with_="oxide rie", depth="0.5 um", rates={"psg": "1 um/min", "resist": "0 nm/min"})
    assert cut_of(wafer).mask == "HOLE"
    assert (cut_of(wafer).step, cut_of(wafer).verb, cut_of(wafer).agent) == (9, "etch", "oxide rie")


def mask_edge(stack: stacks.FilmStack, height: float) -> float:
    """Where the etched film's wall stands at this height, um."""
    gone = stacks.film_of(stack, "film").gone
    assert gone is not None
    line = stacks.value_at(gone, stack.grid, stack.grid.x, np.full(stack.grid.nx, height))
    return float(stacks.crossings(line, stack.grid.x)[0])


RIE = {"polysilicon": "1 um/min", "resist": "0 nm/min"}


@pytest.mark.parametrize(("lateral", "edge"), [("0 %", 12.3), ("20 %", 12.6)])
def test_the_lateral_share_moves_the_wall(lateral: str, edge: float) -> None:
    """1.5 um deep with 20 % sideways: the wall stands 0.3 um behind the mask's edge, to 0.1 cell."""
    wafer = layered(("film", "polysilicon", "n+", 4.0), nx=24)
    stack = stacks.printed(wafer.stack, 12.3 - wafer.stack.grid.x, thickness=2.0)
    given = {"time": "90 s", "lateral": lateral, "wall": "90 deg", "rates": RIE}
    assert mask_edge(do(Wafer(stack), "etch", with_="poly rie", **given).stack, 3.6) == pytest.approx(edge, abs=0.1)


def test_a_wall_below_upright_narrows_the_opening_downward() -> None:
    """At 70 degrees the wall runs in by 2 / tan 70 = 0.728 um over 2 um of depth, to 0.1 cell."""
    wafer = layered(("film", "polysilicon", "n+", 5.0), nx=24)
    stack = stacks.printed(wafer.stack, 12.3 - wafer.stack.grid.x, thickness=2.0)
    given = {"time": "240 s", "lateral": "0 %", "wall": "70 deg", "rates": RIE}
    cut = do(Wafer(stack), "etch", with_="poly rie", **given).stack
    assert mask_edge(cut, 4.2) - mask_edge(cut, 2.2) == pytest.approx(2 / np.tan(np.radians(70)), abs=0.1)


def test_a_mask_shields_and_erodes() -> None:
    """Resist at a third of the film's rate loses 0.5 um while the open film loses 1.5; covered film loses none."""
    wafer = layered(("film", "polysilicon", "n+", 4.0), nx=24)
    stack = stacks.printed(wafer.stack, 12.3 - wafer.stack.grid.x, thickness=2.0)
    rates = {"polysilicon": "0.9 um/min", "resist": "0.3 um/min"}
    cut = do(Wafer(stack), "etch", with_="poly rie", time="100 s", lateral="0 %", wall="90 deg", rates=rates).stack
    assert stacks.thickness(cut, "resist", 18.0) == pytest.approx(1.5, abs=0.01)
    assert stacks.thickness(cut, "film", 18.0) == pytest.approx(4.0, abs=1e-4)
    assert stacks.thickness(cut, "film", 6.0) == pytest.approx(2.5, abs=0.01)


BACK = (Coat("nitride", "low-stress nitride", None, 0.6, 1), Coat("glass", "psg", None, 2.1, 2))


def test_a_bath_wets_the_back_and_a_beam_does_not() -> None:
    wafer = layered(*GLASS_ON_NITRIDE)
    wafer = wafer.now(wafer.stack, back=BACK)
    bath = do(wafer, "etch", with_="hf 49", time="60 s", rates=OWN)
    assert [coat.thickness for coat in bath.back] == pytest.approx([0.6, 1.1])
    beam = do(wafer, "etch", with_="oxide rie", time="60 s", rates=OWN)
    assert beam.back == BACK
    front = do(wafer, "etch", with_="hf 49", time="60 s", rates=OWN, side="front")
    assert front.back == BACK
