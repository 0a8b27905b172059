"""The digest behind the code cache: every kind of edit changes it, nothing else does, and what cannot be pinned is refused."""

import importlib.util
import os
import subprocess
import sys

import pytest

from programming.code_digest import NotDigestibleError, code_digest
from tests.scenario_files import environment

EDITS = {
    "number in the body": ("helper.py", "return x", "return x + 1"),
    "operator": ("helper.py", "return a * b", "return a + b"),
    "constant": ("helper.py", "GAIN = 1.0", "GAIN = 1.5"),
    "type of a constant": ("helper.py", "GAIN = 1.0", "GAIN = 1"),
    "sign of zero": ("helper.py", "ZERO = 0.0", "ZERO = -0.0"),
    "module attribute": ("helper.py", "FACTOR = 1.0", "FACTOR = 1.5"),
    "attribute of a module of a module": ("deeper.py", "DEPTH = 1", "DEPTH = 2"),
    "function of a module": ("helper.py", "return x - 1", "return x - 2"),
    "constant of a package's module": ("pack/inner.py", "SIZE = 1", "SIZE = 2"),
    "array": ("helper.py", "[5.0, 1.0]", "[5.0, 1.5]"),
    "type of an array": ("helper.py", "[5.0, 1.0])", "[5.0, 1.0], dtype=np.float32)"),
    "shape of an array": ("helper.py", "[5.0, 1.0])", "[[5.0, 1.0]])"),
    "tuple": ("helper.py", "LEVELS = (1, 2)", "LEVELS = (2, 1)"),
    "function in a tuple": ("helper.py", "return 3", "return 4"),
    "default argument": ("helper.py", "b=2.0", "b=2.5"),
    "closure": ("helper.py", "make(7.0)", "make(8.0)"),
    "body of a closure": ("helper.py", "return x * k", "return x / k"),
    "nested function": ("helper.py", "for i in range(3)", "for i in range(4)"),
    "default of the record": ("cell.py", "speed: float = 1.0", "speed: float = 2.0"),
    "order of the record": ("cell.py", "    a: float = 0.0\n    b: float = 0.0\n", "    b: float = 0.0\n    a: float = 0.0\n"),
    "member of an enumeration": ("helper.py", "FAST = 1", "FAST = 2"),
    "type used as a constant": ("helper.py", "KIND = numba.float64", "KIND = numba.float32"),
    "alias": ("cell.py", "from helper import first as chosen", "from helper import second as chosen"),
    "compile option": ("helper.py", "@njit(fastmath={'arcp', 'nsz'})", "@njit(fastmath={'arcp'})"),
    "exception handler": ("helper.py", "except ValueError", "except Exception"),
}
RICH_HELPER = """\
import enum
import numba
import numpy as np
import deeper
from numba import njit
from device_models.compiled import compiled

GAIN = 1.0
ZERO = 0.0
FACTOR = 1.0
TABLE = np.array([5.0, 1.0])
LEVELS = (1, 2)
KIND = numba.float64

class Mode(enum.IntEnum):
    FAST = 1

@compiled
def first(x): return x

@compiled
def second(x): return x * x

@compiled
def product(a, b=2.0): return a * b

@njit(fastmath={'arcp', 'nsz'})
def quick(x): return GAIN + ZERO + TABLE[0] + LEVELS[0] + Mode.FAST + KIND(x)

@compiled
def through_module(x): return x - 1

@compiled
def three(): return 3

CHOICES = (three,)

@compiled
def pick(): return CHOICES[0]()

def make(k):
    @compiled
    def scaled(x): return x * k
    return scaled

scaled = make(7.0)

@compiled
def nested():
    return sum([i for i in range(3)])

@compiled
def guarded(x):
    try:
        return product(x)
    except ValueError:
        return 0.0
"""
RICH_CELL = """\
from typing import NamedTuple
import helper as h
from helper import first as chosen, product, quick, pick, scaled, nested, guarded
from pack import inner

class Parameters(NamedTuple):
    speed: float = 1.0
    a: float = 0.0
    b: float = 0.0

def rate(voltage, p):
    x = chosen(voltage) + product(voltage) + quick(voltage) + pick() + scaled(voltage) + nested() + guarded(voltage)
    return Parameters(x).speed + h.FACTOR + h.through_module(x) + h.deeper.DEPTH + inner.SIZE
"""


