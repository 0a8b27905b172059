"""Arguments and options that several commands share."""

from __future__ import annotations

from typing import Any

import click


class WholeNumber(click.ParamType):  # type: ignore[type-arg,unused-ignore]
    """A whole number between two limits, which belong to the range."""

    name = "whole number"

    def __init__(self, low: int, high: int) -> None:
        """The limits."""
        self.low, self.high = low, high

    def convert(self, value: Any, param: click.Parameter | None, ctx: click.Context | None) -> int:
        """The number that stood on the command line. Raises click.BadParameter."""
        try:
            number = int(value)
        except ValueError:
            self.fail(f"must be a whole number, got {value!r}", param, ctx)
        if not self.low <= number <= self.high:
            self.fail(f"must be {self.low} to {self.high}, got {number}", param, ctx)
        return number


scenario = click.argument("scenario", metavar="SCENARIO")
as_json = click.option("--json", "as_json", is_flag=True, help="One JSON object on standard output.")
allow_code = click.option("--allow-code", is_flag=True, help="Run the Python files that the scenario names.")
