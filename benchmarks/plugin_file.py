"""A user's own device or strategy, loaded from the Python file a scenario names: "my_cell.py:MODEL".

The file is code of the user's: it runs only when the command was given --allow-code. Whatever goes wrong in it is
theirs to put right, so every failure is a BadInputError with the file and the line.
"""

from __future__ import annotations

import hashlib
import importlib
import linecache
import re
import sys
import traceback
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from dataclasses import dataclass
from importlib.util import module_from_spec, spec_from_file_location
from pathlib import Path
from types import ModuleType
from typing import Generic, TypeVar

from benchmarks.errors import BadInputError, closest
from programming.code_digest import NotDigestibleError

Kind = TypeVar("Kind")


@dataclass(frozen=True)
class PluginFile(Generic[Kind]):
    """What was loaded: the object, the file it came from, and the source text of that file and of the helpers beside it."""

    object: Kind
    path: Path
    source: str


_HELPERS = "__pulsewright_helpers__"  # where a plug-in's module keeps the source of the helpers it imported


def is_plugin_reference(text: str) -> bool:
    """Whether a model or strategy names a file ("my_cell.py:MODEL") rather than a catalog entry."""
    file, _, _name = text.rpartition(":")
    return text.endswith(".py") or file.endswith(".py")


def load_plugin(reference: str, folder: Path, kind: type[Kind], allow_code: bool) -> PluginFile[Kind]:
    """The object a reference "file.py:Name" names, which must be a `kind`.

    folder: where the scenario file is; relative paths start there.
    Raises BadInputError, without the place in the scenario, which the caller adds.
    """
    file, _, name = reference.rpartition(":")
    if not file.endswith(".py") or not name.isidentifier():
        raise BadInputError(f'must name a file and an object in it, such as "my_cell.py:MODEL", got "{reference}"')
    if not allow_code:
        raise BadInputError(f'"{reference}" is Python code of yours, which runs only with --allow-code')
    path = (folder / file).resolve()
    module, source = _load_module(path, file)
    if not hasattr(module, name):
        public = [found for found in vars(module) if not found.startswith("_")]
        raise BadInputError(f"{file} has no {name!r}{closest(name, public)}")
    found = getattr(module, name)
    if not isinstance(found, kind):
        raise BadInputError(f"{name!r} in {file} must be a {kind.__name__}, is a {type(found).__name__}")
    return PluginFile(found, path, source)


def _load_module(path: Path, file: str) -> tuple[ModuleType, str]:
    """Run the file as a module of its own; a file of the same content that ran before is not run again."""
    try:
        source = path.read_text(encoding="utf-8")
    except (OSError, UnicodeDecodeError) as error:
        reason = error.strerror if isinstance(error, OSError) else "not UTF-8 text"
        raise BadInputError(f"cannot read {file}: {reason}") from error
    digest = hashlib.sha256(f"{path}\0{source}".encode("utf-8", "surrogatepass")).hexdigest()
    module_name = f"pulsewright_plugin_{digest[:16]}"
    if module_name in sys.modules:
        return sys.modules[module_name], source + getattr(sys.modules[module_name], _HELPERS, "")
    spec = spec_from_file_location(module_name, path)
    if spec is None:
        raise BadInputError(f"cannot read {file}: not a Python file")
    module = module_from_spec(spec)
    linecache.checkcache(str(path))
    sys.modules[module_name] = module
    try:
        with _imports_from(path.parent) as helpers:
            # compiled here and not by the import system, whose cache of bytecode goes by file times and can be stale
            exec(compile(source, str(path), "exec"), module.__dict__)
        module.__dict__[_HELPERS] = _sources_of(helpers)
    except KeyboardInterrupt:
        del sys.modules[module_name]
        raise
    except BaseException as error:
        del sys.modules[module_name]
        raise BadInputError(_in_user_code(error, path, file)) from error
    return module, source + getattr(module, _HELPERS)


@contextmanager
def _imports_from(folder: Path) -> Iterator[list[ModuleType]]:
    """While a user's file runs, modules beside it can be imported; gives the list of those that were.

    The folder stays on the path, behind everything else: helpers may import later, and must not hide installed packages.
    """
    if str(folder) not in sys.path:
        sys.path.append(str(folder))
    before, bytecode = set(sys.modules), sys.dont_write_bytecode
    found: list[ModuleType] = []
    sys.dont_write_bytecode = True  # an edit within the same second must not meet old bytecode
    importlib.invalidate_caches()
    try:
        yield found
    finally:
        sys.dont_write_bytecode = bytecode
        new = [module for name, module in sorted(sys.modules.items()) if name not in before]
        found += [m for m in new if getattr(m, "__file__", None) and Path(str(m.__file__)).is_relative_to(folder)]


def _sources_of(modules: Sequence[ModuleType]) -> str:
    """The source text of the user's helper modules, for the digest of an experiment."""
    return "".join(f"\0{m.__name__}\0{Path(str(m.__file__)).read_text(encoding='utf-8')}" for m in modules)


def _in_user_code(error: BaseException, path: Path, file: str) -> str:
    """ "my_cell.py, line 12: NameError: name 'x' is not defined"."""
    lines = [frame.lineno for frame in traceback.extract_tb(error.__traceback__) if frame.filename == str(path)]
    line = error.lineno if isinstance(error, SyntaxError) and error.filename == str(path) else (lines or [None])[-1]
    place = f"{file}, line {line}" if line is not None else file
    text = error.msg if isinstance(error, SyntaxError) else str(error)
    return f"{place}: {type(error).__name__}: {text.splitlines()[0] if text else 'no message'}"


@contextmanager
def blaming_user_code(files: Sequence[Path]) -> Iterator[None]:
    """Errors that come out of the user's files, or that the compiler has with them, become BadInputError."""
    try:
        yield
    except (BadInputError, OSError, MemoryError):
        raise
    except NotDigestibleError as error:
        raise BadInputError(f"{' or '.join(path.name for path in files)}: {error}") from error
    except Exception as error:
        for path in files:
            frames = [frame for frame in traceback.extract_tb(error.__traceback__) if frame.filename == str(path)]
            if frames:
                text = str(error).splitlines()[0] if str(error) else "no message"
                place = f"{path.name}, line {frames[-1].lineno}"
                raise BadInputError(f"{place}: {type(error).__name__}: {text}") from error
            if type(error).__module__.startswith("numba"):
                raise BadInputError(f"{path.name}: {_compiler_complaint(error, path)}") from error
        raise


def _compiler_complaint(error: Exception, path: Path) -> str:
    """Numba's many lines in one: what it could not compile, and the last line of the user's file it names."""
    lines = [line.strip() for line in str(error).splitlines() if line.strip()]
    places = [line for line in lines if line.startswith("File ") and path.name in line]
    numbers = re.findall(r"line (\d+)", places[-1]) if places else []
    telling = [line for line in lines if not line.startswith(("File ", "-", "During", "Failed in", "<source", "def "))]
    place = f"line {numbers[-1]}: " if numbers else ""
    return f"{place}cannot be compiled: {telling[0] if telling else type(error).__name__}"
