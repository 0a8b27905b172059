"""A digest of everything a set of functions can reach: bodies, helpers, constants, parameter records.

The cache of compiled loops is keyed by it. numba stamps only a function's own file, so a change in a helper's file or in an
imported constant would go unseen; here it changes the key. What is neither digested nor known to be a library's is refused,
never passed over. Out of reach are the ways to teach numba new functions (numba.extending.overload and its kin).
"""

from __future__ import annotations

import dis
import enum
import hashlib
import sys
from collections.abc import Callable
from functools import lru_cache
from types import BuiltinFunctionType, CodeType, FunctionType, ModuleType
from typing import Any

import numpy as np
from numba.core.caching import NullCache
from numba.core.dispatcher import Dispatcher
from numba.core.types import Type

from programming.slots import Slot

_LIBRARIES = ("numba", "numpy", "math", "builtins", "llvmlite")
_PLAIN = (int, float, complex, bool, str, bytes, type(None), type(Ellipsis))


class NotDigestibleError(TypeError):
    """A compiled function reaches an object whose value cannot be pinned down."""


def code_digest(roots: dict[str, Any]) -> str:
    """SHA-256 (hex) over all that the named functions and values reach. Raises NotDigestibleError."""
    import llvmlite  # type: ignore[import-untyped]
    import numba

    walk = _Walk()
    walk.text(f"python {sys.version_info[:3]} numba {numba.__version__} llvmlite {llvmlite.__version__} numpy {np.__version__}")
    for name in sorted(roots):
        walk.text(f"root {name}")
        walk.value(roots[name], name)
    return walk.hash.hexdigest()


