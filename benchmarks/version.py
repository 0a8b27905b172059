"""Which version of the program this is."""

from __future__ import annotations


def version() -> str:
    """The version of the installed distribution, "not installed" when run from a folder that never was."""
    from importlib import metadata

    try:
        return metadata.version("pulsewright")
    except metadata.PackageNotFoundError:
        return "not installed"
