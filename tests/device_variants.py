"""The cells that device tests run over: every model of the catalog, every set of it, every variant of its laws."""

from typing import Any, NamedTuple

from device_models import resistance_laws, windows
from device_models.catalog import device_names, load_device
from device_models.contract import DeviceModel
from device_models.contract_checks import parameters_of


class Variant(NamedTuple):
    """A model with one Parameters record; closed_flow, closed_mean: what must be exact up to rounding."""

    label: str
    model: DeviceModel
    p: Any
    closed_flow: bool
    closed_mean: bool


def _of_sets(model):
    for name, make in model.sets.items():
        yield Variant(f"{model.name}-{name}", model, parameters_of(model, make()), True, True)


def _of_laws(model):
    if "window" not in model.quantities:
        return
    default = parameters_of(model, model.sets[model.default_set]())
    laws = range(len(resistance_laws.CHOICES)) if "law" in model.quantities else [None]
    for code, window in enumerate(windows.CHOICES):
        for exponent in (1.0,) if window in ("none", "distance_left") else (1.0, 2.0):
            for law in laws:
                p = default._replace(window=float(code), window_exponent=exponent)
                label = f"{model.name}-{window}-p{exponent:.0f}"
                closed_mean = True
                if law is not None:
                    p = p._replace(law=float(law))
                    label += f"-{resistance_laws.CHOICES[law]}"
                    closed_mean = window == "none" or law == resistance_laws.LINEAR_CONDUCTANCE
                yield Variant(label, model, p, exponent == 1.0, closed_mean and exponent == 1.0)


VARIANTS = [v for name in device_names() for make in (_of_sets, _of_laws) for v in make(load_device(name))]
