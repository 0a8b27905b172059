"""The progress bar on standard error."""

from __future__ import annotations

import sys
from collections.abc import Callable, Iterator
from contextlib import contextmanager


@contextmanager
def progress_bar(title: str, total: int, wanted: bool, first: str = "") -> Iterator[Callable[[], None]]:
    """Gives a function to call after each of `total` pieces of work; shows nothing unless wanted, and on a terminal.

    first: what to show in place of the title until the first piece is done, if that one takes longer for a reason.
    """
    if not wanted or not sys.stderr.isatty():
        yield lambda: None
        return
    from rich.console import Console
    from rich.progress import BarColumn, MofNCompleteColumn, Progress, TextColumn, TimeRemainingColumn

    columns = (TextColumn("{task.description}"), BarColumn(), MofNCompleteColumn(), TimeRemainingColumn())
    with Progress(*columns, console=Console(stderr=True), transient=True) as progress:
        task = progress.add_task(first or title, total=total)
        yield lambda: progress.update(task, advance=1, description=title)
