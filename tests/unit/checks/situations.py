"""Wafers with events written by hand, for the checks: a real flow, a real view, and nothing that was run.

The flow's steps: 1 deposit glass, 2 pattern ANCHOR, 3 etch oxide rie, 4 strip, 5 deposit poly, 6 anneal, 7 pattern
PLATE, 8 etch poly rie, 9 strip, 10 inspect, 11 release hf 49, which frees the part `plate`.
"""

from __future__ import annotations

import tempfile
from collections.abc import Callable
from functools import cache
from pathlib import Path
from typing import Any

import numpy as np

from flowemu.engine.view import View
from flowemu.findings import Finding
from flowemu.flow.flow import Flow
from flowemu.registry import checks
from flowemu.stack.wafer import Cut, Event, Laid, Loosened, Loss, Printed, Wafer
from tests import stacks
from tests.unit.flow.flows import GOOD, read

RELEASE = 11
BOX = (5.0, 5.0, 2.0, 9.0, 9.0, 4.0)
COLUMNS = np.zeros((16, 16), bool)
COLUMNS[5:9, 5:9] = True
OUTLINE = np.array([(x, y) for x in np.arange(5.0, 9.5, 0.5) for y in np.arange(5.0, 9.5, 0.5) if {x, y} & {5.0, 9.0}])


@cache
def flow(limits: str = "", expect: str | None = None) -> Flow:
    """The small flow, with limits or other expectations."""
    text = GOOD if expect is None else GOOD[: GOOD.index("expect:")] + expect
    return read(text + limits, Path(tempfile.mkdtemp(prefix="checks-")))


def view(*events: Event, of: Flow | None = None, parts: tuple[Any, ...] = (), ended: bool = True) -> View:
    """What a check may look at after these events; the wafer itself is bare, 16 x 16 cells of 1 um from (0, 0)."""
    stack = stacks.bare(stacks.even_grid(16, -3, 5, ny=16))
    return View(of or flow(), None, None, Wafer(stack, events=events), RELEASE, ended, parts)  # type: ignore[arg-type]


def found(name: str, seen: View) -> list[Finding]:
    """What one check says."""
    return list(checks()[name].run(seen))


def saying(name: str) -> Callable[..., list[Finding]]:
    """A check of this name, asked about events; further arguments as for `view`."""
    return lambda *events, **given: found(name, view(*events, **given))


def loss(film: str = "nitride", **changed: Any) -> Loss:
    """30 nm of a film of 0.5 um, not meant, in 60 s."""
    usual: dict[str, Any] = {
        "material": "low-stress nitride", "rate": 0.0005, "depth": 0.030, "thickness": 0.5, "volume": 3.0,
        "meant": False, "through": False, "at": (3.5, 4.5, 0.6),
    }  # fmt: skip
    return Loss(film, **{**usual, **changed})


def cut(*losses: Loss, step: int = 8, verb: str = "etch", mask: str | None = None, **changed: Any) -> Cut:
    """An etch of 60 s with what it took."""
    agent = {3: "oxide rie", 8: "poly rie", 11: "hf 49"}.get(step, verb)
    return Cut(step, verb, agent, 60.0, mask, losses, **changed)


def loosened(part: str = "plate", state: str = "adrift", **changed: Any) -> Loosened:
    """A body of the film poly, 4 x 4 um about (7, 7), found loose in the release."""
    usual: dict[str, Any] = {
        "films": ("poly",), "volume": 32.0, "box": BOX, "play": (None,) * 6, "searched": "it can leave straight up",
        "columns": COLUMNS, "outline": OUTLINE,
    }  # fmt: skip
    return Loosened(RELEASE, part, state=state, **{**usual, **changed})


def laid(under: str = "glass", step: int = 5) -> Laid:
    """Poly put down on this film everywhere."""
    names = ("wafer", "glass", "nitride")
    return Laid(step, "poly", np.full((16, 16), names.index(under)), names)


def printed(x: float, step: int = 2, mask: str = "ANCHOR") -> Printed:
    """A mask that opens the strip of 2 um about this x."""
    opened = 1.0 - np.abs(np.arange(16) + 0.5 - x)
    return Printed(step, mask, np.broadcast_to(opened, (16, 16)))
