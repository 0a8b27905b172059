"""How a command ends: every cause has one exit status and one line on standard error, never a bare traceback."""

from __future__ import annotations

import errno
import os
import signal
import sys
import threading
from collections.abc import Callable, Iterator, Sequence
from contextlib import contextmanager, suppress
from types import FrameType

import click

from benchmarks.errors import BadInputError, came_of_interrupt, one_line

_INTERRUPT_TEXT = "interrupted; nothing was left half-written"
DONE, GATE_FAILED, BAD_INPUT, OWN_FAULT, INTERRUPTED = 0, 1, 2, 3, 130

# What the user's machine refuses, as opposed to what we got wrong.
_USERS_TO_FIX = {
    errno.ENOSPC, errno.EDQUOT, errno.EFBIG, errno.EACCES, errno.EPERM, errno.EROFS, errno.ENOTDIR, errno.EISDIR,
    errno.ENAMETOOLONG, errno.ELOOP, errno.EIO, errno.EMFILE, errno.ENFILE,
}  # fmt: skip


def run_guarded(command: Callable[[], None], arguments: Sequence[str]) -> int:
    """Run a command and return its exit status; whatever goes wrong becomes one line on standard error.

    arguments: what the command was called with, for the report of a fault of ours.
    """
    try:
        with _termination_interrupts():
            command()
            sys.stdout.flush()
        return DONE
    except click.exceptions.Exit as ending:
        return _flushed(ending.exit_code)
    except click.ClickException as error:
        return _ended(BAD_INPUT, error.format_message())
    except BadInputError as error:
        return _ended(BAD_INPUT, str(error))
    except (KeyboardInterrupt, click.Abort):
        return _ended(INTERRUPTED, _INTERRUPT_TEXT)
    except BrokenPipeError:
        _discard_output()  # who read our output has gone: no message, there may be nobody to read it either
        return INTERRUPTED
    except MemoryError:
        return _ended(BAD_INPUT, "not enough memory: use a smaller array or fewer --workers")
    except OSError as error:
        if error.errno not in _USERS_TO_FIX:
            return _own_fault(error, arguments)
        where = error.filename if error.filename is not None else "the output"
        return _ended(BAD_INPUT, f"{os.fsdecode(where)}: {error.strerror}")
    except Exception as error:  # the last resort is the point of it
        if came_of_interrupt(error):
            return _ended(INTERRUPTED, _INTERRUPT_TEXT)
        return _own_fault(error, arguments)


def say(text: str) -> None:
    """One line on standard error."""
    with suppress(OSError, ValueError):
        click.echo(f"pulsewright: {one_line(text)}", err=True)


def _ended(status: int, text: str) -> int:
    with suppress(OSError):
        sys.stdout.flush()
    say(text)
    return _flushed(status)


def _flushed(status: int) -> int:
    """The status, after making sure that nothing is left in the buffers to fail once Python exits."""
    try:
        sys.stdout.flush()
    except OSError:
        _discard_output()
        return status or BAD_INPUT
    return status


def _own_fault(error: Exception, arguments: Sequence[str]) -> int:
    from benchmarks.fault_report import save_fault

    return _ended(OWN_FAULT, save_fault(error, arguments))


def _discard_output() -> None:
    """Send what is left of standard output nowhere, so that Python's own flush at exit does not fail again."""
    with suppress(OSError, ValueError, AttributeError):
        nowhere = os.open(os.devnull, os.O_WRONLY)
        os.dup2(nowhere, sys.stdout.fileno())
        os.close(nowhere)


@contextmanager
def _termination_interrupts() -> Iterator[None]:
    """SIGTERM ends a command the way Ctrl-C does: clean up, write nothing half, status 130."""
    if threading.current_thread() is not threading.main_thread():
        yield
        return

    def interrupt(_signal: int, _frame: FrameType | None) -> None:
        raise KeyboardInterrupt

    before = signal.signal(signal.SIGTERM, interrupt)
    try:
        yield
    finally:
        signal.signal(signal.SIGTERM, before)
