"""The device models that ship, and those that installed packages add."""

from __future__ import annotations

from typing import cast

from device_models.contract import DeviceModel
from device_models.named_plugins import NamedPlugins

# The one list of built-in models.
BUILT_IN = {
    "linear_ion_drift": "device_models.linear_ion_drift:MODEL",
    "voltage_threshold": "device_models.voltage_threshold:MODEL",
    "saturating_update": "device_models.saturating_update:MODEL",
}
ENTRY_POINT_GROUP = "pulsewright.devices"
_DEVICES = NamedPlugins(BUILT_IN, ENTRY_POINT_GROUP, DeviceModel)


def device_names() -> list[str]:
    """Names of all models: built-in ones first, then those of installed packages."""
    return _DEVICES.names()


def load_device(name: str) -> DeviceModel:
    """The model of that name. Raises KeyError if there is none, TypeError if an entry point is not a DeviceModel."""
    return cast(DeviceModel, _DEVICES.load(name))
