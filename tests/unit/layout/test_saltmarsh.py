"""The demonstration die: drawn by its script, wide enough everywhere, twins that differ in one shape."""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

import numpy as np
import pytest

from flowemu.layout import read_layout, thin_places
from flowemu.layout.contours import signed_area
from tests.unit.layout.nearest import nearest

LAYOUTS = Path(__file__).parents[3] / "layouts"
DIE = LAYOUTS / "saltmarsh.gds"


def test_the_script_draws_the_file_to_the_byte(tmp_path: Path) -> None:
    target = tmp_path / "again.gds"
    subprocess.run([sys.executable, str(LAYOUTS / "draw_saltmarsh.py"), str(target)], check=True)
    assert target.read_bytes() == DIE.read_bytes()


def test_every_device_stands_under_one_top_cell() -> None:
    layout = read_layout(DIE, wanted=())
    assert layout.top_cells == ("saltmarsh",)
    assert {"comb", "comb_unanchored", "rotor"} <= set(layout.cells)


@pytest.mark.parametrize("device", ["rotor", "comb", "comb_unanchored"])
def test_no_line_or_space_is_under_four_cells_of_half_a_micrometre(device: str) -> None:
    layout = read_layout(DIE, device)
    thin = [place for loops in layout.loops.values() for place in thin_places(loops, 1.99)]
    assert thin == []


def test_the_twin_lacks_one_anchor_opening_and_nothing_else() -> None:
    good, bad = read_layout(DIE, "comb"), read_layout(DIE, "comb_unanchored")
    for pair in set(good.layers) - {(22, 0)}:
        assert all(map(np.array_equal, good.polygons(*pair), bad.polygons(*pair)))
    openings = sum(map(signed_area, good.polygons(22))) - sum(map(signed_area, bad.polygons(22)))
    assert openings == pytest.approx(4 * 28)
    assert good.texts == bad.texts


def test_the_distance_that_the_twins_flow_states() -> None:
    """From the right comb's fingertip (38, 13) to the opening's corner (15, 14): sqrt(23^2 + 1)."""
    bad = read_layout(DIE, "comb_unanchored")
    comb = next(loop for loop in bad.polygons(23) if loop[:, 0].max() == pytest.approx(60))
    distance, place = nearest(bad.polygons(22), comb)
    assert distance == pytest.approx(np.hypot(23, 1), abs=1e-4)
    assert place == pytest.approx((15, 14), abs=1e-4)


def test_the_sizes_that_the_flows_calculate_with() -> None:
    rotor = read_layout(DIE, "rotor")
    bore = min(rotor.polygons(12), key=lambda loop: float(np.hypot(*loop.T).max()))
    radii = [float(np.hypot(*loop.T).max()) for loop in (bore, *rotor.polygons(11), *rotor.polygons(13))]
    assert radii == pytest.approx([8, 4, 11], abs=1e-3)
    assert {text for text, _, _ in rotor.labels(60)} == {"rotor", "pin"}
