"""The layout's facts against the flow: masks, window, places and the parts' names."""

from __future__ import annotations

from dataclasses import dataclass, field
from pathlib import Path

import pytest

from flowemu.errors import InputError, LayoutError
from flowemu.flow.drawn import drawn_faults, part_names, read_drawn, window_box
from tests.unit.flow.flows import GOOD, read


@dataclass
class Plain:
    """A layout as far as the flow looks at it."""

    cell: str = "die"
    box: tuple[float, float, float, float] | None = (-20.0, -20.0, 20.0, 20.0)
    layers: tuple[tuple[int, int], ...] = ((10, 0), (11, 0))
    texts: list[tuple[str, float, float]] = field(default_factory=list)

    def missing_layer(self, layer: int, datatype: int = 0) -> str | None:
        return None if (layer, datatype) in self.layers else f"layer {layer}/{datatype} is not there"

    def labels(self, layer: int, texttype: int = 0) -> list[tuple[str, float, float]]:
        return self.texts if layer == 60 else []


class NoCellError(LayoutError):
    """Stands for the layout's own error."""


def said(text: str, drawn: Plain, folder: Path) -> list[str]:
    return [str(fault).split("small.yaml:")[-1] for fault in drawn_faults(read(text, folder), drawn)]


def test_a_good_flow_has_no_fault(tmp_path: Path) -> None:
    assert said(GOOD, Plain(), tmp_path) == []


@pytest.mark.parametrize(
    ("good", "bad", "says"),
    [
        ("11/0", "12/0", "7:32: layout.masks.PLATE: layer 12/0 is not there"),
        ("[-10 um, -10 um, 10 um", "[30 um, -10 um, 40 um", "6:11: layout.window: it lies outside cell 'die', whose"),
        ("at: [0 um, 0 um]}}", "at: [0 um, 11 um]}}", "8:33: parts.plate.at: (0, 11) um lies outside the window"),
        ("at: [0 um, 0 um], at_l", "at: [0 um, -11 um], at_l", "expect[2].thickness.at: (0, -11) um lies outside"),
    ],
)
def test_a_slip_is_located(good: str, bad: str, says: str, tmp_path: Path) -> None:
    assert good in GOOD
    assert any(says in line for line in said(GOOD.replace(good, bad, 1), Plain(), tmp_path))


def test_the_cells_box_is_the_window_where_none_is_given(tmp_path: Path) -> None:
    text = GOOD.replace("  window: [-10 um, -10 um, 10 um, 10 um]\n", "")
    flow = read(text, tmp_path)
    assert window_box(flow, Plain()) == (-20.0, -20.0, 20.0, 20.0)
    assert drawn_faults(flow, Plain()) == []
    assert "cell 'die' is empty" in said(text, Plain(box=None), tmp_path)[0]
    assert "is smaller than the grid's cell of 0.5 um" in said(text, Plain(box=(0.0, 0.0, 0.2, 5.0)), tmp_path)[0]


def test_labels_name_parts_too(tmp_path: Path) -> None:
    text = GOOD.replace("  masks:", "  labels: 60/0\n  masks:").replace("frees: [plate]", "frees: [plate, beam]")
    labelled = Plain(texts=[("beam", 1.0, 1.0), ("pad", 2.0, 2.0)])
    assert part_names(read(text, tmp_path), labelled) == ["plate", "beam", "pad"]
    assert said(text, labelled, tmp_path) == []
    lines = said(text, Plain(texts=[("beams", 1.0, 1.0)]), tmp_path)
    expected = "23:35: step 11 (release): frees: there is no part 'beam' under parts or among the labels"
    assert lines == [f"{expected}; did you mean 'beams'?"]


def test_what_the_reader_says_is_placed_at_the_file_or_the_cell(tmp_path: Path) -> None:
    flow = read(GOOD, tmp_path)

    def broken(*asked: object) -> Plain:
        raise LayoutError("layout 'die.gds' is damaged")

    def other(*asked: object) -> Plain:
        raise NoCellError("there is no cell 'die'")

    with pytest.raises(InputError, match=r"small.yaml:4:9: layout.file: layout 'die.gds' is damaged"):
        read_drawn(flow, broken, NoCellError)
    with pytest.raises(InputError, match=r"small.yaml:5:9: layout.cell: there is no cell 'die'"):
        read_drawn(flow, other, NoCellError)


def test_the_reader_is_asked_for_the_masks(tmp_path: Path) -> None:
    flow, asked = read(GOOD, tmp_path), []

    def reader(*what: object) -> Plain:
        asked.append(what)
        return Plain()

    read_drawn(flow, reader, NoCellError)
    assert [(path, cell, list(pairs)) for path, cell, pairs in asked] == [(flow.layout_path, "die", [(10, 0), (11, 0)])]
