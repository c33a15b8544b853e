"""The dry run of heights: planes a cell apart where films can be, wider elsewhere, and the window in whole cells."""

from __future__ import annotations

from types import SimpleNamespace

import numpy as np
import pytest

from flowemu.engine.planes import ABOVE, MARGIN, Profile, dry_run_planes, make_grid
from flowemu.engine.tools import Tools
from flowemu.errors import InputError
from flowemu.flow.flow import Flow
from flowemu.flow.process import load_process_data
from flowemu.stack.grid import MAX_SPACING_RATIO
from tests.unit.engine.runs import HEAD, of_steps, plate

GLASS = "deposit: {film: glass, material: psg, thickness: 2 um, method: lpcvd, coverage: 60 %}"
PATTERN = "pattern: {mask: ANCHOR, open: drawn, resist: 4 um, align: bare}"
WITHOUT_DEPTH = HEAD.replace("wafer: {depth: 3 um}\n", "")


def tools(flow: Flow) -> Tools:
    return Tools(flow, load_process_data(None), None, {})  # type: ignore[arg-type]


def planes(*steps: str, head: str = HEAD, cell: float = 0.5) -> np.ndarray:
    flow = of_steps(*steps, head=head)
    return dry_run_planes(flow, cell, tools(flow))


def profile(*steps: str) -> Profile:
    flow = of_steps(*steps, head=WITHOUT_DEPTH)
    out = Profile()
    for step in flow.steps:
        out = step.kind.heights(out, step.settings, tools(flow))
    return out


def test_films_and_resist_add_up() -> None:
    """2 um of glass and 1 um of poly; the resist's top, 4 um above the glass, is the highest."""
    poly = "deposit: {film: poly, material: polysilicon, thickness: 1 um, method: lpcvd}"
    strip, polish, inspect = "strip: resist", "polish: {depth: 0.1 um}", "inspect:"
    anneal = "anneal: {temperature: 1050 degC, time: 60 min}"
    assert profile(GLASS, PATTERN, strip, poly, polish, anneal, inspect) == Profile(low=0.0, high=3.0, peak=6.0)


@pytest.mark.parametrize(
    ("amount", "low"),
    [
        ("depth: 0.9 um", -0.9),
        ("time: 2 min", -0.6),
        ("clears: glass, over: 50 %", -2 * 0.5 * 0.3 / 0.5),
        ("until: glass, over: 50 %", -2 * 0.5 * 0.3 / 0.5),
    ],
)
def test_an_etch_reaches_into_the_wafer(amount: str, low: float) -> None:
    """Silicon at 0.3 um/min: for a time or a depth all of it, for a film of 0.5 um/min its overetch's share."""
    rates = "rates: {silicon: 0.3 um/min, psg: 0.5 um/min}"
    assert profile(GLASS, f"etch: {{with: oxide rie, {amount}, {rates}}}").low == pytest.approx(low)


def test_an_etch_that_leaves_silicon_alone_reaches_nowhere() -> None:
    assert profile(GLASS, "etch: {with: hf 49, time: 100 min}").low == 0.0


@pytest.mark.parametrize("cell", [0.25, 0.5, 1.0])
def test_planes_are_a_cell_apart_where_films_can_be(cell: float) -> None:
    """From two cells under the deepest cut to two above the highest film, and never two neighbours beyond 1.3."""
    found = planes(GLASS, PATTERN, "etch: {with: oxide rie, depth: 0.9 um, rates: {silicon: 0.3 um/min}}", cell=cell)
    gaps = np.diff(found)
    middle = (found[:-1] >= -0.9 - 2 * cell) & (found[1:] <= 2.0 + 2 * cell)
    assert gaps[middle] == pytest.approx(cell)
    assert np.maximum(gaps[1:] / gaps[:-1], gaps[:-1] / gaps[1:]).max() <= MAX_SPACING_RATIO + 1e-9
    assert gaps.min() >= cell * (1 - 1e-9)
    assert gaps.max() <= 4 * cell * (1 + 1e-9)


def test_zero_is_a_plane_so_that_the_wafers_face_lies_between_samples() -> None:
    assert np.abs(planes(GLASS)).min() < 1e-12


def test_there_are_open_cells_above_the_highest_resist_and_wafer_below() -> None:
    found = planes(GLASS, PATTERN)
    assert found[-1] >= 6.0 + ABOVE * 0.5
    assert found[0] <= -3.0 + 1e-9
    deep = planes(GLASS, "etch: {with: oxide rie, depth: 5 um, rates: {silicon: 1 um/min}}", head=WITHOUT_DEPTH)
    assert deep[0] <= -5.0 - MARGIN + 1e-9


def test_a_window_grows_to_whole_cells_about_its_middle_and_says_so() -> None:
    grid, said = make_grid(plate(), (-30.0, 0.0, 30.0, 0.5), 0.5, tools(plate()))
    assert (grid.shape[1:], said, grid.box) == ((1, 120), [], (-30.0, 0.0, 30.0, 0.5))
    grid, said = make_grid(plate(), (-1.0, 0.0, 0.2, 0.7), 0.5, tools(plate()))
    assert grid.shape[1:] == (2, 3)
    assert grid.box == pytest.approx((-1.15, -0.15, 0.35, 0.85))
    assert said == ["the window grew outward to whole cells, 1.5 x 1 um"]


def test_a_window_smaller_than_a_cell_is_refused() -> None:
    with pytest.raises(InputError, match=r"the window of 0\.3 x 4 um is smaller than the grid's cell of 0\.5 um"):
        make_grid(plate(), (0.0, 0.0, 0.3, 4.0), 0.5, tools(plate()))


@pytest.mark.parametrize(
    ("given", "says"),
    [
        ("[0 um, 1 um]", "expected at least three heights, each above the one before"),
        ("[0 um, 1 um, 2 um, 3.5 um]", "neighbour spacings 1 um and 1.5 um differ by more than a factor 1.3"),
    ],
)
def test_own_planes_that_no_grid_can_have_are_refused(given: str, says: str) -> None:
    flow = of_steps(GLASS, head=HEAD.replace("cell: 0.5 um", f"cell: 0.5 um, planes: {given}"))
    with pytest.raises(InputError, match=says):
        make_grid(flow, (0.0, 0.0, 4.0, 0.5), 0.5, tools(flow))


def test_own_planes_are_taken_as_they_are() -> None:
    head = HEAD.replace("cell: 0.5 um", "cell: 0.5 um, planes: [-2 um, -1 um, 0 um, 1.2 um, 2.2 um]")
    flow = of_steps(GLASS, head=head)
    grid, _ = make_grid(flow, (0.0, 0.0, 4.0, 0.5), 0.5, tools(flow))
    assert grid.planes.tolist() == [-2.0, -1.0, 0.0, 1.2, 2.2]


def test_the_profile_never_sinks_by_a_film() -> None:
    low = Profile().raised(2.0).covered(1.0).raised(0.5)
    assert (low.low, low.high, low.peak) == (0.0, 2.5, 3.0)
    nothing = SimpleNamespace(wafer_rate=lambda settings: 0.0)
    assert low.cut(None, nothing) is low
