"""A run: its steps, what is kept, where it stops, what it reports on the way, and how it places a refusal."""

from __future__ import annotations

import re
from dataclasses import replace

import numpy as np
import pytest

from flowemu.engine.run import run_flow, volume_change
from flowemu.errors import InputError, RunError
from flowemu.registry import step_kinds
from flowemu.stack.grid import Grid
from flowemu.stack.measure import film_volume
from flowemu.steps.models.coating import coat
from tests import stacks
from tests.unit.engine.runs import EXPECT, HEAD, PARTS, STEPS, finished, flow_from, of_steps, plate

GLASS = "deposit: {film: glass, material: psg, thickness: 1 um, method: lpcvd, coverage: 60 %}"


def test_every_step_has_a_row_with_what_it_added_and_removed() -> None:
    """The window is 60 x 0.5 um: a film of 1 um adds 30 um3, an opening of 8 um costs it 4 um3 beside the resist."""
    rows = finished().record.steps
    assert [(row.index, row.verb) for row in rows] == [(s.index, s.verb) for s in plate().steps]
    assert (rows[0].added_um3, rows[0].removed_um3) == (pytest.approx(30.0, rel=1e-3), 0.0)
    glass = film_volume(finished().record.shots[1].stack.films[1], finished().record.grid)
    assert glass == pytest.approx(30.0 - 4.0, rel=0.01)
    assert rows[2].removed_um3 > 4.0
    assert rows[2].seconds is not None and rows[2].seconds > 0
    assert rows[0].seconds is rows[3].seconds is None
    assert (rows[4].added_um3, rows[4].removed_um3) == (0.0, 0.0)
    assert rows[5].name == "plate film"


def test_structures_are_kept_where_asked_at_inspections_and_at_the_end() -> None:
    shots = finished().record.shots
    assert [shot.step for shot in shots] == [0, 3, 5, 10]
    assert shots[0].title == "the bare wafer"
    assert shots[1].title == "step 3 (etch)"
    assert [len(shot.stack.films) for shot in shots[:3]] == [1, 3, 2]
    assert shots[-1].stack is finished().wafer.stack


def test_until_stops_after_a_step() -> None:
    run = run_flow(plate(), until=2, keep=(0, 1, 7))
    assert [row.index for row in run.record.steps] == [1, 2]
    assert [shot.step for shot in run.record.shots] == [0, 1, 2]
    assert [film.name for film in run.record.films] == ["wafer", "glass", "resist"]
    assert run.record.expectations == (0, 0)
    assert run.record.parts == ()


def test_until_nothing_is_the_bare_wafer() -> None:
    run = run_flow(plate(), until=0)
    assert run.record.steps == ()
    assert [shot.step for shot in run.record.shots] == [0]
    assert run.wafer.events == ()


def test_a_cell_stands_in_for_the_flows_own() -> None:
    run = run_flow(plate(), until=0, cell=0.4)
    assert (run.record.grid.cell, run.record.grid.nx, run.record.grid.ny) == (0.4, 150, 2)
    assert run.record.notes == ("the window grew outward to whole cells, 60 x 0.8 um",)


def test_progress_tells_every_step_before_it_begins_and_the_checks() -> None:
    seen: list[tuple[int, int, str]] = []
    run_flow(plate(), until=2, progress=lambda *what: seen.append(what))
    assert seen == [(0, 2, "step 1 (deposit)"), (1, 2, "step 2 (pattern)"), (2, 2, "checks")]


def test_ready_is_asked_before_the_first_step_and_may_stop_the_run() -> None:
    seen: list[str] = []

    def refuse(grid: Grid) -> None:
        raise RunError(f"{grid.nx} cells are too many")

    with pytest.raises(RunError, match="120 cells are too many"):
        run_flow(plate(), ready=refuse, progress=lambda done, total, text: seen.append(text))
    assert seen == []


