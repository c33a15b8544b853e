"""The command line: one module of this folder a command, found by looking and imported when it is called for.

Exit status: 0 nothing found at or above the `--fail-on` severity, 1 something found, 2 the input is wrong or the run
could not be made, 130 on Ctrl-C.
"""

from __future__ import annotations

import os
import sys
from collections.abc import Sequence
from importlib import import_module
from pkgutil import iter_modules

import click

from flowemu import __version__
from flowemu.errors import FlowemuError, hint

os.environ.setdefault("PYDANTIC_DISABLE_PLUGINS", "__all__")  # looking for plugins costs 20 ms, and none are meant

OK, FOUND, FAILED, INTERRUPTED = 0, 1, 2, 130
DEBUG_SWITCH = "FLOWEMU_DEBUG"


class Commands(click.Group):
    """The commands in this folder; a module `name.py` defines `command`."""

    def list_commands(self, ctx: click.Context) -> list[str]:
        return sorted(m.name for m in iter_modules(__path__) if not m.name.startswith("_"))

    def get_command(self, ctx: click.Context, cmd_name: str) -> click.Command | None:
        if cmd_name not in self.list_commands(ctx):
            return None
        command = import_module(f"{__name__}.{cmd_name}").command
        assert isinstance(command, click.Command), f"{cmd_name}.py defines no command"
        return command

    def resolve_command(
        self, ctx: click.Context, args: list[str]
    ) -> tuple[str | None, click.Command | None, list[str]]:
        known = self.list_commands(ctx)
        if args and args[0] not in known and not args[0].startswith("-"):
            ctx.fail(f"there is no command '{args[0]}'{hint(args[0], known, 'the commands are')}")
        return super().resolve_command(ctx, args)


@click.group(cls=Commands, context_settings={"help_option_names": ["-h", "--help"]})
@click.version_option(__version__, prog_name="flowemu")
def commands() -> None:
    """Runs a microfabrication step list on a mask layout and says what goes wrong, where and why."""


def main(args: Sequence[str] | None = None) -> int:
    """The command line; returns the exit status."""
    try:
        status = commands.main(args=None if args is None else list(args), prog_name="flowemu", standalone_mode=False)
        sys.stdout.flush()
        return status if isinstance(status, int) else OK
    except (KeyboardInterrupt, click.Abort):
        _say(["flowemu: stopped"])
        return INTERRUPTED
    except click.exceptions.NoArgsIsHelpError as error:
        error.show()
        return FAILED
    except click.ClickException as error:
        _say([_wrong_use(error)])
        return FAILED
    except FlowemuError as error:
        _say(error.lines())
        return error.exit_status
    except BrokenPipeError:
        _leave_pipe()
        return OK
    except Exception as error:
        return _internal(error)


def _wrong_use(error: click.ClickException) -> str:
    """One line for a command line that cannot be read."""
    text = " ".join(error.format_message().split())
    context = getattr(error, "ctx", None)
    return f"flowemu: {text}" + (f" (see {context.command_path} --help)" if context else "")


def _internal(error: Exception) -> int:
    """One line for a fault of the program itself; the trace where it is asked for."""
    if os.environ.get(DEBUG_SWITCH):
        raise error
    text = " ".join(str(error).split()) or "no text"
    _say([f"flowemu: internal fault: {type(error).__name__}: {text}; set {DEBUG_SWITCH}=1 for the trace"])
    return FAILED


def _say(lines: Sequence[str]) -> None:
    for line in lines:
        click.echo(line, err=True)


def _leave_pipe() -> None:
    """Keeps Python from complaining at its end about a reader that went away."""
    os.dup2(os.open(os.devnull, os.O_WRONLY), 1)
