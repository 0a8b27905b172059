"""`pulsewright check`: what a scenario means, in SI units, with the source of each value, and what to beware of."""

from __future__ import annotations

import click

from benchmarks.commands.options import allow_code, as_json, scenario


@click.command("check", short_help="Show what a scenario means, with sources and warnings.")
@scenario
@as_json
@allow_code
def command(scenario: str, as_json: bool, allow_code: bool) -> None:
    """Show SCENARIO resolved, with sources and warnings, without running it."""
    from benchmarks.scenario import load_scenario

    loaded = load_scenario(scenario, allow_code=allow_code)
    if as_json:
        import json

        from benchmarks.scenario_screen import checked_object

        text = json.dumps(checked_object(loaded), indent=2, allow_nan=False, ensure_ascii=False)
        click.echo(text)
        return
    from benchmarks.console import PipeAwareConsole
    from benchmarks.scenario_screen import print_scenario

    print_scenario(loaded, PipeAwareConsole())
