"""`flowemu run`: the whole job."""

from __future__ import annotations

import click

from flowemu.cli._options import allow_option, cell_option, fail_on_option, flow_argument, out_option


@click.command(short_help="Run a flow: geometry, checks, figures, meshes.")
@flow_argument
@out_option
@click.option("--until", metavar="STEP", help="Stop after this step, by its number or name; 0 is the bare wafer.")
@cell_option
@fail_on_option
@allow_option
def command(
    flow: str, out: str | None, until: str | None, cell: float | None, fail_on: str, allow: tuple[str, ...]
) -> int:
    """Run FLOW: geometry, checks, figures and meshes, into an output folder.

    The status is 0 where nothing is found at or above the --fail-on severity, else 1.
    """
    from flowemu.cli._progress import progress
    from flowemu.engine import run_flow
    from flowemu.findings import at_or_above
    from flowemu.flow.load import load_flow
    from flowemu.output import prepare_folder, summary, write_run

    read = load_flow(flow, allow)
    last = read.find_step(until) if until is not None else None
    folder = prepare_folder(out, read.path)
    with progress() as report:
        record = run_flow(read, until=last, cell=cell, progress=report).record
        notes = write_run(record, folder, progress=report)
    click.echo("\n".join([*summary(record, folder, fail_on), *notes]))
    return 1 if at_or_above(record.findings, fail_on) else 0
