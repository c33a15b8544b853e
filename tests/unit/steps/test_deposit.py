"""Deposits as a step: conformal, with a stated coverage, spun on, in front and at the back, and what is refused."""

from __future__ import annotations

import numpy as np
import pytest

from flowemu.errors import StepError
from flowemu.registry import step_kinds
from flowemu.stack.measure import film_volume
from flowemu.stack.wafer import Coat, Laid, Unresolved, Wafer
from tests import stacks
from tests.unit.steps.shop import do, layered

POLY = {"film": "poly", "material": "polysilicon", "thickness": "1.2 um", "method": "lpcvd"}
GLASS = {"film": "glass", "material": "psg", "thickness": "2 um", "method": "lpcvd"}


def step(height: float = 4.0, nx: int = 32, edge: float = 16.3) -> Wafer:
    """A wafer with a block of this height up to x = `edge`."""
    wafer = layered(("block", "nitride", None, height), nx=nx)
    stack = stacks.printed(wafer.stack, wafer.stack.grid.x - edge)
    return Wafer(stacks.stripped(stacks.beam_etch(stack, {"block": 1.0}, 1.1 * height)))


def wall(wafer: Wafer, name: str, height: float) -> float:
    """Thickness of a film on the block's wall at this height, um."""
    top = stacks.film_of(wafer.stack, name).top
    line = stacks.value_at(top, wafer.stack.grid, wafer.stack.grid.x, np.full(wafer.stack.grid.nx, height))
    return float(stacks.crossings(line, wafer.stack.grid.x)[0]) - 16.3


@pytest.mark.parametrize("thickness", [0.1, 0.7, 2.4])
def test_a_film_on_a_flat_has_its_thickness(thickness: float) -> None:
    """To 0.01 cell, however thin."""
    wafer = do(layered(), "deposit", **{**POLY, "thickness": f"{thickness} um"})
    assert stacks.thickness(wafer.stack, "poly", 6.0) == pytest.approx(thickness, abs=0.01)
    assert film_volume(wafer.stack.films[1], wafer.stack.grid) == pytest.approx(12 * thickness, rel=0.01)


def test_a_conformal_film_is_as_thick_on_walls_as_on_flats() -> None:
    """1.2 um above, below and beside the block, to 0.02 cell away from corners."""
    wafer = do(step(), "deposit", **POLY)
    assert stacks.thickness(wafer.stack, "poly", 6.0) == pytest.approx(1.2, abs=0.01)
    assert stacks.thickness(wafer.stack, "poly", 28.0) == pytest.approx(1.2, abs=0.01)
    assert wall(wafer, "poly", 3.2) == pytest.approx(1.2, abs=0.02)


@pytest.mark.parametrize("coverage", [0.4, 0.6, 0.9])
def test_a_stated_coverage_is_the_walls_share_of_the_flats(coverage: float) -> None:
    """2 um on the flat to 0.02 cell, coverage x 2 um on the wall to 0.1 cell."""
    wafer = do(step(), "deposit", coverage=f"{100 * coverage:g} %", **GLASS)
    assert stacks.thickness(wafer.stack, "glass", 6.0) == pytest.approx(2.0, abs=0.02)
    assert stacks.thickness(wafer.stack, "glass", 28.0) == pytest.approx(2.0, abs=0.02)
    assert wall(wafer, "glass", 3.2) == pytest.approx(2.0 * coverage, abs=0.1)


def test_a_spun_film_is_level_and_fills() -> None:
    """Its top lies 3 um above the mean of what is below: (16.3 x 4.2 + 15.7 x 0.2) / 32 = 2.24."""
    given = {"film": "fill", "material": "polyimide", "thickness": "3 um", "method": "spin"}
    wafer = do(step(), "deposit", **given)
    mean = (16.3 * 4.2 + 15.7 * 0.2) / 32
    tops = [stacks.layers(wafer.stack, x)[-1][2] for x in (2.5, 10.5, 20.5, 30.5)]
    assert tops == pytest.approx([mean + 3.0] * 4, abs=0.1)
    assert np.ptp(tops) < 1e-4
    assert stacks.layers(wafer.stack, 28.5)[-1][1] == pytest.approx(0.2, abs=0.01)


def test_less_planarisation_leaves_a_share_of_the_step() -> None:
    """Halfway between level and following: the two flats' tops differ by less than the step and more than nothing."""
    given = {"film": "fill", "material": "polyimide", "thickness": "3 um", "method": "spin"}
    rises = []
    for share in ("100 %", "50 %", "0 %"):
        stack = do(step(), "deposit", planarisation=share, **given).stack
        rises.append(stacks.layers(stack, 1.5)[-1][2] - stacks.layers(stack, 30.5)[-1][2])
    assert rises[0] == pytest.approx(0.0, abs=1e-4)
    assert rises[1] == pytest.approx(0.5 * rises[2], rel=0.05)
    assert 0.5 < rises[2] < 4.0


