"""The open places of the programming loop: what a device model and a strategy plug into it.

The loop is ordinary Python that calls these names. `programming.fuse` builds a copy of it in which each slot is replaced by
the compiled function of the model or strategy at hand, so that the whole is one piece of machine code.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any


@dataclass(frozen=True)
class Slot:
    """A place in the loop for one function (or record type) of a plug-in."""

    name: str

    def __call__(self, *arguments: Any) -> Any:
        """Never called: the fused loop holds the plug-in's function here. Raises RuntimeError."""
        raise RuntimeError(f"slot {self.name!r} is empty: the loop runs only after programming.fuse has filled it")


rate = Slot("rate")
advance = Slot("advance")
advance_mixed = Slot("advance_mixed")
conductance = Slot("conductance")
state_of = Slot("state_of")
bounds = Slot("bounds")
mean_conductance = Slot("mean_conductance")
record = Slot("record")
decide = Slot("decide")