def edit(path, old, new):
    text = path.read_text()
    assert old in text
    path.write_text(text.replace(old, new, 1))


def write_rich(folder):
    (folder / "pack").mkdir()
    texts = {"helper.py": RICH_HELPER, "cell.py": RICH_CELL, "deeper.py": "DEPTH = 1\nimport helper\n"}
    texts |= {"pack/__init__.py": "", "pack/inner.py": "SIZE = 1\n"}
    for name, text in texts.items():
        (folder / name).write_text(text)


def digest_of(folder, monkeypatch):
    """Digest of cell.rate, its file and all it imports read afresh."""
    own = ("helper", "deeper", "pack", "pack.inner")
    with monkeypatch.context() as patch:
        patch.syspath_prepend(str(folder))
        patch.setattr(sys, "dont_write_bytecode", True)
        for name in own:
            patch.delitem(sys.modules, name, raising=False)
        spec = importlib.util.spec_from_file_location("cell", folder / "cell.py")
        module = importlib.util.module_from_spec(spec)
        spec.loader.exec_module(module)
        for name in own:
            patch.delitem(sys.modules, name, raising=False)
        return code_digest({"rate": module.rate})


@pytest.mark.parametrize("kind", EDITS)
def test_every_kind_of_edit_changes_the_digest(kind, tmp_path, monkeypatch):
    write_rich(tmp_path)
    before = digest_of(tmp_path, monkeypatch)
    assert digest_of(tmp_path, monkeypatch) == before
    file, old, new = EDITS[kind]
    edit(tmp_path / file, old, new)
    assert digest_of(tmp_path, monkeypatch) != before


def test_what_is_not_reached_does_not_count(tmp_path, monkeypatch):
    write_rich(tmp_path)
    before = digest_of(tmp_path, monkeypatch)
    edit(tmp_path / "cell.py", "def rate", "# a remark\nUNUSED = 3\n\ndef rate")
    assert digest_of(tmp_path, monkeypatch) == before


def test_digest_does_not_depend_on_where_the_bytecode_came_from(tmp_path):
    write_rich(tmp_path)
    script = "import cell; from programming.code_digest import code_digest; print(code_digest({'rate': cell.rate}))"
    path = os.pathsep.join((str(tmp_path), environment()["PYTHONPATH"]))
    settings = environment() | {"PYTHONPYCACHEPREFIX": str(tmp_path / "bytecode"), "PYTHONPATH": path}
    settings.pop("PYTHONDONTWRITEBYTECODE", None)
    digests = set()
    for seed in ("1", "2"):
        settings["PYTHONHASHSEED"] = seed
        done = subprocess.run(
            [sys.executable, "-c", script], env=settings, capture_output=True, text=True, check=True, timeout=120
        )
        digests.add(done.stdout)
    assert len(digests) == 1
    assert list((tmp_path / "bytecode").rglob("helper*.pyc"))  # the second process did read bytecode


UNPINNED = {
    "dictionary": "X = {'a': 1}",
    "range": "X = range(3)",
    "open file": "X = open(__file__)",
    "generator of random numbers": "import numpy\nX = numpy.random.default_rng(1)",
    "object": "class Own:\n    a = 1\nX = Own()",
    "class with values": "class X:\n    a = 1",
    "array of objects": "import numpy\nX = numpy.array([{}], dtype=object)",
    "bound method": "X = [1].count",
    "C callback": "import numba\n@numba.cfunc('float64(float64)')\ndef X(x):\n    return 2 * x",
    "function with a cache of its own": "import numba\n@numba.njit(cache=True)\ndef X(x):\n    return 2 * x",
    "module in a tuple": "import tests.jobs\nX = (tests.jobs,)",
}


@pytest.mark.parametrize("kind", UNPINNED)
def test_what_cannot_be_pinned_is_refused(kind, tmp_path):
    path = tmp_path / "unpinned.py"
    path.write_text(UNPINNED[kind] + "\n\ndef rate(voltage):\n    return X\n")
    spec = importlib.util.spec_from_file_location("unpinned", path)
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    with pytest.raises(NotDigestibleError, match=r"X: "):
        code_digest({"rate": module.rate})
    if kind == "open file":
        module.X.close()
