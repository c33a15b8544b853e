"""Any text gives a flow or located faults, never a traceback."""

from __future__ import annotations

import json
import random
import re
import tempfile
from pathlib import Path

from hypothesis import given, settings
from hypothesis import strategies as st

from flowemu.errors import InputError
from flowemu.flow.load import flow_of
from flowemu.flow.reader import read_document
from tests.unit.flow.flows import GOOD, folder_with_layout

FOLDER = folder_with_layout(Path(tempfile.mkdtemp(prefix="flow-text-")))
LOCATED = re.compile(r".*any\.yaml:\d+:\d+: \S")
WORDS = re.findall(r"[\w./%+-]+|[^\w\s]|\s+", GOOD)


def judge(raw: bytes) -> None:
    try:
        flow_of(read_document(raw, str(FOLDER / "any.yaml")), FOLDER / "any.yaml")
    except InputError as error:
        assert error.faults
        assert all(LOCATED.match(line) and "\n" not in line for line in error.lines())


@given(st.text(max_size=200))
def test_any_text(text: str) -> None:
    judge(text.encode("utf-8", "surrogatepass"))


@given(st.binary(max_size=200))
def test_any_bytes(raw: bytes) -> None:
    judge(raw)


@settings(max_examples=200)
@given(st.integers(0, 2**32 - 1), st.integers(1, 5))
def test_a_good_flow_with_words_moved_about(seed: int, changes: int) -> None:
    chance = random.Random(seed)
    words = list(WORDS)
    for _ in range(changes):
        words[chance.randrange(len(words))] = chance.choice([*WORDS, "", "~", "*a", "&a", "!!x", "[", "}", "\t", "-"])
    judge("".join(words).encode())


LEAVES = st.none() | st.sampled_from(["", "1 um", "poly", "etch", "10/0", "drawn", "\u00e9"])
NAMES = st.sampled_from(["file", "film", "at", "etch", "masks", "rates", "foot", "held", "thickness", "x"])


@given(st.recursive(LEAVES, lambda inner: st.lists(inner, max_size=3) | st.dictionaries(NAMES, inner, max_size=3)))
def test_any_shape_in_any_section(value: object) -> None:
    for name in ("layout", "steps", "limits", "data", "accept", "expect"):
        head = re.sub(rf"^{name}:.*\n(?:[ ].*\n)*", "", GOOD, flags=re.MULTILINE)
        judge(f"{head}{name}: {json.dumps(value)}\n".encode())
