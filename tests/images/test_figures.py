"""Section figures: the same bytes for the same section, valid files, and what they must show."""

from __future__ import annotations

import re
from xml.etree import ElementTree

import numpy as np
import pytest

from flowemu.findings import Finding
from flowemu.output.figure import draw_section, save_figure
from flowemu.output.frame import frame_of, round_length
from flowemu.output.labels import spread
from flowemu.output.marks import findings_near
from flowemu.output.section import section_polygons
from flowemu.stack.film import Film
from flowemu.stack.stack import FilmStack

LINE = [(-30.0, 0.0), (30.0, 0.0)]
LOST = Finding("missing-anchor", "error", 14, "poly", "plate", (-2.0, 0.5, 2.6), "plate is adrift.", "It lay on glass.")
FAR = Finding("film-attacked", "warning", 14, "wafer", None, (0.0, 12.0, 0.0), "wafer is attacked.", "")


@pytest.fixture(scope="module")
def section(bridge_stack):
    return section_polygons(bridge_stack, LINE)


def drawn(section, masks, **changes):
    return draw_section(section, "Bridge", "after step 14: release", masks, findings=[LOST, FAR], **changes)


def pixels(figure) -> np.ndarray:
    """The drawn figure, `(height, width, 3)` uint8."""
    from matplotlib.backends.backend_agg import FigureCanvasAgg

    canvas = FigureCanvasAgg(figure)
    canvas.draw()
    return np.asarray(canvas.buffer_rgba())[..., :3]


def test_files_are_valid_and_the_same_every_time(section, bridge_masks, tmp_path) -> None:
    first = save_figure(drawn(section, bridge_masks), tmp_path / "one")
    second = save_figure(drawn(section, bridge_masks), tmp_path / "two")
    assert [path.suffix for path in first] == [".svg", ".pdf", ".png"]
    for a, b in zip(first, second, strict=True):
        assert a.read_bytes() == b.read_bytes(), a.suffix
    assert ElementTree.fromstring(first[0].read_text()).tag.endswith("svg")
    assert first[1].read_bytes().startswith(b"%PDF-")
    assert first[2].read_bytes().startswith(b"\x89PNG")
    assert not re.search(rb"<dc:date>|CreationDate|tIME", b"".join(path.read_bytes() for path in first))


def test_texts_name_all_that_a_review_asks_for(section, bridge_masks) -> None:
    figure = drawn(section, bridge_masks)
    texts = [text.get_text() for text in figure.findobj(lambda artist: hasattr(artist, "get_text"))]
    said = "\n".join(texts)
    for wanted in (
        "Bridge",
        "after step 14: release",
        "(-30, 0) to (30, 0) µm",
        "vertical ×2",
        "5 µm",
        "isolation: low-stress nitride",
        "mirror: gold",
        "error missing-anchor: plate is adrift.",
    ):
        assert wanted in said
    assert "film-attacked" not in said


def test_bulk_wafer_is_cropped_and_all_films_shown(section) -> None:
    """The pit's floor is at -3.535 um, the wafer is modelled down to -6, the mirror ends at 4.465."""
    frame = frame_of(section)
    assert -6.0 < frame.bottom < -4.0
    assert 4.5 < frame.top < 6.0


def test_thin_film_shows_as_a_line_of_its_own_hue(section) -> None:
    """The nitride of 0.05 um is green: along its whole length a column of pixels has a green one."""
    figure = draw_section(section, "Bridge")
    image = pixels(figure).astype(int)
    axes = figure.axes[0]
    height = image.shape[0]
    for along in (1.0, 27.0, 40.0, 59.0):
        x, y = axes.transData.transform((along, -0.01))
        column = image[height - int(y) - 12 : height - int(y) + 12, int(x)]
        assert (column[:, 1] - np.maximum(column[:, 0], column[:, 2])).max() > 25, along


def test_no_paper_shows_between_films(section) -> None:
    """Inside the solid, away from the voids, no pixel is nearly white."""
    figure = draw_section(section, "Bridge", stretch=2)
    image = pixels(figure)
    axes = figure.axes[0]
    (x0, y0), (x1, y1) = axes.transData.transform([(0.3, -3.0), (9.0, 1.8)])
    height = image.shape[0]
    inner = image[height - int(y1) : height - int(y0), int(x0) : int(x1)]
    assert inner.min(axis=2).max() < 235


def test_findings_near_the_cut_are_placed_along_it(section) -> None:
    near = findings_near(section, [LOST, FAR])
    assert [(finding.code, along, height) for finding, along, height in near] == [("missing-anchor", 28.0, 2.6)]


@pytest.mark.parametrize(("most", "length"), [(9.9, 5.0), (10.0, 10.0), (0.31, 0.2), (2000.0, 2000.0)])
def test_scale_bar_is_a_round_length(most: float, length: float) -> None:
    assert round_length(most) == pytest.approx(length)


def test_labels_do_not_overlap() -> None:
    widths = np.array([40.0, 60.0, 30.0, 50.0])
    places = spread(np.array([100.0, 101.0, 102.0, 390.0]), widths, 0.0, 400.0)
    gaps = np.diff(places) - 0.5 * (widths[1:] + widths[:-1])
    assert gaps.min() > -1.0
    assert places[0] - 20.0 >= -1e-9
    assert places[-1] + 25.0 <= 400.0 + 1e-9


def test_long_legend_stays_on_the_sheet(shapes_of_many_films, bridge_masks) -> None:
    """Fourteen films beside a flat section: every text lies within the sheet."""
    figure = draw_section(shapes_of_many_films, "Many", "after step 30", bridge_masks, findings=[LOST])
    image_box = figure.bbox
    pixels(figure)
    for text in figure.texts:
        box = text.get_window_extent()
        assert box.y0 >= image_box.y0, text.get_text()
        assert box.y1 <= image_box.y1, text.get_text()


@pytest.fixture(scope="module")
def shapes_of_many_films(bridge_stack):
    """Fourteen flat films of 0.1 um on one another."""
    grid = bridge_stack.grid
    height = np.broadcast_to(grid.z[:, None, None], grid.shape).astype(np.float32)
    films = [Film("wafer", "silicon", None, 0, height)]
    films += [
        Film(f"layer{k}", ("psg", "nitride")[k % 2], None, k, height - 0.1 * k, height - 0.1 * (k - 1))
        for k in range(1, 14)
    ]
    return section_polygons(FilmStack(grid, tuple(films), films[-1].top), LINE)
