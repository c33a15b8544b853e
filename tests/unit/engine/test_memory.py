"""A run that does not fit this machine is refused before it starts, with the cell that would."""

from __future__ import annotations

import re

import numpy as np
import pytest

from flowemu.engine import memory
from flowemu.engine.run import run_flow
from flowemu.errors import Fault, InputError
from flowemu.stack.grid import Grid
from tests.unit.engine.runs import finished, of_steps, plate

GIB = 2**30


def grid_of(cell: float) -> Grid:
    """A cube of 64 um in cells of this size."""
    n = round(64 / cell)
    if n < 2:
        raise InputError([Fault(None, None, None, "the window is smaller than the cell")])
    return Grid(0.0, 0.0, cell, n, n, np.linspace(0, 64, n + 1))


@pytest.fixture
def machine(monkeypatch: pytest.MonkeyPatch) -> None:
    """A machine of 1 GiB."""
    monkeypatch.setattr(memory, "machine_memory", lambda: GIB)


def test_films_are_counted_at_their_most() -> None:
    """Wafer, glass, resist at step 2; the first resist is gone when poly and the second one come: four."""
    assert memory.most_films(plate()) == 4
    assert memory.most_films(of_steps("inspect:")) == 1


def test_memory_grows_with_cells_and_films() -> None:
    """Four bytes a cell for three fields a film and some fields of work."""
    assert memory.needed(1000, 5) == 4 * 1000 * (3 * 5 + memory.WORK)
    assert memory.needed(2000, 5) == 2 * memory.needed(1000, 5)


def test_a_grid_that_fits_is_let_through(machine: None) -> None:
    memory.refuse_if_too_large(plate(), grid_of(0.5), grid_of)


def test_a_grid_that_does_not_is_refused_with_one_that_does(machine: None) -> None:
    """4 films need 104 bytes a cell; 0.8 GiB hold 8.3 million cells: 202 a side, 0.32 um."""
    with pytest.raises(InputError) as error:
        memory.refuse_if_too_large(plate(), grid_of(0.25), grid_of)
    text = str(error.value)
    assert "256 x 256 x 256 = 16,777,216 cells need about 1.62 GiB and this machine has 1 GiB" in text
    found = re.search(r"a cell of ([0-9.]+) um would fit, or a smaller window", text)
    assert found is not None
    cell = float(found.group(1))
    assert memory.fits(grid_of(cell), 4)
    assert 0.3 < cell < 0.36


def test_where_no_cell_helps_only_a_smaller_window_is_named(
    machine: None, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(memory, "machine_memory", lambda: 100)
    with pytest.raises(InputError, match="only a smaller window would fit"):
        memory.refuse_if_too_large(plate(), grid_of(4.0), grid_of)


def test_more_cells_than_can_be_numbered_never_fit(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(memory, "machine_memory", lambda: 2**60)
    assert not memory.fits(Grid(0.0, 0.0, 1.0, 2**16, 2**15, np.arange(2.0)), 1)


def test_a_run_is_refused_before_its_first_step(monkeypatch: pytest.MonkeyPatch) -> None:
    seen: list[str] = []
    monkeypatch.setattr(memory, "machine_memory", lambda: 1000)
    with pytest.raises(InputError, match=r"flow.yaml:8:14: grid.cell: .* cells need about"):
        run_flow(plate(), progress=lambda done, total, text: seen.append(text))
    assert seen == []


def test_the_machine_has_memory_and_the_test_flow_fits_it() -> None:
    assert memory.machine_memory() > GIB / 4
    assert memory.fits(finished().record.grid, 4)
