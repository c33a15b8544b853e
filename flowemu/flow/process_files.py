"""Reads the files of the process data and lays the flow's `data:` section over them, entry by entry.

The section has the same keys as the files, values in the flow file's form:

    data:
      materials: {our glass: {kind: glass, conductor: no}}
      etchants: {vapour hf: {conditions: our tool}}
      methods: {pecvd: {temperature: 300 degC}}
      rates: {vapour hf: {our glass: 180 nm/min}}    # or a list of rows with state, source, note ...
      anneals: [{material: lto, from: as deposited, to: annealed, at_least: 850 degC}]
      sources: {log: {citation: our tool log of March}}

What an entry states replaces that of the built-in entry of the same name; the rest of it stays.
"""

from __future__ import annotations

from functools import cache
from pathlib import Path
from typing import Any

import yaml

from flowemu.errors import hint
from flowemu.flow.process_entries import ProcessDataError, Reader, Tables

FOLDER = Path(__file__).parent.parent / "data"
RATE_FILES = ("rates-hf.yaml", "rates-wet.yaml", "rates-dry.yaml")
SECTIONS = ("materials", "etchants", "methods", "rates", "anneals", "sources")


@cache
def builtin_tables() -> Tables:
    """The tables of the built-in files; shared, so never written into."""
    reader = Reader(Tables(), from_flow=False)
    reader.tables.kinds = _read_file("etch-kinds.yaml")
    for section in ("sources", "hazards", "materials", "methods", "etchants", "anneals"):
        reader.section(section, (f"{section}.yaml",), _read_file(f"{section}.yaml"))
    for name in RATE_FILES:
        reader.section("rates", (name,), _read_file(name))
    return reader.finished()


def with_overrides(tables: Tables, given: Any) -> Tables:
    """The tables with the flow's `data:` section on top; the ones given stay as they are."""
    reader = Reader(tables.copy(), from_flow=True)
    sections = dict(reader.items(("data",), given))
    for name in sections:
        if name not in SECTIONS:
            reader.problems.append((("data", name), f"unknown section{hint(name, SECTIONS)}"))
    for name in ("sources", "materials", "methods", "etchants", "anneals", "rates"):
        if name in sections:
            reader.section(name, ("data", name), sections[name])
    return reader.finished()


class _TextLoader(getattr(yaml, "CBaseLoader", yaml.BaseLoader)):  # type: ignore[misc]
    """Every scalar as text, so that nothing is guessed; a repeated key is an error."""

    def construct_mapping(self, node: yaml.MappingNode, deep: bool = False) -> dict[str, Any]:
        names = [key.value for key, _ in node.value]
        twice = sorted({name for name in names if names.count(name) > 1})
        if twice:
            raise yaml.YAMLError(f"line {node.start_mark.line + 1}: '{twice[0]}' is there twice")
        return dict(super().construct_mapping(node, deep=True))


def _read_file(name: str) -> Any:
    try:
        return yaml.load((FOLDER / name).read_text(encoding="utf-8"), Loader=_TextLoader)
    except (OSError, yaml.YAMLError) as error:
        raise ProcessDataError([((name,), str(error))]) from None
