"""Every add and carve in these tests is looked through for broken invariants."""

from __future__ import annotations

import pytest

from flowemu.stack.invariants import SWITCH


@pytest.fixture(autouse=True)
def _invariants_are_watched(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv(SWITCH, "1")
