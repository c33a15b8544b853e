"""An inspection changes nothing."""

from __future__ import annotations

import pytest

from flowemu.registry import step_kinds
from tests.unit.steps.shop import do, layered


def test_the_very_same_wafer_comes_back() -> None:
    wafer = layered(("film", "nitride", None, 1.0))
    assert do(wafer, "inspect", name="before release") is wafer


def test_it_takes_a_name_and_a_note_and_nothing_else() -> None:
    settings = step_kinds()["inspect"].settings
    assert settings.names() == ["name", "note"]
    with pytest.raises(ValueError, match="depth"):
        settings.model_validate({"depth": "1 um"})
