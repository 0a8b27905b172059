"""Plain twins of the cell strategies: the next pulse from the whole list of readings so far, no memory between calls.

Imports nothing from the package. A pulse is (direction, amplitude [V], width [s]) with direction +1 for SET and -1 for
RESET; None means the cell is left as it is. A train is a dictionary with start, step, stop, width, width_step, width_stop.
"""


def wanted(target, tolerance, reading):
    """+1: must rise, -1: must fall, 0: in the band."""
    if target - tolerance <= reading <= target + tolerance:
        return 0
    return 1 if reading < target else -1


def length_of_run(target, tolerance, readings):
    """How many of the last readings asked for the same direction as the very last one, that one not counted."""
    directions = [wanted(target, tolerance, reading) for reading in readings]
    count = 0
    for earlier in reversed(directions[:-1]):
        if earlier != directions[-1]:
            break
        count += 1
    return count


def climbed(start, step, stop, steps):
    """The staircase climbed one step at a time."""
    value = start
    for _ in range(steps):
        value = min(value + step, stop)
    return value


def identical_pulses(target, tolerance, readings, set_train, reset_train):
    direction = wanted(target, tolerance, readings[-1])
    if direction == 0:
        return None
    train = set_train if direction > 0 else reset_train
    return direction, train["start"], train["width"]


def amplitude_staircase(target, tolerance, readings, set_train, reset_train):
    direction = wanted(target, tolerance, readings[-1])
    if direction == 0:
        return None
    train = set_train if direction > 0 else reset_train
    steps = length_of_run(target, tolerance, readings)
    return direction, climbed(train["start"], train["step"], train["stop"], steps), train["width"]


def width_staircase(target, tolerance, readings, set_train, reset_train):
    direction = wanted(target, tolerance, readings[-1])
    if direction == 0:
        return None
    train = set_train if direction > 0 else reset_train
    steps = length_of_run(target, tolerance, readings)
    return direction, train["start"], climbed(train["width"], train["width_step"], train["width_stop"], steps)


def open_loop(target, pulses, low, high, set_train):
    """The amplitude goes from `start` to `stop` as the target goes from `low` to `high`."""
    if pulses > 0:
        return None
    share = (target - low) / (high - low)
    return 1, set_train["start"] * (1 - share) + set_train["stop"] * share, set_train["width"]
