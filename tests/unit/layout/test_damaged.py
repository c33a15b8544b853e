"""Damaged and senseless layout files: always a layout or one clear line, whatever happens to the reader."""

from __future__ import annotations

import gzip
import subprocess
import sys
from pathlib import Path

import gdstk
import numpy as np
import pytest

from flowemu.errors import LayoutError
from flowemu.layout import read_layout
from flowemu.layout.reading import _reply
from tests.unit.layout.drawings import FORMATS, boxed, gdsii, placed, rich_library, save

MUTANTS = 40


@pytest.mark.parametrize("ending", FORMATS)
def test_random_bytes_never_end_the_program(ending: str, tmp_path: Path) -> None:
    """A few changed bytes crash the reading library now and then; the parent must not notice."""
    good = np.frombuffer(save(rich_library(), tmp_path, ending).read_bytes(), dtype=np.uint8)
    refused = 0
    for seed in range(MUTANTS):
        rng = np.random.default_rng(seed)
        changed = good.copy()
        count = int(rng.integers(1, 6))
        changed[rng.integers(0, len(good), count)] = rng.integers(0, 256, count)
        path = tmp_path / "mutant.bin"
        path.write_bytes(changed.tobytes())
        try:
            read_layout(path, time_limit=20.0)
        except LayoutError as fault:
            refused += 1
            text = str(fault)
            assert text.startswith("layout 'mutant.bin' ") and "\n" not in text and len(text) < 300
    assert 0 < refused < MUTANTS


def test_a_crash_of_the_reader_is_told_by_its_signal(tmp_path: Path) -> None:
    done = subprocess.run(
        [sys.executable, "-c", "import os, signal; os.kill(os.getpid(), signal.SIGSEGV)"],
        capture_output=True, check=False,
    )  # fmt: skip
    with pytest.raises(LayoutError) as fault:
        _reply(tmp_path / "x.gds", done)
    expected = "layout 'x.gds' could not be read: the file is damaged (reader stopped with signal 11, SIGSEGV)"
    assert str(fault.value) == expected


@pytest.mark.parametrize("ending", FORMATS)
def test_a_truncated_file_is_refused(ending: str, tmp_path: Path) -> None:
    path = save(rich_library(), tmp_path, ending)
    good = path.read_bytes()
    for length in (20, len(good) // 4, len(good) // 2, len(good) - 4):
        path.write_bytes(good[:length])
        with pytest.raises(LayoutError, match="could not be read: the file is damaged"):
            read_layout(path)


def test_bytes_behind_the_end_of_gdsii_are_ignored(tmp_path: Path) -> None:
    path = save(rich_library(), tmp_path, "gds")
    path.write_bytes(path.read_bytes() + b"\0" * 2048)
    assert read_layout(path).layers == {(3, 1): 8, (4, 0): 8}


@pytest.mark.parametrize(
    ("content", "text"),
    [
        (b"", "the file is empty"),
        (b"flow: not a layout\n", "it is a text file, not GDSII or OASIS"),
        (gzip.compress(b"x" * 100), "it is a compressed file, not GDSII or OASIS"),
        (bytes(range(200, 256)), "it is a file of another kind, or damaged at its start, not GDSII or OASIS"),
        (gdsii(), "it has no cells"),
        (gdsii(("AA", placed("BB")), ("BB", placed("AA"))), "its cells refer to one another in a circle: AA > BB > AA"),
        (gdsii(("AA", placed("ZZ"))), "cell 'AA' refers to cell 'ZZ', which is not in the file"),
        (gdsii(("AA", boxed(1, 0, 9, 9)), ("AA", b"")), "two of its cells are called 'AA'"),
    ],
)
def test_what_makes_no_sense_is_said(content: bytes, text: str, tmp_path: Path) -> None:
    path = tmp_path / "bad.gds"
    path.write_bytes(content)
    with pytest.raises(LayoutError) as fault:
        read_layout(path)
    assert str(fault.value) == f"layout 'bad.gds' could not be read: {text}"


def test_a_circle_beside_a_sound_top_cell_is_refused(tmp_path: Path) -> None:
    path = tmp_path / "bad.gds"
    path.write_bytes(gdsii(("TOPP", placed("AA")), ("AA", placed("BB")), ("BB", placed("AA"))))
    with pytest.raises(LayoutError, match="in a circle: AA > BB > AA"):
        read_layout(path)


def test_a_wrong_checksum_is_said(tmp_path: Path) -> None:
    rich_library().write_oas(tmp_path / "die.oas", validation="crc32")
    content = bytearray((tmp_path / "die.oas").read_bytes())
    content[len(content) // 2] ^= 0x01
    (tmp_path / "die.oas").write_bytes(bytes(content))
    with pytest.raises(LayoutError, match="the file is damaged: its checksum is wrong"):
        read_layout(tmp_path / "die.oas")


@pytest.mark.parametrize("ending", FORMATS)
def test_an_absurd_expansion_is_refused_before_it_is_made(ending: str, tmp_path: Path) -> None:
    """Ten levels of ten by ten copies: 1e20 polygons from a few hundred bytes."""
    library = gdstk.Library()
    cell = library.new_cell("c0")
    cell.add(gdstk.rectangle((0, 0), (1, 1)))
    for level in range(1, 11):
        upper = library.new_cell(f"c{level}")
        upper.add(gdstk.Reference(cell, columns=10, rows=10, spacing=(2, 2)))
        cell = upper
    text = "cell 'c10' expands to 100,000,000,000,000,000,000 polygons; the limit is 2,000,000"
    with pytest.raises(LayoutError, match=text):
        read_layout(save(library, tmp_path, ending))


def test_a_reader_that_hangs_is_stopped(tmp_path: Path) -> None:
    path = save(rich_library(), tmp_path, "gds")
    with pytest.raises(LayoutError, match=r"the reader took over 0.001 s"):
        read_layout(path, time_limit=0.001)
