"""Run by test_code_cache in a process of its own: fuse a user's device and strategy with a tiny loop, and say what it does.

Argument: the folder of the user's files. Prints one JSON object: the two results, and how many functions were compiled.
"""

import json
import sys
from pathlib import Path

import numpy as np
from numba.core.event import install_recorder

from benchmarks.plugin_file import load_plugin
from device_models.contract import DeviceModel
from programming import fuse
from programming.slots import decide, rate, record
from programming.strategy_contract import CellStrategy


def tiny_loop(plan, die, rules, die_number):
    """In place of the programming loop, which takes long to compile: ask the device and the strategy once."""
    die[0] = rate(1.0, record(plan))
    die[1] = decide(0.0, 0.0, 0.0, 0, die, rules)[1]


def main(folder):
    sys.path.insert(0, str(folder))  # for the helper
    fuse.die_loop.program_die = tiny_loop
    model = load_plugin("cell.py:MODEL", folder, DeviceModel, True).object
    strategy = load_plugin("plan.py:STRATEGY", folder, CellStrategy, True).object
    out = np.zeros(2)
    with install_recorder("numba:compile") as compiled:
        fuse.fuse(model, strategy).program_die(np.ones(len(model.Parameters._fields)), out, 0.0, 0)
    print(json.dumps({"rate": out[0], "amplitude": out[1], "compiled": len(compiled.buffer)}))


main(Path(sys.argv[1]))
