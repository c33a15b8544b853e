"""`flowemu schema`: the JSON Schema of the flow file."""

from __future__ import annotations

import click


@click.command(short_help="Print the JSON Schema of the flow file.")
def command() -> int:
    """Print the JSON Schema of the flow file, for editors."""
    import json

    from flowemu.flow.schema import flow_schema

    click.echo(json.dumps(flow_schema(), indent=2, ensure_ascii=False))
    return 0
