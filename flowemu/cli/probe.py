"""`flowemu probe`: the films under a point."""

from __future__ import annotations

import click

from flowemu.cli._options import Lengths, allow_option, cell_option, flow_argument


@click.command(short_help="Tell the film stack under points.")
@flow_argument
@click.option("--at", "places", metavar="X,Y", type=Lengths(2), multiple=True, required=True, help="May repeat.")
@click.option("--after", metavar="STEP", help="After this step, by its number or name; the last one by default.")
@click.option("--json", "as_json", is_flag=True, help="One line of JSON a point.")
@cell_option
@allow_option
def command(
    flow: str,
    places: tuple[tuple[float, float], ...],
    after: str | None,
    as_json: bool,
    cell: float | None,
    allow: tuple[str, ...],
) -> int:
    """Tell the film stack of FLOW under each point, with thicknesses, the lowest film first.

    Points are in um unless they carry a unit.
    """
    import json

    from flowemu.cli._progress import progress
    from flowemu.engine import run_flow
    from flowemu.engine.points import inside, probe
    from flowemu.flow.load import load_flow
    from flowemu.stack.grid import Grid

    def ready(grid: Grid) -> None:
        for at in places:
            inside(grid, at)

    read = load_flow(flow, allow)
    last = read.find_step(after) if after is not None else None
    with progress() as report:
        run = run_flow(read, until=last, cell=cell, progress=report, checks=False, ready=ready)
    for at in places:
        found = probe(run, at)
        click.echo(json.dumps(found) if as_json else "\n".join(_table(found)))
    if run.wafer.back and not as_json:
        coats = ", ".join(f"{coat.name} {coat.thickness:g} um" for coat in run.wafer.back)
        click.echo(f"on the wafer's back, from the wafer outward: {coats}")
    return 0


def _table(found: dict) -> list[str]:
    """The stack under one point as lines, the highest film first, as it lies."""
    x, y = found["at_um"]
    lines = [f"at ({x:g}, {y:g}) um, from the top:"]
    for entry in reversed(found["stack"]):
        low, high = entry["from_um"], entry["to_um"]
        thick = f"{high - low:.4g} um"
        lines.append(f"  {entry['film']:<16} {entry['material']:<20} {thick:>12}   {low:.4g} to {high:.4g} um")
    return lines
