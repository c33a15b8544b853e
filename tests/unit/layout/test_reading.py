"""Reading GDSII and OASIS: features, units, what is asked for and what is said to be there."""

from __future__ import annotations

import hashlib
from pathlib import Path

import gdstk
import numpy as np
import pytest

from flowemu.errors import LayoutError
from flowemu.layout import Layout, MissingCell, MissingLayer, read_layout
from flowemu.layout.contours import signed_area
from tests.unit.layout.drawings import FORMATS, boxed, circle, gdsii, rich_library, save, square


def boxes(layout: Layout, layer: int, datatype: int) -> list[tuple[float, ...]]:
    """Bounds of each loop of a layer, sorted."""
    loops = layout.polygons(layer, datatype)
    return sorted(tuple(np.round([*p.min(axis=0), *p.max(axis=0)], 5).tolist()) for p in loops)


@pytest.mark.parametrize("ending", FORMATS)
def test_hierarchy_is_flattened(ending: str, tmp_path: Path) -> None:
    path = save(rich_library(), tmp_path, ending)
    layout = read_layout(path)
    assert (layout.cell, layout.cells, layout.top_cells) == ("top", ("plate", "top"), ("top",))
    assert layout.layers == {(3, 1): 8, (4, 0): 8}
    arrayed = [(x, y, x + 10.0, y + 5.0) for x in (0.0, 30.0, 60.0) for y in (100.0, 140.0)]
    # Mirrored about x, doubled, turned by 90 deg: (u, v) goes to (100 + 2 v, 2 u).
    assert boxes(layout, 3, 1) == sorted([(0.0, 0.0, 10.0, 5.0), (100.0, 0.0, 110.0, 20.0), *arrayed])
    assert (114.0, 0.0, 118.0, 40.0) in boxes(layout, 4, 0)
    assert layout.box == (0.0, 0.0, 118.0, 149.0)
    assert layout.sha256 == hashlib.sha256(path.read_bytes()).hexdigest()


@pytest.mark.parametrize("ending", FORMATS)
def test_labels_move_with_their_cells(ending: str, tmp_path: Path) -> None:
    layout = read_layout(save(rich_library(), tmp_path, ending))
    places = {(text, round(x, 6), round(y, 6)) for text, x, y in layout.labels(60, 2)}
    assert {("plate", 1.0, 2.0), ("plate", 104.0, 2.0), ("plate", 61.0, 142.0)} <= places
    assert len(layout.labels(60, 2)) == 8
    assert layout.labels(60, 0) == []


@pytest.mark.parametrize("ending", FORMATS)
@pytest.mark.parametrize(
    ("unit", "precision", "scale"),
    [(1e-6, 1e-9, 1.0), (1e-6, 5e-9, 1.0), (25.4e-6, 25.4e-6, 25.4), (1e-3, 1e-9, 1e3), (1e-9, 1e-9, 1e-3)],
)
def test_any_database_unit_comes_out_in_um(
    ending: str, unit: float, precision: float, scale: float, tmp_path: Path
) -> None:
    layout = read_layout(save(rich_library(unit, precision), tmp_path, ending), "plate")
    # Vertices are rounded to 1e-9 of the extent, at least 1e-6 um.
    assert np.allclose(boxes(layout, 3, 1), [[0, 0, 10 * scale, 5 * scale]], rtol=1e-8, atol=3e-6)
    _, x, y = layout.labels(60, 2)[0]
    assert (x, y) == pytest.approx((scale, 2 * scale))


def test_boxes_are_drawn_shapes(tmp_path: Path) -> None:
    path = tmp_path / "box.gds"
    path.write_bytes(gdsii(("CELL", boxed(5, 7, 1000, 2000))))
    layout = read_layout(path)
    assert boxes(layout, 5, 7) == [(0.0, 0.0, 1.0, 2.0)]


def test_oasis_circles_and_checksums(tmp_path: Path) -> None:
    library = gdstk.Library()
    library.new_cell("top").add(gdstk.Polygon(circle(0, 0, 10, 200), layer=1))
    library.write_oas(tmp_path / "c.oas", circle_tolerance=0.01, validation="crc32")
    (loop,) = read_layout(tmp_path / "c.oas").polygons(1)
    assert np.abs(np.hypot(*loop.T) - 10).max() < 0.01
    assert signed_area(loop) == pytest.approx(np.pi * 100, rel=2e-3)


def test_only_wanted_layers_are_merged(tmp_path: Path) -> None:
    path = save(rich_library(), tmp_path, "gds")
    layout = read_layout(path, wanted=[(3, 1), (9, 9)])
    assert set(layout.loops) == {(3, 1)}
    assert layout.layers == {(3, 1): 8, (4, 0): 8}
    with pytest.raises(MissingLayer, match=r"layer 4/0 was not read from 'die\.gds'"):
        layout.polygons(4)
    assert read_layout(path, wanted=()).loops == {}


def test_a_missing_layer_says_what_there_is(tmp_path: Path) -> None:
    layout = read_layout(save(rich_library(), tmp_path, "gds"))
    assert layout.missing_layer(3, 1) is None
    text = "layer 3/0 is not in cell 'top' of 'die.gds'; it has 3/1, 4/0; did you mean 3/1?"
    assert layout.missing_layer(3, 0) == text
    with pytest.raises(MissingLayer, match="layer 8/0"):
        layout.mask("METAL", 8)


def test_a_missing_cell_says_what_there_is(tmp_path: Path) -> None:
    path = save(rich_library(), tmp_path, "gds")
    with pytest.raises(MissingCell, match="no cell 'plat'; it has plate, top; did you mean 'plate'"):
        read_layout(path, "plat")


def test_one_of_several_top_cells_must_be_named(tmp_path: Path) -> None:
    library = rich_library()
    library.new_cell("lid")
    path = save(library, tmp_path, "gds")
    with pytest.raises(MissingCell, match="has 2 top cells, so one must be named: lid, top"):
        read_layout(path)
    empty = read_layout(path, "lid")
    assert (empty.box, empty.layers, empty.loops) == (None, {}, {})
    assert empty.missing_layer(1, 0) == "layer 1/0 is not in cell 'lid', which is empty"


def test_shapes_without_area_are_dropped(tmp_path: Path) -> None:
    library = gdstk.Library()
    line = np.array([[0.0, 0.0], [5.0, 0.0], [2.0, 0.0]])
    library.new_cell("top").add(gdstk.Polygon(line, layer=1), gdstk.Polygon(square(0, 0, 1, 1), layer=2))
    layout = read_layout(save(library, tmp_path, "gds"))
    assert layout.polygons(1) == []
    assert len(layout.polygons(2)) == 1


def test_a_missing_file(tmp_path: Path) -> None:
    with pytest.raises(LayoutError, match="is not there"):
        read_layout(tmp_path / "none.gds")
    with pytest.raises(LayoutError, match="cannot be opened"):
        read_layout(tmp_path)
