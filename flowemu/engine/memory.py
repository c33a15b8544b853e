"""Whether a run fits this machine's memory, known before it starts."""

from __future__ import annotations

import os
from collections.abc import Callable

from flowemu.errors import InputError
from flowemu.flow.flow import Flow
from flowemu.stack.grid import Grid

SHARE = 0.8  # of the machine's memory that a run may take
WORK = 14  # fields' worth of working arrays beside the films' own
FIELDS = 3  # a film's top, floor and gone field
MOST_CELLS = 2**31 - 1


def machine_memory() -> int:
    """Memory of this machine, or of the container it is, bytes."""
    limits = [os.sysconf("SC_PAGE_SIZE") * os.sysconf("SC_PHYS_PAGES")]
    try:
        with open("/sys/fs/cgroup/memory.max", encoding="ascii") as file:
            text = file.read().strip()
        if text.isdecimal():
            limits.append(int(text))
    except OSError:
        pass
    return min(limits)


def most_films(flow: Flow) -> int:
    """The most films that the flow ever has on the wafer at once, itself included."""
    films, most = ["wafer"], 1
    for step in flow.steps:
        if step.verb == "deposit":
            films.append(step.settings.film)
        elif step.verb == "pattern":
            films.append("resist")
        elif step.verb == "strip" and step.settings.film in films:
            films = [film for film in films if film != step.settings.film]
        most = max(most, len(films))
    return most


def needed(cells: int, films: int) -> int:
    """Estimated peak memory of a run, bytes."""
    return 4 * cells * (FIELDS * films + WORK)


def fits(grid: Grid, films: int) -> bool:
    """Whether a run on this grid fits this machine."""
    return needed(grid.cells, films) <= SHARE * machine_memory() and grid.cells <= MOST_CELLS


def refuse_if_too_large(flow: Flow, grid: Grid, grid_of: Callable[[float], Grid]) -> None:
    """Raise an InputError that names the cell which would fit, if the run would not.

    `grid_of` makes the flow's grid for another cell, um, or raises an InputError.
    """
    films = most_films(flow)
    if fits(grid, films):
        return
    shape = " x ".join(str(n) for n in reversed(grid.shape))
    need, have = needed(grid.cells, films) / 2**30, machine_memory() / 2**30
    cell = fitting_cell(grid, films, grid_of)
    advice = f"a cell of {cell:g} um would fit, or a smaller window" if cell else "only a smaller window would fit"
    text = f"{shape} = {grid.cells:,} cells need about {need:,.3g} GiB and this machine has {have:.3g} GiB; {advice}"
    raise InputError([flow.fault(("grid", "cell"), f"grid.cell: {text}")])


def fitting_cell(grid: Grid, films: int, grid_of: Callable[[float], Grid]) -> float | None:
    """A cell, um, to two digits, on which the run fits; None where the window is smaller than that."""
    share = needed(grid.cells, films) / (SHARE * machine_memory())
    cell = float(f"{grid.cell * max(share, grid.cells / MOST_CELLS) ** (1 / 3):.2g}")
    try:
        while not fits(grid_of(cell), films):
            cell = float(f"{cell * 1.06:.2g}")
    except InputError:
        return None
    return cell
