"""Whether a run fits this machine's memory, known before it starts."""

from __future__ import annotations

import os

from flowemu.errors import Fault, InputError
from flowemu.flow.flow import Flow
from flowemu.stack.grid import Grid

SHARE = 0.8  # of the machine's memory that a run may take
WORK = 14  # fields' worth of working arrays beside the films' own
FIELDS = 3  # a film's top, floor and gone field


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


def refuse_if_too_large(flow: Flow, grid: Grid) -> None:
    """Raise an InputError that names the cell which would fit, if the run would not."""
    have = SHARE * machine_memory()
    need = needed(grid.cells, most_films(flow))
    if need <= have and grid.cells < 2**31 - 1:
        return
    factor = max(need / have, grid.cells / (2**31 - 1))
    fits = float(f"{grid.cell * factor ** (1 / 3) * 1.02:.2g}")
    if fits < grid.cell * factor ** (1 / 3):
        fits = float(f"{fits * 1.06:.2g}")
    shape = " x ".join(str(n) for n in reversed(grid.shape))
    text = (
        f"grid.cell: {shape} = {grid.cells:,} cells need about {need / 2**30:.3g} GiB and this machine has "
        f"{machine_memory() / 2**30:.3g} GiB; a cell of {fits:g} um would fit, or a smaller window"
    )
    fault = flow.fault(("grid", "cell"), text)
    raise InputError([Fault(fault.file, fault.line, fault.column, text)])
