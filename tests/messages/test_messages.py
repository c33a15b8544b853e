"""What the program says of bad input, word for word."""

from __future__ import annotations

import re

import pytest

from flowemu.engine import memory
from tests.messages.cases import COMMAND, FOLDER, MEMORY, case_folder, case_names, command_of, outcome

LOCATED = re.compile(r"(flow\.yaml:\d+:\d+|flowemu): \S")


def expected(name: str) -> str:
    return (FOLDER / name / "expected.txt").read_text()


LINTED = [name for name in case_names() if command_of(name) == COMMAND and expected(name).startswith("status 2")]


@pytest.fixture(autouse=True)
def machine_of_known_size(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(memory, "machine_memory", lambda: MEMORY)
    monkeypatch.delenv("FLOWEMU_DEBUG", raising=False)


@pytest.mark.parametrize("name", case_names())
def test_the_message_is_as_written(name: str) -> None:
    with case_folder() as folder:
        assert outcome(name, folder) == expected(name)


@pytest.mark.parametrize("name", [name for name in case_names() if expected(name).startswith("status 2")])
def test_every_expected_line_is_located_and_nothing_is_left_behind(name: str) -> None:
    _, *lines = expected(name).splitlines()
    assert lines
    assert all(LOCATED.match(line) for line in lines)


@pytest.mark.parametrize("name", LINTED)
def test_a_run_says_the_same_as_lint_and_writes_nothing(name: str) -> None:
    with case_folder() as folder:
        assert outcome(name, folder, "run flow.yaml") == expected(name)


def test_a_changed_folder_is_seen() -> None:
    """The test itself can fail: a run that succeeds leaves an output folder."""
    with case_folder() as folder:
        told = outcome("all_well", folder, "section flow.yaml --line -9,0,9,0 --after 0")
    assert told.startswith("status 0\nthe folder was changed\n")
