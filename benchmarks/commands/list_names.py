"""`pulsewright list`: the names a scenario can use."""

from __future__ import annotations

from typing import Any

import click

from benchmarks.commands.options import as_json
from benchmarks.errors import BadInputError, closest, listed

KINDS = ("devices", "strategies", "schemes", "scenarios")


@click.command("list", short_help="List device models, strategies, bias schemes and scenarios.")
@click.argument("kind", metavar="[devices|strategies|schemes|scenarios]", required=False)
@as_json
def command(kind: str | None, as_json: bool) -> None:
    """List device models, strategies, bias schemes and scenarios."""
    if kind is not None and kind not in KINDS:
        raise BadInputError(f"list: must be one of {listed(KINDS)}, got {kind!r}{closest(kind, KINDS)}")
    from benchmarks.available import available

    found = {name: available(name) for name in (KINDS if kind is None else (kind,))}
    if as_json:
        import json

        click.echo(json.dumps({"schema": "pulsewright.list/1", **found}, indent=2, ensure_ascii=False))
    else:
        _print(found)


def _print(found: dict[str, list[dict[str, Any]]]) -> None:
    from rich.table import Table
    from rich.text import Text

    from benchmarks.console import PipeAwareConsole

    console = PipeAwareConsole()
    for kind, entries in found.items():
        table = Table(box=None, show_header=False, padding=(0, 2, 0, 0), title=kind, title_justify="left")
        table.add_column(no_wrap=True, style="bold")
        table.add_column()
        for entry in entries:
            table.add_row(Text(entry["name"]), Text(entry["summary"]))
            if entry.get("parameters"):
                table.add_row("", Text("parameters: " + ", ".join(entry["parameters"]), style="dim"))
        console.print(table)
        console.print()
