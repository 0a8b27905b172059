"""The device models that ship, and those that installed packages add."""

from __future__ import annotations

from importlib import import_module
from importlib.metadata import entry_points
from typing import cast

from device_models.contract import DeviceModel

# The one list of built-in models: name in a scenario -> "module:attribute". Loaded when asked for.
BUILT_IN = {
    "linear_ion_drift": "device_models.linear_ion_drift:MODEL",
    "voltage_threshold": "device_models.voltage_threshold:MODEL",
    "saturating_update": "device_models.saturating_update:MODEL",
}
ENTRY_POINT_GROUP = "pulsewright.devices"


def device_names() -> list[str]:
    """Names of all models: built-in ones first, then those of installed packages."""
    return [*BUILT_IN, *sorted(point.name for point in entry_points(group=ENTRY_POINT_GROUP))]


def load_device(name: str) -> DeviceModel:
    """The model of that name. Raises KeyError if there is none, TypeError if an entry point is not a DeviceModel."""
    if name in BUILT_IN:
        module, attribute = BUILT_IN[name].split(":")
        return cast(DeviceModel, getattr(import_module(module), attribute))
    for point in entry_points(group=ENTRY_POINT_GROUP, name=name):
        model = point.load()
        if not isinstance(model, DeviceModel):
            raise TypeError(f"entry point {name!r} of {ENTRY_POINT_GROUP} is a {type(model).__name__}, not a DeviceModel")
        return model
    raise KeyError(name)
