"""The metrics of a run by plain loops over all cells of all dies, kept in memory; imports nothing from the package.

A die is a dictionary: lists target, final, disturbance, pulses, verifies, status (by name), stuck (bool), in_band, share
(three per cell), energy (six: selected, half_selected, rest, verify, lines, supply) and the numbers time and score.
"""

import math


def interval(totals, counts, t):
    """Ratio of totals over dies with its t interval, in two passes over the dies."""
    dies = len(totals)
    ratio = sum(totals) / sum(counts)
    if dies < 2:
        return ratio, None
    squares = sum((y - ratio * n) ** 2 for y, n in zip(totals, counts, strict=True))
    error = math.sqrt(dies / (dies - 1) * squares) / sum(counts)
    return ratio, [ratio - t * error, ratio + t * error]


def mean(totals, counts, t):
    ratio, limits = interval(totals, counts, t)
    return {"mean": ratio, "ci95": limits}


def root(totals, counts, t):
    ratio, limits = interval(totals, counts, t)
    if limits is None:
        return math.sqrt(ratio), None
    relative = (limits[1] - ratio) / ratio
    return math.sqrt(ratio), [math.sqrt(ratio) * math.exp(-relative / 2), math.sqrt(ratio) * math.exp(relative / 2)]


def fraction(hits, counts, t):
    p, limits = interval(hits, counts, t)
    if limits is None:
        return {"fraction": p, "ci95": None}
    cells = sum(counts)
    effective = cells
    if 0 < p < 1:
        variance = ((limits[1] - p) / t) ** 2
        effective = p * (1 - p) / max(variance, p * (1 - p) / cells)
    centre = (p + t * t / (2 * effective)) / (1 + t * t / effective)
    half = t / (1 + t * t / effective) * math.sqrt(p * (1 - p) / effective + t * t / (4 * effective**2))
    return {"fraction": p, "ci95": [centre - half, centre + half]}


def error_of(dies, chosen, t):
    """rms, mean and largest error over the cells for which chosen(die, cell)."""
    sums, squares, counts, largest = [], [], [], 0.0
    for die in dies:
        errors = [die["final"][c] - die["target"][c] for c in range(len(die["target"])) if chosen(die, c)]
        sums.append(sum(errors))
        squares.append(sum(e * e for e in errors))
        counts.append(len(errors))
        largest = max([largest, *(abs(e) for e in errors)])
    rms, limits = root(squares, counts, t)
    return {"rms": rms, "ci95": limits, "mean": sum(sums) / sum(counts), "max": largest}


def fraction_of(dies, chosen, t):
    hits = [sum(die["in_band"][c] for c in range(len(die["target"])) if chosen(die, c)) for die in dies]
    counts = [sum(1 for c in range(len(die["target"])) if chosen(die, c)) for die in dies]
    return fraction(hits, counts, t)


def addressed(die, cell):
    return not math.isnan(die["target"][cell])


def healthy(die, cell):
    return addressed(die, cell) and not die["stuck"][cell]


def count(dies, test):
    return sum(1 for die in dies for c in range(len(die["target"])) if addressed(die, c) and test(die, c))


def quantile(values, numerator, denominator):
    """Smallest value with at least numerator/denominator of all values at or below it."""
    values = sorted(values)
    return values[math.ceil(numerator * len(values) / denominator) - 1]


def cell_counts(dies):
    return {
        "addressed": count(dies, lambda die, c: True),
        "accepted": count(dies, lambda die, c: die["status"][c] == "accepted"),
        "in_band": count(dies, lambda die, c: die["in_band"][c]),
        "gave_up": count(dies, lambda die, c: die["status"][c] == "gave_up"),
        "stuck": count(dies, lambda die, c: die["status"][c] == "stuck"),
        "stuck_missed": count(dies, lambda die, c: die["stuck"][c] and die["status"][c] != "stuck"),
        "stuck_false": count(dies, lambda die, c: not die["stuck"][c] and die["status"][c] == "stuck"),
    }


def per_cell(dies, key, t):
    totals = [sum(die[key][c] for c in range(len(die[key])) if addressed(die, c)) for die in dies]
    return mean(totals, sizes(dies), t)


def sizes(dies):
    return [sum(1 for c in range(len(die["target"])) if addressed(die, c)) for die in dies]


def level_list(dies, levels, t):
    """Error and fraction in band of the cells nearest to each level."""
    result = []
    for level in levels:

        def chosen(die, c, level=level):
            nearest = min(levels, key=lambda candidate: abs(candidate - die["target"][c]))
            return addressed(die, c) and nearest == level

        error = error_of(dies, chosen, t)
        result.append(
            {
                "target_S": level,
                "cells": count(dies, chosen),
                "error": {"rms_S": error["rms"], "ci95": error["ci95"], "mean_S": error["mean"]},
                "in_band": fraction_of(dies, chosen, t),
            }
        )
    return result


def disturbance_of(dies, t):
    cells = [len(die["disturbance"]) for die in dies]
    rms, limits = root([sum(d * d for d in die["disturbance"]) for die in dies], cells, t)
    classes = []
    for k in range(3):
        shares = [(d * s[k]) ** 2 for die in dies for d, s in zip(die["disturbance"], die["share"], strict=True)]
        classes.append(math.sqrt(sum(shares) / len(shares)))
    largest = max(abs(d) for die in dies for d in die["disturbance"])
    return {"rms": rms, "ci95": limits, "max": largest, "same_row": classes[0], "same_column": classes[1],
            "rest": classes[2]}  # fmt: skip


def energy_of(dies, t):
    names = ("selected", "half_selected", "rest", "verify", "lines", "supply")
    parts = {name: sum(die["energy"][k] for die in dies) / sum(sizes(dies)) for k, name in enumerate(names)}
    total, limits = interval([sum(die["energy"][:5]) for die in dies], sizes(dies), t)
    return {"per_cell": total, "ci95": limits, **parts}


def plain_result(dies, levels, t):
    """The measured part of a result object. t: the quantile of Student's t for this number of dies."""
    pulses = [die["pulses"][c] for die in dies for c in range(len(die["target"])) if addressed(die, c)]
    time, limits = interval([die["time"] for die in dies], sizes(dies), t)
    return {
        "cells": cell_counts(dies),
        "pulses_per_cell": {
            **per_cell(dies, "pulses", t),
            "p50": quantile(pulses, 1, 2),
            "p99": quantile(pulses, 99, 100),
            "p999": quantile(pulses, 999, 1000),
            "max": max(pulses),
        },
        "verifies_per_cell": per_cell(dies, "verifies", t),
        "final_error_S": error_of(dies, addressed, t),
        "in_band": fraction_of(dies, addressed, t),
        "responding": {"final_error_S": error_of(dies, healthy, t), "in_band": fraction_of(dies, healthy, t)},
        "levels": level_list(dies, levels, t),
        "disturbance_S": disturbance_of(dies, t),
        "energy_J": energy_of(dies, t),
        "time_s": {"per_cell": time, "ci95": limits, "array": sum(die["time"] for die in dies) / len(dies)},
    }
