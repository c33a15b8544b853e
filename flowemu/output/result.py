"""`result.json`: the run in numbers, for other programs."""

from __future__ import annotations

import json
import math
from typing import Any

from flowemu.findings import Finding
from flowemu.record import RunRecord

DIGITS = 7


def result_text(record: RunRecord) -> str:
    """The text of `result.json`, its keys in a fixed order; what does not apply is null."""
    return json.dumps(plain(result_of(record)), indent=1, ensure_ascii=False, allow_nan=False) + "\n"


def result_of(record: RunRecord) -> dict[str, Any]:
    """The run as nested lists and dictionaries; units stand in the key names."""
    grid = record.grid
    return {
        "flow": record.flow,
        "version": record.version,
        "masks_sha256": record.masks_sha256,
        "grid": {"cell_um": grid.cell, "shape_zyx": list(grid.shape), "cells": grid.cells},
        "steps": rows(record.steps, ("index", "verb", "name", "seconds", "removed_um3", "added_um3")),
        "films": rows(record.films, ("name", "material", "step", "volume_um3")),
        "parts": rows(record.parts, ("name", "films", "volume_um3", "box_um", "state", "contact_um2", "play_um")),
        "windows": rows(record.windows, ("step", "film", "clears_s", "ends_s", "limit_s", "limited_by")),
        "findings": [finding_row(finding) for finding in record.findings],
    }


def rows(records: tuple[Any, ...], keys: tuple[str, ...]) -> list[dict[str, Any]]:
    """One dictionary a record, with the given keys in their order."""
    return [{key: getattr(record, key) for key in keys} for record in records]


def finding_row(finding: Finding) -> dict[str, Any]:
    """A finding; whether it is waived is added to the fixed keys."""
    keys = ("code", "severity", "step", "film", "part", "at_um", "text", "cause", "waived")
    return {key: getattr(finding, key) for key in keys}


def plain(value: Any) -> Any:
    """A value as JSON has it: numbers to seven digits, null for what is not finite."""
    if isinstance(value, dict):
        return {key: plain(inner) for key, inner in value.items()}
    if isinstance(value, list | tuple):
        return [plain(inner) for inner in value]
    if hasattr(value, "item"):
        value = value.item()
    if isinstance(value, float):
        return float(f"{value:.{DIGITS}g}") if math.isfinite(value) else None
    return value
