"""The command `pulsewright`: which commands there are, and how each ends."""

from __future__ import annotations

import sys
from collections.abc import Sequence
from importlib import import_module
from typing import Any, NoReturn

import click

from benchmarks.errors import closest, listed
from benchmarks.exit_status import run_guarded

# The one list of commands: name -> module with an attribute `command`. Imported when asked for.
COMMANDS = {
    "program": "benchmarks.commands.program",
    "check": "benchmarks.commands.check",
    "list": "benchmarks.commands.list_names",
}


class CommandLine(click.Group):
    """A group whose commands are loaded late and whose every ending is a documented exit status."""

    def list_commands(self, ctx: click.Context) -> list[str]:
        """Names of the commands, the main one first."""
        return list(COMMANDS)

    def get_command(self, ctx: click.Context, cmd_name: str) -> click.Command | None:
        """The command of that name, None if there is none."""
        if cmd_name not in COMMANDS:
            return None
        command: click.Command = import_module(COMMANDS[cmd_name]).command
        return command

    def resolve_command(self, ctx: click.Context, args: list[str]) -> tuple[str | None, click.Command | None, list[str]]:
        """Raises click.UsageError for an unknown command, with the closest one that exists."""
        if args and args[0] not in COMMANDS and not args[0].startswith("-"):
            hint = closest(args[0], COMMANDS)
            raise click.UsageError(f"unknown command {args[0]!r}{hint}; known are {listed(COMMANDS)}")
        return super().resolve_command(ctx, args)

    def main(self, args: Sequence[str] | None = None, *_: Any, **__: Any) -> NoReturn:
        """Run the command and leave with its exit status."""
        given = list(sys.argv[1:] if args is None else args)

        def run() -> None:
            with self.make_context("pulsewright", given) as context:
                self.invoke(context)

        sys.exit(run_guarded(run, given))


def _print_version(context: click.Context, _parameter: click.Parameter, asked: bool) -> None:
    if asked:
        from benchmarks.version import version

        click.echo(f"pulsewright {version()}")
        context.exit()


@click.group(
    cls=CommandLine,
    context_settings={"help_option_names": ["-h", "--help"], "max_content_width": 100},
    invoke_without_command=True,
    epilog="Exit status: 0 done, 1 a gate failed, 2 bad input, 3 a fault of the program, 130 interrupted.",
)
@click.option("--version", is_flag=True, is_eager=True, expose_value=False, callback=_print_version, help="Print the version.")
@click.pass_context
def main(context: click.Context) -> None:
    """A bench for write-verify programming of resistive-memory arrays.

    Try it: pulsewright program demo
    """
    if context.invoked_subcommand is None:
        click.echo(context.get_help())
