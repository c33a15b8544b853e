"""A small real flow on a real layout, one cell wide, for the tests of the engine."""

from __future__ import annotations

import tempfile
from functools import cache
from pathlib import Path

from flowemu.engine.run import Run, run_flow
from flowemu.flow.flow import Flow
from flowemu.flow.load import load_flow
from tests.messages.cases import draw_layouts

PARTS = "parts: {plate: {film: poly, at: [10 um, 0.25 um]}}\n"
HEAD = """\
flow: Plate on a post
layout:
  file: die.gds
  cell: die
  window: [-30 um, 0 um, 30 um, 0.5 um]
  masks: {ANCHOR: 10/0, PLATE: 11/0}
wafer: {depth: 3 um}
grid: {cell: 0.5 um}
steps:
"""
STEPS = """\
  - deposit: {film: glass, material: psg, thickness: 1 um, method: lpcvd, coverage: 60 %}
  - pattern: {mask: ANCHOR, open: drawn, resist: 2 um, align: bare}
  - etch: {with: oxide rie, clears: glass, over: 10 %, rates: {silicon: 0 nm/min}}
  - strip: resist
  - inspect: {name: half way}
  - deposit: {film: poly, material: polysilicon, state: n+, thickness: 1 um, method: lpcvd, name: plate film}
  - pattern: {mask: PLATE, keep: drawn, resist: 2 um, align: ANCHOR}
  - etch: {with: poly rie, clears: poly, over: 20 %, rates: {psg: 2 nm/min}}
  - strip: resist
  - release: {with: hf 10:1, frees: [plate], over: 20 %, dry: critical point, rates: {silicon: 0 nm/min}}
"""
EXPECT = """\
expect:
  - held: {part: plate}
  - captive: {part: plate}
  - free: {part: plate}
  - thickness: {film: poly, at: [10 um, 0.25 um], at_least: 0.95 um, at_most: 1.05 um}
  - thickness: {film: glass, at: [10 um, 0.25 um], at_least: 0.5 um}
"""


def flow_from(text: str) -> Flow:
    """The flow in a text, in a folder of its own with the layout `die.gds`."""
    folder = Path(tempfile.mkdtemp(prefix="engine-"))
    (folder / "pyproject.toml").write_text("")
    draw_layouts(folder)
    (folder / "flow.yaml").write_text(text)
    return load_flow(str(folder / "flow.yaml"), ())


def of_steps(*steps: str, head: str = HEAD) -> Flow:
    """A flow of these steps, each `verb: {...}`."""
    return flow_from(head + "".join(f"  - {step}\n" for step in steps))


@cache
def plate() -> Flow:
    """A plate on a post, released."""
    return flow_from(HEAD + STEPS + PARTS + EXPECT)


@cache
def finished() -> Run:
    """The same, run to its end with two structures kept."""
    return run_flow(plate(), keep=(0, 3))
