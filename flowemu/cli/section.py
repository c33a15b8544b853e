"""`flowemu section`: cross-section figures along a line."""

from __future__ import annotations

import click

from flowemu.cli._options import Lengths, allow_option, cell_option, flow_argument, out_option


@click.command(short_help="Draw cross-sections along a line.")
@flow_argument
@click.option("--line", metavar="X1,Y1,X2,Y2", type=Lengths(4), required=True, help="Ends of the cut.")
@click.option("--after", metavar="STEP", multiple=True, help="After this step; may repeat; the last one by default.")
@out_option
@cell_option
@allow_option
def command(
    flow: str,
    line: tuple[float, float, float, float],
    after: tuple[str, ...],
    out: str | None,
    cell: float | None,
    allow: tuple[str, ...],
) -> int:
    """Draw cross-sections of FLOW along a line, as SVG, PDF and PNG.

    The line's ends are in um unless they carry a unit.
    """
    from flowemu.cli._progress import progress
    from flowemu.engine import run_flow
    from flowemu.flow.load import load_flow
    from flowemu.output import prepare_folder, write_sections
    from flowemu.output.cut import clipped
    from flowemu.stack.grid import Grid

    ends = [line[:2], line[2:]]

    def ready(grid: Grid) -> None:
        clipped(grid, ends)

    read = load_flow(flow, allow)
    steps = sorted({read.find_step(step) for step in after} or {len(read.steps)})
    folder = prepare_folder(out, read.path)
    with progress() as report:
        run = run_flow(read, until=steps[-1], cell=cell, keep=tuple(steps), progress=report, ready=ready)
        files = write_sections(run.record, ends, steps, folder)
    click.echo("\n".join(str(file) for file in files))
    return 0