class _Walk:
    """Depth-first walk; every object that can be changed or can hold itself is described once, then by its number."""

    def __init__(self) -> None:
        self.hash = hashlib.sha256()
        self.seen: dict[Any, int] = {}
        self.keep: list[Any] = []

    def text(self, text: str) -> None:
        self.hash.update(text.encode("utf-8", "surrogatepass") + b"\0")

    def value(self, value: Any, name: str) -> None:
        if type(value) in _PLAIN:
            self.text(f"{type(value).__name__} {value!r}")
        elif isinstance(value, (tuple, frozenset)):
            # always in full: whether two equal constants are one object depends on where the bytecode came from
            self._items(value, name)
        elif self._first_time(id(value)):
            self.keep.append(value)
            self._describe(value, name)

    def _first_time(self, key: Any) -> bool:
        if key in self.seen:
            self.text(f"again {self.seen[key]}")
            return False
        self.seen[key] = len(self.seen)
        return True

    def _items(self, value: Any, name: str) -> None:
        items = sorted(value, key=repr) if isinstance(value, (set, frozenset)) else value
        self.text(f"{type(value).__name__} {len(items)}")
        if hasattr(value, "_fields"):
            self.value(type(value), name)
        for item in items:
            self.value(item, name)

    def _describe(self, value: Any, name: str) -> None:
        if isinstance(value, Dispatcher):
            self._compiled(value, name)
        elif _from_library(value):
            self.text(f"library {getattr(value, '__module__', '')}.{value.__name__}")
        elif isinstance(value, FunctionType):
            self._function(value)
        elif isinstance(value, CodeType):
            self._code(value)
        elif isinstance(value, (list, set)):
            self._items(value, name)
        elif isinstance(value, slice):
            self._items((value.start, value.stop, value.step), name)
        elif isinstance(value, np.ndarray) and not value.dtype.hasobject:
            self.text(f"array {value.dtype!r} {value.shape}")
            self.hash.update(np.ascontiguousarray(value).tobytes())
        elif isinstance(value, (np.generic, np.dtype, Type)):
            self.text(f"{type(value).__name__} {value!r}")
        elif isinstance(value, enum.Enum):
            self.text(f"member {value.name}")
            self.value(type(value), name)
        elif isinstance(value, Slot):
            self.text(f"slot {value.name}")
        elif isinstance(value, type) and (hasattr(value, "_fields") or issubclass(value, enum.Enum)):
            self._record_type(value)
        else:
            kind = f"class {value.__name__}" if isinstance(value, type) else type(value).__name__
            raise NotDigestibleError(f"{name}: compiled code reaches a {kind}, whose value cannot be pinned for the code cache")

    def _compiled(self, function: Any, name: str) -> None:
        if not isinstance(function._cache, NullCache):
            raise NotDigestibleError(f"{name}: has a cache of its own (cache=True), which can serve stale code")
        self.text("compiled")
        self.value(tuple(sorted(function.targetoptions.items())), name)
        self.value(function.py_func, name)

    def _function(self, function: Callable[..., Any]) -> None:
        assert isinstance(function, FunctionType)
        self.value(function.__defaults__, function.__name__)
        self.value(tuple(sorted((function.__kwdefaults__ or {}).items())), function.__name__)
        for cell in function.__closure__ or ():
            self.value(cell.cell_contents, function.__name__)
        self.value(function.__code__, function.__name__)
        names, attributes = _names(function.__code__)
        for name in names:
            if name in function.__globals__:
                self.text(f"global {name}")
                self._global(function.__globals__[name], name, attributes)

    def _global(self, value: Any, name: str, attributes: tuple[str, ...]) -> None:
        """A name's value; of a module, all that goes by a name the function uses as an attribute."""
        if not isinstance(value, ModuleType) or _from_library(value):
            self.value(value, name)
        elif self._first_time((id(value), attributes)):
            for attribute in attributes:
                if hasattr(value, attribute):
                    self.text(f"attribute {attribute}")
                    self._global(getattr(value, attribute), f"{name}.{attribute}", attributes)

    def _code(self, code: CodeType) -> None:
        self.hash.update(code.co_code + b"\0" + code.co_exceptiontable)
        self.text(repr((code.co_names, code.co_varnames, code.co_freevars, code.co_argcount, code.co_flags)))
        for constant in code.co_consts:
            self.value(constant, code.co_name)

    def _record_type(self, type_: Any) -> None:
        if issubclass(type_, enum.Enum):
            self.text(f"enum {type_.__name__} {[base.__name__ for base in type_.__mro__]}")
            self.value(tuple((member, type_[member].value) for member in type_.__members__), type_.__name__)
        else:
            self.text(f"record {type_.__name__} {type_._fields} {getattr(type_, '__annotations__', {})}")
            self.value(tuple(sorted(getattr(type_, "_field_defaults", {}).items())), type_.__name__)


@lru_cache(maxsize=4096)
def _names(code: CodeType) -> tuple[tuple[str, ...], tuple[str, ...]]:
    """Every global name, and every name that may be an attribute, in a code object and those nested in it."""
    names = {i.argval for i in dis.get_instructions(code) if i.opname in ("LOAD_GLOBAL", "LOAD_NAME")}
    attributes = set(code.co_names)
    for constant in code.co_consts:
        if isinstance(constant, CodeType):
            more, more_attributes = _names(constant)
            names.update(more)
            attributes.update(more_attributes)
    return tuple(sorted(names)), tuple(sorted(attributes))


def _from_library(value: Any) -> bool:
    """Whether this is a module, function or class of a library, known well enough by its name and the versions above."""
    if isinstance(value, ModuleType):
        return value.__name__.split(".")[0] in _LIBRARIES
    if isinstance(value, np.ufunc):
        return True
    if isinstance(value, BuiltinFunctionType) and not isinstance(value.__self__, (ModuleType, type(None))):
        return False
    known_by_name = isinstance(value, (type, FunctionType, BuiltinFunctionType)) or hasattr(value, "_implementation")
    module = getattr(value, "__module__", None) or ""
    return known_by_name and hasattr(value, "__name__") and module.split(".")[0] in _LIBRARIES
