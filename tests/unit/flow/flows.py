"""A small good flow as text, and ways to spoil it, for the tests of the reader."""

from __future__ import annotations

from pathlib import Path

from flowemu.errors import InputError
from flowemu.flow.flow import Flow
from flowemu.flow.load import flow_of
from flowemu.flow.reader import read_document

GOOD = """\
flow: Small
about: A plate over a glass.
layout:
  file: die.gds
  cell: die
  window: [-10 um, -10 um, 10 um, 10 um]
  masks: {ANCHOR: 10/0, PLATE: 11/0}
parts: {plate: {film: poly, at: [0 um, 0 um]}}
wafer: {material: silicon, orientation: "100", depth: 3 um}
grid: {cell: 0.5 um}
steps:
  - deposit: {film: glass, material: psg, thickness: 2 um, method: lpcvd, coverage: 60 %}
  - pattern: {mask: ANCHOR, open: drawn, resist: 2 um, align: bare}
  - etch: {with: oxide rie, clears: glass, over: 20 %}
  - strip: resist
  - deposit: {film: poly, material: polysilicon, state: n+, thickness: 2 um, method: lpcvd, name: plate film}
  - anneal: {temperature: 1050 degC, time: 60 min}
  - pattern: {mask: PLATE, keep: drawn, resist: {thickness: 3 um, tone: positive}, align: ANCHOR}
  - etch: {with: poly rie, clears: poly, over: 50 %, rates: {psg: 2 nm/min}}
  - strip: resist
  - inspect:
  - release: {with: hf 49, frees: [plate], over: 50 %, dry: critical point}
expect:
  - held: {part: plate}
  - thickness: {film: poly, at: [0 um, 0 um], at_least: 1.9 um}
"""


def folder_with_layout(folder: Path) -> Path:
    """The folder, with a file where the flow expects its layout; only that it is there matters here."""
    (folder / "pyproject.toml").write_text("")
    (folder / "die.gds").write_bytes(b"")
    return folder


def read(text: str, folder: Path) -> Flow:
    """The flow in a text, as if it stood in `folder`."""
    path = folder_with_layout(folder) / "small.yaml"
    return flow_of(read_document(text.encode(), str(path)), path)


def complaints(text: str, folder: Path) -> list[str]:
    """What is said of a text, each without its folder: `12:5: step 4 (etch): ...`."""
    try:
        read(text, folder)
    except InputError as error:
        return [line.split("small.yaml:", 1)[-1] for line in error.lines()]
    return []
