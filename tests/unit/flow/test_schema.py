"""The JSON Schema says what the models say."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import jsonschema
import pytest
import yaml

from flowemu.flow.schema import flow_schema
from tests.unit.flow.flows import GOOD, complaints

FLOWS = sorted((Path(__file__).parents[3] / "flows").glob("*.yaml"))
VALIDATOR = jsonschema.Draft202012Validator(flow_schema())


def as_editors_read(text: str) -> Any:
    """The text as an editor's YAML 1.2 core schema reads it, through JSON as the validator sees it."""

    class Core(yaml.SafeLoader):
        """Safe, and without the guesses of YAML 1.1 about dates, NO and 12:30."""

    Core.yaml_implicit_resolvers = {
        letter: [(tag, rule) for tag, rule in rules if tag.rpartition(":")[2] in ("null", "float", "int")]
        for letter, rules in yaml.SafeLoader.yaml_implicit_resolvers.items()
    }
    return json.loads(json.dumps(yaml.load(text, Loader=Core)))


def test_the_schema_is_a_schema() -> None:
    jsonschema.Draft202012Validator.check_schema(flow_schema())


@pytest.mark.parametrize("path", FLOWS, ids=lambda p: p.stem)
def test_every_flow_here_is_valid(path: Path) -> None:
    assert [error.message for error in VALIDATOR.iter_errors(as_editors_read(path.read_text()))] == []


def test_a_good_flow_is_good_to_both(tmp_path: Path) -> None:
    assert VALIDATOR.is_valid(as_editors_read(GOOD))
    assert complaints(GOOD, tmp_path) == []


@pytest.mark.parametrize(
    ("good", "other"),
    [
        ("- inspect:", "- inspect"),
        ("- inspect:", "- inspect: {name: look, note: 3}"),
        ("- strip: resist", "- strip: {film: resist, with: acetone}"),
        ('"100"', "100"),
        ('"100"', "(100)"),
        ("[-10 um, -10 um, 10 um, 10 um]", "{box: [-10 um, -10 um, 10 um, 10 um], symmetry: [left]}"),
        ("clears: glass", "clears: [glass]"),
        ("2 um, method", "2000 nm, method"),
        ("2 nm/min}", "2 nm/min, others: 0 nm/min}"),
        ("grid: {", "limits: {foot: {warning: 1 um}, play: {note: off}, resist_aspect: {error: 5}}\ngrid: {"),
    ],
)
def test_other_forms_are_good_to_both(good: str, other: str, tmp_path: Path) -> None:
    assert good in GOOD
    text = GOOD.replace(good, other, 1)
    assert complaints(text, tmp_path) == []
    assert [error.message for error in VALIDATOR.iter_errors(as_editors_read(text))] == []


@pytest.mark.parametrize(
    ("good", "bad"),
    [
        ("cell: 0.5 um", "cell: 0.5"),
        ("cell: 0.5 um", "cell: 0.5 min"),
        ("cell: 0.5 um", "cell: -0.5 um"),
        ("over: 20 %", "over: 20"),
        ("over: 20 %", "ovr: 20 %"),
        ("over: 20 %", "over: 20 %, time: 2 min"),
        ("clears: glass, over: 20 %", "time: 2 min, over: 20 %"),
        ("clears: glass, ", ""),
        ("clears: glass", "clears: []"),
        ("open: drawn", "open: down"),
        ("open: drawn", "open: drawn, keep: drawn"),
        ("resist: 2 um", "resist: {material: resist}"),
        ("- etch:", "- etsh:"),
        ("- strip: resist", "- strip:"),
        ("- strip: resist", "- strip"),
        ("- inspect:", "- inspect: {figure: x}"),
        ("grid: {cell: 0.5 um}\n", ""),
        ("steps:", "stps:"),
        ("11/0", "11"),
        ("ANCHOR: 10/0", "'?': 10/0"),
        ('"100"', "101"),
        ("10 um]\n", "10 um, 4 um]\n"),
        ("held: {part: plate}", "held: plate"),
        ("held: {part: plate}", "hold: {part: plate}"),
        (", at_least: 1.9 um", ""),
        ("thickness: 2 um, method: lpcvd, cov", "thickness: ~, method: lpcvd, cov"),
        ("2 nm/min}", "2 um}"),
        ("grid: {", "limits: {foot: {warning: 1 min}}\ngrid: {"),
        ("grid: {", "limits: {fot: {warning: 1 um}}\ngrid: {"),
    ],
)
def test_what_is_bad_is_bad_to_both(good: str, bad: str, tmp_path: Path) -> None:
    assert good in GOOD
    text = GOOD.replace(good, bad, 1)
    assert complaints(text, tmp_path)
    assert not VALIDATOR.is_valid(as_editors_read(text))
