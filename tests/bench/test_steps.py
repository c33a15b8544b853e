"""What every step costs, in units of one exact distance transform of the same solid.

    python -m pytest -s -m long tests/bench/test_steps.py

The flow is a rotor of 24 steps on 240 x 240 x 100 cells, made here. It runs once to compile, then once more with every
step timed; the unit E is the least of five `scipy.ndimage.distance_transform_edt` of the final solid, taken between
the steps. The table is printed; no step may cost more than two units, the release more than three, which is
above its aim of two.
"""

from __future__ import annotations

from pathlib import Path
from time import perf_counter

import gdstk
import numpy as np
import pytest
from scipy.ndimage import distance_transform_edt

from flowemu.engine.planes import make_grid
from flowemu.engine.run import _tools, _wafer_material
from flowemu.engine.tools import Tools
from flowemu.flow.drawn import read_drawn, window_box
from flowemu.flow.load import load_flow
from flowemu.layout import MissingCell, read_layout
from flowemu.stack.stack import FilmStack
from flowemu.stack.wafer import Wafer

MOST = 2.0
MOST_RELEASE = 3.0
FLOW = """
flow: Benchmark rotor
layout: {{file: bench.gds, window: [-48 um, -48 um, 48 um, 48 um],
  masks: {{DIMPLE: 10/0, PIN: 11/0, ROTOR: 12/0, CAP: 13/0, PAD: 14/0}}}}
parts: {{rotor: {{film: poly1, at: [13 um, 0 um]}}, pin: {{film: poly2, at: [0 um, 0 um]}}}}
wafer: {{material: silicon, depth: 4 um}}
grid: {{cell: 0.4 um, planes: [{planes}]}}
steps:
  - deposit: {{film: isolation, material: low-stress nitride, thickness: 0.6 um, method: lpcvd}}
  - deposit: {{film: poly0, material: polysilicon, state: n+, thickness: 0.5 um, method: lpcvd}}
  - pattern: {{mask: PAD, keep: drawn, resist: 1.5 um, align: bare}}
  - etch: {{with: poly rie, clears: poly0, over: 15 %}}
  - strip: resist
  - deposit: {{film: glass1, material: psg, thickness: 2 um, method: lpcvd, coverage: 60 %}}
  - pattern: {{mask: DIMPLE, open: drawn, resist: 1.6 um, align: bare}}
  - etch: {{with: oxide rie, depth: 1 um}}
  - strip: resist
  - deposit: {{film: poly1, material: polysilicon, state: n+, thickness: 2 um, method: lpcvd}}
  - pattern: {{mask: ROTOR, keep: drawn, resist: 3 um, align: DIMPLE}}
  - etch: {{with: poly rie, clears: poly1, over: 40 %, rates: {{psg: 2 nm/min}}}}
  - strip: resist
  - deposit: {{film: glass2, material: psg, thickness: 1 um, method: lpcvd, coverage: 60 %}}
  - pattern: {{mask: PIN, open: drawn, resist: 5 um, align: ROTOR}}
  - etch: {{with: oxide rie, clears: [glass2, glass1], over: 15 %, rates: {{silicon: 100 nm/min}}}}
  - strip: resist
  - deposit: {{film: poly2, material: polysilicon, state: n+, thickness: 1.6 um, method: lpcvd}}
  - anneal: {{temperature: 1050 degC, time: 60 min}}
  - pattern: {{mask: CAP, keep: drawn, resist: 6 um, align: PIN}}
  - etch: {{with: poly rie, clears: poly2, over: 160 %, rates: {{psg: 2 nm/min}}}}
  - strip: resist
  - inspect:
  - release: {{with: hf 49, frees: [rotor], over: 50 %, dry: critical point}}
"""


def draw(path: Path) -> None:
    """A wheel with windows and dimples on a flanged pin, and a pad under it."""
    cell = gdstk.Cell("bench")
    wheel = gdstk.ellipse((0, 0), 40, tolerance=0.01)
    holes = [gdstk.ellipse((27 * np.cos(a), 27 * np.sin(a)), 5, tolerance=0.01) for a in np.arange(8) * np.pi / 4]
    holes.append(gdstk.ellipse((0, 0), 8, tolerance=0.01))
    cell.add(*gdstk.boolean(wheel, holes, "not", layer=12))
    for a in np.arange(6) * np.pi / 3 + 0.2:
        cell.add(gdstk.ellipse((16 * np.cos(a), 16 * np.sin(a)), 1.5, layer=10))
    cell.add(gdstk.ellipse((0, 0), 4, layer=11, tolerance=0.01), gdstk.ellipse((0, 0), 11, layer=13, tolerance=0.01))
    cell.add(gdstk.ellipse((0, 0), 44, layer=14, tolerance=0.01))
    library = gdstk.Library("bench")
    library.add(cell)
    library.write_gds(path)


def timed_run(flow, tools, grid) -> tuple[list[tuple[str, float]], Wafer]:
    """Every step's verb and seconds, and the wafer at the end."""
    wafer = Wafer(FilmStack.bare(grid, *_wafer_material(flow, tools)))
    rows = []
    for step in flow.steps:
        began = perf_counter()
        wafer = step.kind.apply(wafer, step.settings, tools.at(step.index, step.verb))
        rows.append((f"{step.index} {step.verb}", perf_counter() - began))
    return rows, wafer


@pytest.mark.long
def test_no_step_costs_more_than_two_distance_transforms(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    draw(tmp_path / "bench.gds")
    planes = ", ".join(f"{z:.4g} um" for z in np.linspace(-4, 21, 101))
    (tmp_path / "bench.yaml").write_text(FLOW.format(planes=planes))
    flow = load_flow(str(tmp_path / "bench.yaml"), ())
    layout = read_drawn(flow, read_layout, MissingCell)
    tools = _tools(flow, layout)
    grid, _ = make_grid(flow, window_box(flow, layout), flow.grid.cell, tools)
    assert grid.shape == (100, 240, 240)
    tools = Tools(flow, tools.data, layout, tools.places, grid)
    timed_run(flow, tools, grid)
    best: dict[str, float] = {}
    unit = float("inf")
    for _ in range(3):
        rows, wafer = timed_run(flow, tools, grid)
        for name, seconds in rows:
            best[name] = min(best.get(name, np.inf), seconds)
        solid = wafer.stack.topology.code >= 0
        for _ in range(2):
            began = perf_counter()
            distance_transform_edt(solid)
            unit = min(unit, perf_counter() - began)
    with capsys.disabled():
        print(f"\nE = {unit:.3f} s on {grid.cells:,} cells; the flow {sum(best.values()) / unit:.1f} E")
        for name, seconds in best.items():
            print(f"  {name:<12} {seconds:7.3f} s  {seconds / unit:5.2f} E")
    cost = {name: round(seconds / unit, 2) for name, seconds in best.items()}
    slow = {name: e for name, e in cost.items() if e > (MOST_RELEASE if "release" in name else MOST)}
    assert not slow
