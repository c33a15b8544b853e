"""Rows of the parts: their states, what they are made of, and which loose bodies are left out."""

from __future__ import annotations

import numpy as np
import pytest

from flowemu.engine.parts import part_rows
from flowemu.engine.view import View
from flowemu.stack.stack import FilmStack
from flowemu.stack.wafer import Event, Loosened, Wafer
from flowemu.steps.models.coating import coat
from tests import stacks
from tests.unit.checks.situations import flow
from tests.unit.engine.runs import finished
from tests.unit.steps.shop import tools

PLACES = {"plate": ("plate", (12.0, 12.0))}


def plate(width: float, lift: float = 1.5, post: bool = False) -> FilmStack:
    """A square plate of this width, 2 um thick, over a gap of `lift`, about (12, 12); on a post or loose."""
    grid = stacks.even_grid(24, -3, 10, ny=24)
    x, y = np.meshgrid(grid.x - 12.1, grid.y - 12.1)
    square = np.maximum(np.abs(x), np.abs(y))
    stack = coat(stacks.bare(grid, 0.3), stacks.blank("sac"), lift)
    if post:
        stack = stacks.printed(stack, 1.5 - square)
        stack = stacks.stripped(stacks.beam_etch(stack, {"sac": 1.0}, 1.1 * lift))
    stack = coat(stack, stacks.blank("plate", step=2), 2.0)
    stack = stacks.printed(stack, square - width / 2)
    stack = stacks.stripped(stacks.beam_etch(stack, {"plate": 1.0}, 2.4 + lift))
    return stacks.stripped(stack, "sac")


def rows(stack: FilmStack, *events: Event, ended: bool = True, places: dict[str, object] | None = None) -> list[object]:
    given = PLACES if places is None else places
    seen = View(flow(), None, tools("release", places=given), Wafer(stack, events=events), 11, ended)  # type: ignore[arg-type]
    return list(part_rows(seen))


def test_a_held_part_has_its_contact_and_no_play() -> None:
    (row,) = rows(plate(8.0, post=True))
    assert (row.name, row.films, row.state, row.play_um) == ("plate", ("plate",), "held", None)
    assert row.contact_um2 == pytest.approx(9.0, rel=0.1)
    assert row.box_um == pytest.approx((8.1, 8.1, 0.3, 16.1, 16.1, 3.8), abs=0.2)
    assert row.volume_um3 == pytest.approx(64 * 2 + 9 * 1.5, rel=0.05)


def test_a_loose_part_is_judged() -> None:
    (row,) = rows(plate(8.0))
    assert (row.state, row.contact_um2) == ("adrift", 0.0)
    assert row.play_um is not None
    assert row.play_um[4] == pytest.approx(1.5, abs=0.1)
    assert row.play_um[5] == float("inf")


def test_a_part_at_the_windows_side_is_cut() -> None:
    (row,) = rows(plate(60.0))
    assert row.state == "cut by the window"


NOWHERE = np.empty((0, 2))


def test_what_the_release_found_goes_before_what_is_there_now() -> None:
    columns = np.zeros((24, 24), bool)
    play = (0.5, 0.5, 0.5, 0.5, 0.2, None)
    event = Loosened(11, "plate", ("plate",), "captive", 100.0, (0.0,) * 6, play, "all was tried", columns, NOWHERE)
    (row,) = rows(plate(8.0), event)
    assert (row.state, row.play_um) == ("captive", (0.5, 0.5, 0.5, 0.5, 0.2, float("inf")))


def test_a_part_that_was_washed_away_keeps_its_last_row() -> None:
    columns = np.zeros((24, 24), bool)
    box = (8.0, 8.0, 1.8, 16.0, 16.0, 3.8)
    event = Loosened(11, "plate", ("plate",), "adrift", 128.0, box, None, "up", columns, NOWHERE)
    (row,) = rows(stacks.bare(stacks.even_grid(24, -3, 10, ny=24)), event)
    assert (row.name, row.state, row.volume_um3, row.play_um) == ("plate", "adrift", 128.0, None)


@pytest.mark.parametrize(("ended", "count"), [(True, 1), (False, 0)])
def test_a_named_part_that_is_nowhere_is_gone_at_the_end_and_not_yet_there_before(ended: bool, count: int) -> None:
    found = rows(stacks.bare(stacks.even_grid(24, -3, 10, ny=24)), ended=ended)
    assert [row.state for row in found] == ["gone"] * count


def test_a_nameless_loose_body_is_listed_unless_it_is_dust() -> None:
    """A plate of 8 x 8 x 2 um has a row; one of 0.6 x 0.6 um, 0.7 cells, has none."""
    assert [row.name for row in rows(plate(8.0), places={})] == ["plate piece 1"]
    assert rows(plate(0.6), places={}) == []


def test_the_parts_of_a_run_are_in_its_record() -> None:
    (row,) = finished().record.parts
    assert (row.name, row.films, row.state) == ("plate", ("poly",), "held")
