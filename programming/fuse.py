"""Compose a device model, a strategy and the programming loop into one compiled function, cached between processes.

The loop's own functions are plain Python that names slots. Here they are copied with the slots filled and compiled as one.
What numba caches is a tiny generated module in the user's cache folder, named by a digest of everything the loop reaches
(programming.code_digest), so a changed device, strategy, helper or constant gets another name and is compiled afresh.
"""

from __future__ import annotations

import threading
from collections.abc import Callable
from types import FunctionType
from typing import Any, NamedTuple

from numba import njit
from numba.core.dispatcher import Dispatcher

from device_models.contract import DeviceModel
from programming import calibration, die_loop, stress_history
from programming.code_cache import compiled_with_cache, has_machine_code, module_file
from programming.code_digest import code_digest
from programming.energy import simpson_conductance
from programming.slots import Slot
from programming.strategy_contract import CellStrategy


class Fused(NamedTuple):
    """The compiled functions of one model and one strategy. Each is compiled, or loaded, at its first call.

    program_die(plan, die, rules, die_number) and, before it where faults are clustered, draw_clusters(plan, die,
    die_number): see programming.die_loop. sample_cells: see programming.calibration.
    """

    program_die: Callable[..., None]
    draw_clusters: Callable[..., None]
    sample_cells: Callable[..., None]


_ENTRY = '''"""Generated: one model, one strategy and the programming loop, compiled together. Safe to delete."""


def program_die(plan, die, rules, die_number):
    loop(plan, die, rules, die_number)


def draw_clusters(plan, die, die_number):
    clusters(plan, die, die_number)


def sample_cells(base_values, varied, law, size, truncation, voltages, widths, doses, read_voltage, ranges):
    sample(base_values, varied, law, size, truncation, voltages, widths, doses, read_voltage, ranges)
'''
# The loop is inlined into one function, so that records of arrays are taken apart once, not copied at each call; and it
# is compiled without reference counting (it allocates nothing), which would otherwise be most of its time.
# Nothing inside is called from Python: no wrappers, which would be a third of the compile time.
_HELPER_OPTIONS: dict[str, Any] = {
    "error_model": "numpy",
    "nogil": True,
    "_nrt": False,
    "no_cpython_wrapper": True,
    "no_cfunc_wrapper": True,
    "fastmath": {"arcp", "contract"},
}
_LOOP_OPTIONS: dict[str, Any] = {**_HELPER_OPTIONS, "forceinline": True}
_ENTRY_OPTIONS: dict[str, Any] = {"error_model": "numpy", "nogil": True}
_draw_clusters = njit(**_ENTRY_OPTIONS)(die_loop.draw_clusters)
_fused: dict[str, Fused] = {}
_lock = threading.Lock()


def fuse(model: DeviceModel, strategy: CellStrategy) -> Fused:
    """The compiled loop for a model and a strategy.

    Raises programming.code_digest.NotDigestibleError if a plug-in reaches something that cannot be part of a cache key.
    """
    fillings = slot_fillings(model, strategy)
    digest = _digest(fillings)
    with _lock:
        if digest not in _fused:
            _fused[digest] = _compile(digest, fillings)
        return _fused[digest]


def _digest(fillings: dict[str, Any]) -> str:
    """What the loop with these fillings is called in the cache."""
    parts = {
        "loop": die_loop.program_die,
        "sample": calibration.sample_cells,
        "clusters": _draw_clusters,
        "composer": fill_slots.__code__,
    }
    options = (_ENTRY, tuple(sorted(_LOOP_OPTIONS.items())), tuple(sorted(_ENTRY_OPTIONS.items())))
    return code_digest({**parts, "options": options, **{f"slot {k}": v for k, v in fillings.items()}})


def needs_compiling(model: DeviceModel, strategy: CellStrategy) -> bool:
    """Whether the first die of this model and strategy will wait for the compiler, for want of a cached loop."""
    return not has_machine_code(_digest(slot_fillings(model, strategy)), "program_die")


def slot_fillings(model: DeviceModel, strategy: CellStrategy) -> dict[str, Any]:
    """Slot name -> compiled function, defaults included where the model leaves one out."""
    fillings: dict[str, Any] = {
        "rate": model.rate,
        "advance": model.advance,
        "conductance": model.conductance,
        "state_of": model.state_of,
        "bounds": model.bounds,
        "decide": strategy.decide,
        "record": _record_maker(model.Parameters),
    }
    fillings["advance_mixed"] = model.advance_mixed or fill_slots(stress_history.alternate, fillings)
    fillings["mean_conductance"] = model.mean_conductance or _simpson(fillings)
    return fillings


