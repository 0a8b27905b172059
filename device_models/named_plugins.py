"""Plug-ins by name: the built-in ones of a literal list, and those that installed packages add as entry points."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from importlib import import_module
from importlib.metadata import entry_points
from typing import Any


@dataclass(frozen=True)
class NamedPlugins:
    """One kind of plug-in.

    built_in: name in a scenario -> "module:attribute", loaded when asked for. group: entry point group for others.
    kind: the type they must be.
    """

    built_in: Mapping[str, str]
    group: str
    kind: type[Any]

    def names(self) -> list[str]:
        """Built-in names first, then those of installed packages."""
        return [*self.built_in, *sorted(point.name for point in entry_points(group=self.group))]

    def load(self, name: str) -> Any:
        """The plug-in of that name. Raises KeyError if there is none, TypeError if an entry point is something else."""
        if name in self.built_in:
            module, attribute = self.built_in[name].split(":")
            return getattr(import_module(module), attribute)
        for point in entry_points(group=self.group, name=name):
            loaded = point.load()
            if not isinstance(loaded, self.kind):
                found, wanted = type(loaded).__name__, self.kind.__name__
                raise TypeError(f"entry point {name!r} of {self.group} is a {found}, not a {wanted}")
            return loaded
        raise KeyError(name)
