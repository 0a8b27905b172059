"""The console that tables are printed on."""

from __future__ import annotations

from typing import NoReturn

from rich.console import Console


class PipeAwareConsole(Console):
    """A rich console that leaves a closed pipe (`pulsewright list | head`) to whoever decides on exit statuses."""

    def on_broken_pipe(self) -> NoReturn:
        """Rich would leave with status 1, which here means that a gate failed. Raises BrokenPipeError."""
        raise BrokenPipeError
