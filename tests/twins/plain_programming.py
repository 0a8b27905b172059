"""Plain twin of the programming loop: every pulse steps every cell it touches, one after another, at once.

Imports nothing from the package. It knows two cells: one with voltage thresholds (linear conductance, change proportional
to the distance left) and one with sinh kinetics and no dead zone. Array operations stand for "for every cell" loops.
"""

import math

import numpy as np

from tests.twins import plain_random as draws


class ThresholdCell:
    """State u from 0 (lowest conductance) to 1. SET is the negative polarity."""

    polarity = -1

    def __init__(self, values):
        self.v = values  # name -> array over cells

    def dose(self, voltage, width, cells):
        v = {name: array[cells] for name, array in self.v.items()}
        span = v["x_off"] - v["x_on"]
        on, off = np.zeros_like(span), np.zeros_like(span)
        if voltage < 0:
            over = np.maximum(voltage / v["v_on"] - 1, 0)
            on = -v["k_on"] * over ** v["alpha_on"] * width / span
        if voltage > 0:
            over = np.maximum(voltage / v["v_off"] - 1, 0)
            off = v["k_off"] * over ** v["alpha_off"] * width / span
        return on - off

    def ends(self):
        return 1 / self.v["R_off"], 1 / self.v["R_on"]


class SinhCell:
    """State u from 0 to 1; dose r sinh(V / scale), no dead zone. SET is the positive polarity."""

    polarity = 1

    def __init__(self, low, high, r_set, r_reset, scale_set, scale_reset):
        self.low, self.high = low, high
        self.r_set, self.r_reset, self.scale_set, self.scale_reset = r_set, r_reset, scale_set, scale_reset

    def dose(self, voltage, width, cells):
        if voltage >= 0:
            return self.r_set[cells] * np.sinh(voltage / self.scale_set[cells]) * width
        return self.r_reset[cells] * np.sinh(voltage / self.scale_reset[cells]) * width

    def ends(self):
        return self.low, self.high


def moved(u, dose):
    """du/ds = 1 - u going up, -u going down."""
    return np.where(dose >= 0, 1 - (1 - u) * np.exp(-np.abs(dose)), u * np.exp(-np.abs(dose)))


class Bench:
    """One die under an amplitude staircase. `s` holds the settings by name."""

    def __init__(self, cell, s, start_S, target_S, die=0, stress_rng=None):
        self.cell, self.s, self.die, self.stress_rng = cell, s, die, stress_rng
        self.low, self.high = cell.ends()
        self.u = (start_S - self.low) / (self.high - self.low)
        self.own = self.u.copy()
        self.target = target_S
        count = target_S.size
        self.pulses, self.reads = np.zeros(count, int), np.zeros(count, int)
        self.status = np.zeros(count, int)
        self.energy = dict.fromkeys(("selected", "half_selected", "rest", "verify"), 0.0)
        self.row, self.column = np.divmod(np.arange(count), s["columns"])

    def conductance(self):
        return self.low + (self.high - self.low) * self.u

    def read(self, c):
        g = float(self.conductance()[c])
        key = (self.s["seed"], self.die, c, draws.READ, int(self.reads[c]), 0)
        z = draws.normal(*key)
        self.reads[c] += 1
        row = self.conductance()[self.row == self.row[c]].sum()
        self.energy["verify"] += self.s["read_voltage"] ** 2 * row * self.s["integration"]
        return g + math.sqrt(g * (self.s["noise_linear"] + self.s["noise_square"] * g)) * z

    def pulse(self, c, direction, amplitude, width):
        voltage = amplitude * direction * self.cell.polarity
        g = self.conductance()
        same_row = (self.row == self.row[c]) & (self.column != self.column[c])
        same_column = (self.column == self.column[c]) & (self.row != self.row[c])
        rest = (self.row != self.row[c]) & (self.column != self.column[c])
        classes = ((same_row, 1 - self.s["bit"]), (same_column, self.s["word"]), (rest, self.s["word"] - self.s["bit"]))
        for which, fraction in classes:
            part = "rest" if which is rest else "half_selected"
            self.energy[part] += (fraction * amplitude) ** 2 * width * g[which].sum()
            if fraction != 0:
                dose = self.cell.dose(fraction * voltage, width, np.flatnonzero(which))
                if self.stress_rng is not None and self.s["cycle"] > 0:
                    sigma = math.sqrt(math.log1p(self.s["cycle"] ** 2))
                    dose = dose * np.exp(sigma * self.stress_rng.standard_normal(dose.size) - sigma**2 / 2)
                self.u[which] = moved(self.u[which], dose)
        dose = float(self.cell.dose(voltage, width, np.array([c]))[0])
        if self.s["cycle"] > 0 and dose != 0:
            sigma = math.sqrt(math.log1p(self.s["cycle"] ** 2))
            z = draws.normal(self.s["seed"], self.die, c, draws.CYCLE, int(self.pulses[c]), 0)
            dose *= math.exp(sigma * z - sigma**2 / 2)
        before = float(self.u[c])
        self.u[c] = moved(before, dose)
        self.energy["selected"] += amplitude**2 * width * self._mean_conductance(c, before, dose)
        self.pulses[c] += 1
        self.own[c] = self.u[c]

    def _mean_conductance(self, c, before, dose):
        """Mean over the pulse by brute force: 2000 points of the trajectory, midpoint rule."""
        share = (np.arange(2000) + 0.5) / 2000
        u = moved(np.full(2000, before), dose * share)
        return float(self.low[c] + (self.high[c] - self.low[c]) * u.mean())

    def visit(self, c):
        reading, direction, step = self.read(c), 0, 0
        for given in range(self.s["max_pulses"] + 1):
            if abs(reading - self.target[c]) <= self.s["tolerance"]:
                self.status[c] = 1
                return
            if given == self.s["max_pulses"]:
                self.status[c] = 2
                return
            wanted = 1 if reading < self.target[c] else -1
            direction, step = (wanted, step + 1) if wanted == direction else (wanted, 0)
            train = self.s["set"] if wanted > 0 else self.s["reset"]
            amplitude = min(train["start"] + step * train["step"], train["stop"])
            self.pulse(c, wanted, round(amplitude / self.s["resolution"]) * self.s["resolution"], train["width"])
            reading = self.read(c)

    def run(self, order, passes=1):
        for _ in range(passes):
            for c in order:
                self.visit(int(c))
        return self
