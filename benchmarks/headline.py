"""The quantities of a result that carry an interval, in the order in which they are shown everywhere."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any


@dataclass(frozen=True)
class Quantity:
    """One quantity: value and interval in SI units.

    unit: "%" marks a fraction, "" a pure number. healthy: truly stuck cells are left out.
    """

    name: str
    unit: str
    value: float | None
    interval: Sequence[float] | None
    healthy: bool = False

    @property
    def full_name(self) -> str:
        """The name as it stands on its own."""
        return f"{self.name}, without stuck cells" if self.healthy else self.name


def headline(result: Mapping[str, Any]) -> list[Quantity]:
    """All quantities with an interval of a result object."""
    responding = result["responding"]
    groups = [
        ("Pulses per cell", "", result["pulses_per_cell"], "mean", False),
        ("Verifies per cell", "", result["verifies_per_cell"], "mean", False),
        ("Final error, rms", "S", result["final_error_S"], "rms", False),
        ("Final error, rms", "S", responding["final_error_S"], "rms", True),
        ("In band", "%", result["in_band"], "fraction", False),
        ("In band", "%", responding["in_band"], "fraction", True),
        ("Disturbance, rms", "S", result["disturbance_S"], "rms", False),
        ("Energy per cell", "J", result["energy_J"], "per_cell", False),
        ("Time per cell", "s", result["time_s"], "per_cell", False),
    ]
    if "accuracy" in result:
        groups.append(("Accuracy", "%", result["accuracy"], "mean", False))
    return [Quantity(name, unit, group[key], group["ci95"], healthy) for name, unit, group, key, healthy in groups]
