"""`flowemu mesh`: watertight meshes of the films."""

from __future__ import annotations

import click

from flowemu.cli._options import allow_option, cell_option, flow_argument, out_option

FORMATS = ("glb", "stl", "3mf", "vtm")


@click.command(short_help="Write meshes of the films.")
@flow_argument
@click.option("--format", "formats", type=click.Choice(FORMATS), multiple=True, help="May repeat; all by default.")
@click.option("--after", metavar="STEP", help="After this step, by its number or name; the last one by default.")
@out_option
@cell_option
@allow_option
def command(
    flow: str,
    formats: tuple[str, ...],
    after: str | None,
    out: str | None,
    cell: float | None,
    allow: tuple[str, ...],
) -> int:
    """Write one watertight mesh a film of FLOW."""
    from flowemu.cli._progress import progress
    from flowemu.engine import run_flow
    from flowemu.flow.load import load_flow
    from flowemu.output import prepare_folder, write_meshes

    read = load_flow(flow, allow)
    last = read.find_step(after) if after is not None else None
    folder = prepare_folder(out, read.path)
    with progress() as report:
        run = run_flow(read, until=last, cell=cell, progress=report, checks=False)
        files = write_meshes(run.record, formats or FORMATS, folder)
    click.echo("\n".join(str(file) for file in files))
    return 0
