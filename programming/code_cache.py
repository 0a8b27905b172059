"""Where compiled loops are kept between processes: generated modules in the user's cache folder, each with its machine code.

numba's own cache does the work. A folder that cannot be written, a full disk or a damaged file means compiling again,
never failing.
"""

from __future__ import annotations

import contextlib
import os
import tempfile
from collections.abc import Callable
from pathlib import Path
from typing import Any

from numba import njit
from numba.core.caching import FunctionCache

CACHE_VARIABLE = "PULSEWRIGHT_CACHE_DIR"


def cache_folder() -> Path:
    """Where compiled loops are kept: $PULSEWRIGHT_CACHE_DIR, or the user's cache folder."""
    chosen = os.environ.get(CACHE_VARIABLE)
    if chosen:
        return Path(chosen)
    from platformdirs import user_cache_path

    return user_cache_path("pulsewright")


def module_path(digest: str) -> Path:
    """Where the generated module of that digest is, or would be."""
    return cache_folder() / f"loop_{digest[:40]}.py"


def module_file(digest: str, source: str) -> Path:
    """The generated module of that digest, written whole or not at all. Where it cannot be written, it just isn't there."""
    path = module_path(digest)
    with contextlib.suppress(OSError):
        path.parent.mkdir(parents=True, exist_ok=True)
        if not path.exists():
            handle, temporary = tempfile.mkstemp(dir=path.parent, suffix=".tmp")
            with os.fdopen(handle, "w") as file:
                file.write(source)
            os.replace(temporary, path)
    return path


def has_machine_code(digest: str, function: str) -> bool:
    """Whether the cache holds compiled code for that function of the module of that digest."""
    path = module_path(digest)
    return any((path.parent / "__pycache__").glob(f"{path.stem}.{function}_*.nbc"))


def compiled_with_cache(function: Callable[..., Any], options: dict[str, Any]) -> Any:
    """A function of a generated module, compiled at its first call or loaded from the cache."""
    dispatcher = njit(**options)(function)
    with contextlib.suppress(RuntimeError):  # numba finds no place to keep it: compiled for this process only
        dispatcher._cache = _ForgivingCache(function)  # type: ignore[no-untyped-call]
    return dispatcher


class _ForgivingCache(FunctionCache):
    """numba's cache of one function, for which no cached code is the worst that can happen."""

    def load_overload(self, sig: Any, target_context: Any) -> Any:
        try:
            return super().load_overload(sig, target_context)  # type: ignore[no-untyped-call]
        except Exception:  # whatever comes of unpickling a file that was cut off
            with contextlib.suppress(OSError):
                self.flush()  # type: ignore[no-untyped-call]
            return None

    def save_overload(self, sig: Any, data: Any) -> None:
        with contextlib.suppress(OSError):
            super().save_overload(sig, data)  # type: ignore[no-untyped-call]
