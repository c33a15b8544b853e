"""What the program says of bad input, word for word."""

from __future__ import annotations

import re

import pytest

from tests.messages.cases import FOLDER, case_folder, case_names, outcome

LOCATED = re.compile(r"(flow\.yaml:\d+:\d+|flowemu): \S")


@pytest.mark.parametrize("name", case_names())
def test_the_message_is_as_written(name: str) -> None:
    with case_folder() as folder:
        assert outcome(name, folder) == (FOLDER / name / "expected.txt").read_text()


@pytest.mark.parametrize("name", case_names())
def test_every_expected_line_is_located(name: str) -> None:
    status, *lines = (FOLDER / name / "expected.txt").read_text().splitlines()
    if status != "status 2":
        pytest.skip("nothing is wrong in this case")
    assert lines
    assert all(LOCATED.match(line) for line in lines)
