"""Options that several commands share, and how their values are read."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import click

from flowemu import units
from flowemu.findings import SEVERITIES

FLOW = click.Path(dir_okay=False, path_type=str)

flow_argument = click.argument("flow", metavar="FLOW", type=FLOW)
allow_option = click.option(
    "--allow", metavar="DIR", multiple=True, help="A folder beside the project's own that the flow may read from."
)
out_option = click.option("--out", metavar="DIR", help="Output folder; outputs/ and the flow file's stem by default.")
fail_on_option = click.option(
    "--fail-on", type=click.Choice(SEVERITIES), default="error", show_default=True, help="Least severity for status 1."
)


class Lengths(click.ParamType):
    """A comma-separated list of lengths, um unless they carry a unit."""

    name = "lengths"

    def __init__(self, count: int) -> None:
        self.count = count

    def convert(self, value: Any, param: click.Parameter | None, ctx: click.Context | None) -> tuple[float, ...]:
        if isinstance(value, tuple):
            return value
        texts = str(value).split(",")
        if len(texts) != self.count:
            self.fail(f"'{value}': expected {self.count} lengths with commas between", param, ctx)
        try:
            return tuple(units.parse(text, "length", bare="um") for text in texts)
        except ValueError as error:
            self.fail(str(error), param, ctx)


class CellSize(click.ParamType):
    """The edge of a cell, with its unit."""

    name = "length"

    def convert(self, value: Any, param: click.Parameter | None, ctx: click.Context | None) -> float:
        if isinstance(value, float):
            return value
        from flowemu.flow.quantities import LEAST_CELL

        try:
            length = units.parse(str(value), "length")
        except ValueError as error:
            self.fail(str(error), param, ctx)
        if length < LEAST_CELL:
            self.fail(f"'{value}' is below {units.show(LEAST_CELL, 'length')}", param, ctx)
        return length


def cell_option(function: Callable[..., Any]) -> Callable[..., Any]:
    """Adds `--cell`."""
    return click.option("--cell", metavar="LENGTH", type=CellSize(), help="Cell size in place of the flow's.")(function)
