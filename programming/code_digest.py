"""A digest of everything a set of functions can reach: bodies, helpers, constants, parameter records.

The cache of compiled loops is keyed by it. numba stamps only a function's own file, so a change in a helper's file or in an
imported constant would go unseen; here it changes the key.
"""

from __future__ import annotations

import hashlib
import math
import sys
from collections.abc import Callable
from types import BuiltinFunctionType, CodeType, FunctionType, ModuleType
from typing import Any

import numpy as np

from programming.slots import Slot

_LIBRARIES = ("numba", "numpy", "math", "builtins", "llvmlite")
_PLAIN = (int, float, complex, bool, str, bytes, type(None), type(Ellipsis))


class NotDigestibleError(TypeError):
    """A compiled function reaches an object whose value cannot be pinned down."""


def code_digest(roots: dict[str, Any]) -> str:
    """SHA-256 (hex) over all that the named functions and values reach. Raises NotDigestibleError."""
    import llvmlite
    import numba

    walk = _Walk()
    walk.text(f"python {sys.version_info[:3]} numba {numba.__version__} llvmlite {llvmlite.__version__} numpy {np.__version__}")
    for name in sorted(roots):
        walk.text(f"root {name}")
        walk.value(roots[name], name)
    return walk.hash.hexdigest()


class _Walk:
    """Depth-first walk; every object is described once, then by its number."""

    def __init__(self) -> None:
        self.hash = hashlib.sha256()
        self.seen: dict[int, int] = {}
        self.keep: list[Any] = []

    def text(self, text: str) -> None:
        self.hash.update(text.encode() + b"\0")

    def value(self, value: Any, name: str) -> None:
        if isinstance(value, _PLAIN):
            self.text(f"{type(value).__name__} {value!r}")
        elif id(value) in self.seen:
            self.text(f"again {self.seen[id(value)]}")
        else:
            self.seen[id(value)] = len(self.seen)
            self.keep.append(value)
            self._describe(value, name)

    def _describe(self, value: Any, name: str) -> None:
        plain = getattr(value, "py_func", None)
        if plain is not None:
            self.text(f"compiled {sorted((k, repr(v)) for k, v in value.targetoptions.items())}")
            self.value(plain, name)
        elif isinstance(value, FunctionType):
            self._function(value)
        elif isinstance(value, CodeType):
            self._code(value)
        elif isinstance(value, (tuple, list, frozenset)):
            items = sorted(value, key=repr) if isinstance(value, frozenset) else value
            self.text(f"{type(value).__name__} {len(items)}")
            for item in items:
                self.value(item, name)
        elif isinstance(value, np.ndarray):
            self.text(f"array {value.dtype.str} {value.shape}")
            self.hash.update(np.ascontiguousarray(value).tobytes())
        elif isinstance(value, np.generic):
            self.text(f"{value.dtype.str} {value!r}")
        elif isinstance(value, Slot):
            self.text(f"slot {value.name}")
        elif isinstance(value, type):
            self._record_type(value)
        elif isinstance(value, (BuiltinFunctionType, np.ufunc)) or _from_library(value):
            self.text(f"library {getattr(value, '__module__', '')}.{getattr(value, '__name__', type(value).__name__)}")
        else:
            raise NotDigestibleError(
                f"{name}: compiled code reaches a {type(value).__name__}, whose value cannot be pinned for the code cache"
            )

    def _function(self, function: Callable[..., Any]) -> None:
        assert isinstance(function, FunctionType)
        self.value(function.__defaults__, function.__name__)
        for cell in function.__closure__ or ():
            self.value(cell.cell_contents, function.__name__)
        self._code(function.__code__)
        for name in _names(function.__code__):
            if name in function.__globals__:
                self.text(f"global {name}")
                self._global(function.__globals__[name], name, function.__code__)

    def _global(self, value: Any, name: str, code: CodeType) -> None:
        if not isinstance(value, ModuleType):
            self.value(value, name)
        elif value.__name__.split(".")[0] in _LIBRARIES:
            self.text(f"library {value.__name__}")
        else:
            for attribute in _names(code):
                if hasattr(value, attribute):
                    self.text(f"attribute {attribute}")
                    self._global(getattr(value, attribute), f"{name}.{attribute}", code)

    def _code(self, code: CodeType) -> None:
        self.hash.update(code.co_code)
        self.text(repr((code.co_names, code.co_varnames, code.co_freevars, code.co_argcount, code.co_flags)))
        for constant in code.co_consts:
            self.value(constant, code.co_name)

    def _record_type(self, type_: type) -> None:
        fields = getattr(type_, "_fields", None)
        if fields is not None:
            self.text(f"record {type_.__name__} {fields} {getattr(type_, '__annotations__', {})}")
            self.value(tuple(sorted(getattr(type_, "_field_defaults", {}).items())), type_.__name__)
        else:
            self.text(f"type {type_.__module__}.{type_.__qualname__}")


def _names(code: CodeType) -> list[str]:
    """Every global or attribute name used in a code object or in one nested in it."""
    names = set(code.co_names)
    for constant in code.co_consts:
        if isinstance(constant, CodeType):
            names.update(_names(constant))
    return sorted(names)


def _from_library(value: Any) -> bool:
    module = getattr(value, "__module__", None) or type(value).__module__
    return module.split(".")[0] in _LIBRARIES or value is math