def test_without_checks_nothing_is_found() -> None:
    """Half of 0.4 um of nitride is eaten while the glass over it is cleared: a warning, if it is asked for."""
    nitride = "deposit: {film: nitride, material: low-stress nitride, thickness: 0.4 um, method: lpcvd}"
    rates = "rates: {psg: 1 um/min, low-stress nitride: 0.2 um/min}"
    flow = of_steps(nitride, GLASS, f"etch: {{with: oxide rie, clears: glass, over: 100 %, {rates}}}")
    assert [f.code for f in run_flow(flow).record.findings] == ["film-attacked"]
    assert run_flow(flow, checks=False).record.findings == ()


def test_a_run_twice_gives_the_same_bits() -> None:
    first, second = (run_flow(plate(), until=6).wafer.stack for _ in range(2))
    for a, b in zip(first.films, second.films, strict=True):
        for name in ("top", "floor", "gone"):
            assert (getattr(a, name) is None) == (getattr(b, name) is None)
            assert getattr(a, name) is None or np.array_equal(getattr(a, name), getattr(b, name))


@pytest.mark.parametrize(
    ("bad", "says"),
    [
        ("etch: {with: oxide rie, depth: 0.1 um, rates: {silicon: 0 nm/min}}", r"11:36: step 2 \(etch\): depth: film"),
        ("etch: {with: oxide rie, time: 1 min}", r"11:5: step 2 \(etch\): no rate for film 'wafer'"),
    ],
)
def test_a_refusal_is_placed_at_its_setting_or_else_at_its_step(bad: str, says: str) -> None:
    """Silicon lies bare; it is not etched, or has no rate."""
    with pytest.raises(InputError, match=rf"flow\.yaml:{says}"):
        run_flow(of_steps("inspect:", bad))


def test_a_strip_of_what_is_buried_is_refused_at_its_film() -> None:
    poly = "deposit: {film: poly, material: polysilicon, thickness: 1 um, method: lpcvd}"
    with pytest.raises(InputError, match=r"flow\.yaml:12:12: step 3 \(strip\): film 'glass' is buried"):
        run_flow(of_steps(GLASS, poly, "strip: glass"))


def test_running_out_of_memory_in_a_step_says_what_helps(monkeypatch: pytest.MonkeyPatch) -> None:
    def full(*given: object) -> None:
        raise MemoryError

    kinds = {**step_kinds(), "inspect": replace(step_kinds()["inspect"], apply=full)}
    monkeypatch.setattr("flowemu.flow.flow.step_kinds", lambda: kinds)
    with pytest.raises(RunError, match=r"step 1 \(inspect\): out of memory; use a larger cell or a smaller window"):
        run_flow(of_steps("inspect:"))


def test_the_record_names_its_flow_masks_and_hashes() -> None:
    record = finished().record
    assert (record.flow, set(record.masks)) == ("Plate on a post", {"ANCHOR", "PLATE"})
    assert re.fullmatch("[0-9a-f]{64}", record.revision)
    assert re.fullmatch("[0-9a-f]{64}", record.masks_sha256)
    other = run_flow(flow_from(HEAD + STEPS.replace("60 %", "70 %") + PARTS), until=0)
    assert other.record.revision != record.revision
    assert other.record.masks_sha256 == record.masks_sha256
    less = run_flow(of_steps(GLASS), until=0)
    assert less.record.masks_sha256 != record.masks_sha256


def test_a_change_of_volume_counts_films_by_name_and_step() -> None:
    """4 columns: 1 um more of one film is 4 um3; the same name from another step is another film."""
    grid = stacks.even_grid(4, -3, 8)
    bare = stacks.bare(grid, 0.2)
    once = coat(bare, stacks.blank("film", step=1), 1.0)
    twice = coat(once, stacks.blank("film", step=2), 0.5)
    assert volume_change(once, once) == (0.0, 0.0)
    assert volume_change(bare, twice) == (0.0, pytest.approx(6.0, rel=1e-3))
    assert volume_change(twice, once) == (pytest.approx(2.0, rel=1e-3), 0.0)


def test_expectations_are_counted_at_the_end() -> None:
    """The plate is held, free and a micron thick; it is not captive and there is no glass below it."""
    assert finished().record.expectations == (3, 5)
    failed = [f for f in finished().record.findings if f.code == "expectation-failed"]
    assert {(f.part, f.film) for f in failed} == {("plate", None), (None, "glass")}
    assert EXPECT.count("- ") == 5
