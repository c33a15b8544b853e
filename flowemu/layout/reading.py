"""Reading a layout file through a child process, so that a damaged file cannot end the program."""

from __future__ import annotations

import hashlib
import json
import os
import signal
import struct
import subprocess
import sys
from collections.abc import Iterable
from pathlib import Path
from typing import TYPE_CHECKING

from flowemu.errors import LayoutError
from flowemu.layout.layout import Layout, Pair, missing_cell

if TYPE_CHECKING:
    import numpy as np

TIME_LIMIT = 120.0
"""Seconds after which a reader is taken to hang on a damaged file."""
GDSII_START = b"\x00\x06\x00\x02"
OASIS_START = b"%SEMI-OASIS\r\n"
OASIS_END = 256
"""Length in bytes of the record, of type 2, that ends every OASIS file (SEMI P39, from memory)."""


def read_layout(
    path: str | os.PathLike[str],
    cell: str | None = None,
    wanted: Iterable[Pair] | None = None,
    time_limit: float = TIME_LIMIT,
) -> Layout:
    """Read one cell of a GDSII or OASIS file; which of the two is told from its content.

    Parameters
    ----------
    path : path
        The file.
    cell : str, optional
        The cell to read; the only top cell if left out.
    wanted : iterable of (layer, datatype), optional
        Layers whose polygons are needed; all of them if left out, none for an empty one. Layer
        counts, labels and the box are always there. A pair that is not drawn is no fault here:
        `Layout.missing_layer` tells.
    time_limit : float, s
        How long the reader may take.

    Raises
    ------
    MissingCell
        The cell is not there, or has to be named.
    LayoutError
        The file is missing, damaged, of another kind, or does not make sense.
    """
    file = Path(path)
    digest = _checked_hash(file)
    pairs = None if wanted is None else sorted({(int(a), int(b)) for a, b in wanted})
    header, vertices = _ask(file, {"cell": cell, "wanted": pairs}, time_limit)
    if "fault" in header:
        raise _fault(file, header["fault"])
    if header["cell"] is None:
        raise missing_cell(cell, header["cells"], header["top_cells"], file.name)
    return _layout(file, digest, header, vertices)


def _checked_hash(file: Path) -> str:
    """The file's hash, once it is sure to be a layout by its first bytes."""
    try:
        content = file.read_bytes()
    except FileNotFoundError:
        raise LayoutError(f"layout '{file}' is not there") from None
    except OSError as fault:
        raise LayoutError(f"layout '{file}' cannot be opened: {fault.strerror}") from None
    if not content:
        raise _fault(file, "the file is empty")
    if not content.startswith((GDSII_START, OASIS_START)):
        raise _fault(file, f"it is {_kind(content)}, not GDSII or OASIS")
    if content.startswith(OASIS_START) and content[-OASIS_END:][:1] != b"\x02":
        raise _fault(file, "the file is damaged or cut short (its end record is not at its end)")
    return hashlib.sha256(content).hexdigest()


def _kind(content: bytes) -> str:
    """What a file that is no layout seems to be."""
    if content.startswith((b"\x1f\x8b", b"PK\x03\x04", b"BZh", b"\xfd7zXZ")):
        return "a compressed file"
    if b"\x00" not in content[:512] and content[:512].isascii():
        return "a text file"
    return "a file of another kind, or damaged at its start"


def _ask(file: Path, request: dict, time_limit: float) -> tuple[dict, bytes]:
    """Run the child; its JSON object and the vertices `(n, 2)` float64 as bytes."""
    home = str(Path(__file__).parents[2])
    paths = os.pathsep.join(filter(None, [home, os.environ.get("PYTHONPATH")]))
    command = [sys.executable, "-P", "-m", "flowemu.layout.child", str(file.resolve())]
    try:
        done = subprocess.run(
            command,
            input=json.dumps(request).encode(),
            capture_output=True,
            timeout=time_limit,
            env={**os.environ, "PYTHONPATH": paths},
            check=False,
        )
    except subprocess.TimeoutExpired:
        raise _fault(file, f"the file is damaged or too large (the reader took over {time_limit:g} s)") from None
    except OSError as fault:
        raise _fault(file, f"the reader could not be started ({fault.strerror})") from None
    return _reply(file, done)


def _reply(file: Path, done: subprocess.CompletedProcess[bytes]) -> tuple[dict, bytes]:
    if done.returncode != 0:
        raise _fault(file, f"the file is damaged ({_ending(done.returncode, done.stderr)})")
    try:
        length = struct.unpack("<Q", done.stdout[:8])[0]
        header = json.loads(done.stdout[8 : 8 + length])
    except (struct.error, ValueError):
        raise _fault(file, "the file is damaged (the reader stopped before its end)") from None
    vertices = done.stdout[8 + length :]
    if len(vertices) % 16:
        raise _fault(file, "the file is damaged (the reader stopped before its end)")
    return header, vertices


def _ending(status: int, complaint: bytes) -> str:
    """How a reader ended that gave no reply."""
    if b"MemoryError" in complaint or b"bad_alloc" in complaint:
        return "it asks for more memory than any layout needs"
    if status >= 0:
        return f"reader stopped with status {status}"
    try:
        return f"reader stopped with signal {-status}, {signal.Signals(-status).name}"
    except ValueError:
        return f"reader stopped with signal {-status}"


def _fault(file: Path, text: str) -> LayoutError:
    return LayoutError(f"layout '{file.name}' could not be read: {text}")


def _loops(header: dict, content: bytes) -> dict[Pair, list[np.ndarray]]:
    """The merged contours of every layer that was asked for, `(n, 2)` float64 um each."""
    if not header["loops"]:
        return {}
    import numpy as np

    vertices = np.frombuffer(content, dtype="<f8").reshape(-1, 2)
    loops: dict[Pair, list[np.ndarray]] = {}
    start = 0
    for layer, datatype, lengths in header["loops"]:
        ends = start + np.cumsum(lengths, dtype=int)
        loops[(layer, datatype)] = [vertices[end - n : end] for end, n in zip(ends, lengths, strict=True)]
        start = int(ends[-1]) if len(ends) else start
    return loops


def _layout(file: Path, digest: str, header: dict, vertices: bytes) -> Layout:
    return Layout(
        path=file,
        sha256=digest,
        cells=tuple(header["cells"]),
        top_cells=tuple(header["top_cells"]),
        cell=header["cell"],
        box=tuple(header["box"]) if header["box"] else None,
        layers={(a, b): count for a, b, count in header["layers"]},
        loops=_loops(header, vertices),
        texts=tuple(tuple(text) for text in header["labels"]),
    )