def fill_slots(
    function: Callable[..., Any],
    fillings: dict[str, Any],
    options: dict[str, Any] | None = None,
    copies: dict[FunctionType, Any] | None = None,
    tag: str = "",
) -> Any:
    """A compiled copy of a loop function and of all it calls, with the slots filled.

    Plain functions are parts of the loop, to be inlined. Compiled ones are helpers or a plug-in's: copied too, so that they
    are compiled with the loop's options. copies: those made before with the same fillings, to be shared; added to.
    tag: what tells these copies from those for other fillings; by default made of the fillings.
    """
    copies = {} if copies is None else copies
    tag = tag or _tag(fillings)
    begun: set[FunctionType] = set()

    def copy(original: FunctionType, options: dict[str, Any]) -> Any:
        if original not in copies:
            begun.add(original)
            names = dict(original.__globals__)
            for name in original.__code__.co_names:
                value = names.get(name)
                if isinstance(value, Slot):
                    value = fillings[value.name]
                if isinstance(value, Dispatcher) and value.py_func in begun - copies.keys():
                    names[name] = value  # a helper that calls itself goes on as it was compiled
                elif isinstance(value, Dispatcher) and value.py_func.__closure__ is None:
                    inline = value.targetoptions.get("forceinline", False)
                    names[name] = copy(value.py_func, _LOOP_OPTIONS if inline else _HELPER_OPTIONS)
                elif isinstance(value, FunctionType) and value.__module__.split(".")[0] == "programming":
                    names[name] = copy(value, _LOOP_OPTIONS)
                elif name in names:
                    names[name] = value
            filled = FunctionType(original.__code__, names, original.__name__, original.__defaults__)
            copies[original] = njit(**options)(_named_for(filled, tag))
        return copies[original]

    assert isinstance(function, FunctionType)
    return copy(function, options or _LOOP_OPTIONS)


def _named_for(function: FunctionType, tag: str) -> FunctionType:
    """The function under a name of its own.

    Machine code is linked by names, and numba's serial numbers begin anew in every process: two loops loaded from the cache
    could otherwise find each other's parts.
    """
    function.__name__ = function.__qualname__ = f"{function.__name__}_{tag}"
    return function


def _tag(fillings: dict[str, Any]) -> str:
    return code_digest({"composer": fill_slots.__code__, **{f"slot {k}": v for k, v in fillings.items()}})[:16]


def _record_maker(record_type: type[Any]) -> Any:
    """A compiled function from an array of values to the model's Parameters record."""
    fields = ", ".join(f"values[{i}]" for i in range(len(record_type._fields)))
    names: dict[str, Any] = {"Parameters": record_type, "__name__": __name__}
    exec(f"def record(values):\n    return Parameters({fields})\n", names)
    tag = code_digest({"record": record_type})[:16]
    return njit(error_model="numpy", nogil=True)(_named_for(names["record"], tag))


def _simpson(fillings: dict[str, Any]) -> Any:
    """mean_conductance for a model that has none: Simpson's rule over the trajectory of the pulse."""
    advance = fillings["advance"]
    rule = fill_slots(simpson_conductance, fillings)

    def mean_conductance(before, after, dose, voltage, p):  # type: ignore[no-untyped-def]
        return rule(before, advance(before, 0.5 * dose, p), after, voltage, p)

    assert isinstance(mean_conductance, FunctionType)
    return njit(error_model="numpy", nogil=True)(_named_for(mean_conductance, _tag(fillings)))


def _compile(digest: str, fillings: dict[str, Any]) -> Fused:
    """Put the generated module in the cache folder and hand its functions to numba with its cache on."""
    # numba looks the module up by name when it loads the compiled code: it must be one that can be imported
    copies: dict[FunctionType, Any] = {}
    names: dict[str, Any] = {
        "loop": fill_slots(die_loop.program_die, fillings, copies=copies, tag=digest[:16]),
        "sample": fill_slots(calibration.sample_cells, fillings, _ENTRY_OPTIONS, copies, digest[:16]),
        "clusters": _draw_clusters,
        "__name__": __name__,
    }
    exec(compile(_ENTRY, str(module_file(digest, _ENTRY)), "exec"), names)
    entries = (_named_for(names[name], digest[:16]) for name in Fused._fields)
    return Fused(*(compiled_with_cache(entry, _ENTRY_OPTIONS) for entry in entries))