def test_a_film_does_not_get_into_a_sealed_void() -> None:
    """A cavity under a roof without a hole stays void, and the roof is coated above alone."""
    stack = layered(("sac", "psg", None, 3.0), nx=24).stack
    stack = stacks.printed(stack, np.abs(stack.grid.x - 12.0) - 6.0)
    stack = stacks.stripped(stacks.beam_etch(stack, {"sac": 1.0}, 3.3))
    wafer = do(Wafer(stack), "deposit", 5, **{**POLY, "film": "roof"})
    sealed = wafer.stack.without({1})
    after = do(Wafer(sealed), "deposit", **POLY)
    assert [name for name, _, _ in stacks.layers(after.stack, 12.5)] == ["wafer", "roof", "poly"]
    assert stacks.thickness(after.stack, "poly", 12.5) == pytest.approx(1.2, abs=0.02)


def test_a_furnace_coats_both_sides_and_what_the_step_says_goes_first() -> None:
    coat = Coat("poly", "polysilicon", "undoped", 1.2, 9)
    assert do(layered(), "deposit", **POLY).back == (coat,)
    assert do(layered(), "deposit", side="front", **POLY).back == ()
    at_back = do(layered(), "deposit", side="back", **POLY)
    assert at_back.back == (coat,)
    assert at_back.stack.index("poly") is None


def test_a_sputtered_film_coats_the_front_alone() -> None:
    wafer = do(layered(), "deposit", film="m", material="aluminium", thickness="0.4 um", method="sputter")
    assert wafer.back == ()


def test_the_film_carries_its_material_state_and_step() -> None:
    film = do(layered(), "deposit", state="n+", **POLY).stack.films[-1]
    assert (film.name, film.material, film.state, film.step) == ("poly", "polysilicon", "n+", 9)


def test_what_the_film_rests_on_is_on_record() -> None:
    (laid,) = [event for event in do(step(), "deposit", **POLY).events if isinstance(event, Laid)]
    assert (laid.step, laid.film, laid.names) == (9, "poly", ("wafer", "block"))
    assert laid.rests[0, 2] == 1
    assert laid.rests[0, 30] == 0


def test_a_gap_too_narrow_to_be_coated_inside_is_told() -> None:
    """A slit 0.4 cell wide, left by a film between a block and what was laid over it: told with its width."""
    sac, outer = {**POLY, "film": "sac", "thickness": "0.4 um"}, {**POLY, "film": "outer", "thickness": "3 um"}
    wafer = do(do(step(3.7, edge=15.8), "deposit", 3, **sac), "deposit", 4, **outer)
    wafer = do(do(wafer, "polish", to="block"), "strip", film="sac")
    found = [event for event in do(wafer, "deposit", **POLY).events if isinstance(event, Unresolved)]
    assert [event.film for event in found] == ["poly"]
    assert found[0].size == pytest.approx(0.4, abs=0.02)
    assert found[0].text == (
        "film 'poly' grows over gaps as narrow as 0.4 um, less than two cells, and is not laid inside them"
    )


def test_a_glass_over_topography_without_coverage_is_refused_with_a_hint() -> None:
    says = "psg by lpcvd thins on walls and the surface is not flat; state its coverage of walls, such as coverage: "
    with pytest.raises(StepError, match=says):
        do(step(), "deposit", **GLASS)


def test_on_a_flat_a_glass_needs_no_coverage() -> None:
    assert stacks.thickness(do(layered(), "deposit", **GLASS).stack, "glass", 6.0) == pytest.approx(2.0, abs=0.01)


@pytest.mark.parametrize(
    ("changed", "says"), [({"material": "unobtainium"}, "unobtainium"), ({"method": "painting"}, "painting")]
)
def test_names_that_the_data_do_not_know_are_refused(changed: dict[str, str], says: str) -> None:
    with pytest.raises(StepError, match=says):
        do(layered(), "deposit", **{**POLY, **changed})


@pytest.mark.parametrize(
    ("changed", "says"),
    [
        ({"thickness": "0 um"}, "'0 um' is not above zero"),
        ({"thickness": "-1 um"}, "'-1 um' is not above zero"),
        ({"coverage": "0 %"}, "'0 %' is not above zero"),
        ({"colour": "red"}, "colour"),
    ],
)
def test_settings_without_sense_are_refused(changed: dict[str, str], says: str) -> None:
    with pytest.raises(ValueError, match=says):
        step_kinds()["deposit"].settings.model_validate({**POLY, **changed})
