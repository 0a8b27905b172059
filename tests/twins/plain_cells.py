"""Plain twins of the device models: the differential equations as printed, marched in many small steps.

Imports nothing from the package. Slow and obvious: no closed form, no inversion, no Newton's rule. `rate` gives the
dose per second of a voltage, positive for SET; `speed` the change of the state per unit of dose while a dose of that
sign acts.
"""

import math

WINDOWS = ("none", "joglekar", "biolek", "prodromakis", "distance_left")
LAWS = ("linear_resistance", "exponential_resistance", "linear_conductance")


def window(name, p, x, rising):
    """Window function f(x), 0 <= x <= 1."""
    step = 0.0 if rising else 1.0
    return {
        "none": 1.0,
        "joglekar": 1.0 - abs(2 * x - 1) ** (2 * p),
        "biolek": 1.0 - abs(x - step) ** (2 * p),
        "prodromakis": 1.0 - ((x - 0.5) ** 2 + 0.75) ** p,
        "distance_left": 1.0 - x if rising else x,
    }[name]


class LinearIonDrift:
    """State x: conductive fraction."""

    low, high = 0.0, 1.0

    def __init__(self, values):
        self.v = values

    def resistance(self, x):
        return self.v["R_on"] * x + self.v["R_off"] * (1 - x)

    def rate(self, voltage):
        return self.v["mobility"] * self.v["R_on"] / self.v["thickness"] ** 2 * voltage

    def speed(self, x, sign):
        f = window(WINDOWS[int(self.v["window"])], self.v["window_exponent"], x, sign > 0)
        return sign * f / self.resistance(x)

    def conductance(self, x):
        return 1 / self.resistance(x)


class VoltageThreshold:
    """State x [m]: 0 is conductive; a dose is a length, positive towards x_on."""

    def __init__(self, values):
        self.v = values
        self.low, self.high = values["x_on"], values["x_off"]

    def rate(self, voltage):
        v = self.v
        if voltage > v["v_off"]:
            return -v["k_off"] * (voltage / v["v_off"] - 1) ** v["alpha_off"]
        if voltage < v["v_on"]:
            return -v["k_on"] * (voltage / v["v_on"] - 1) ** v["alpha_on"]
        return 0.0

    def speed(self, x, sign):
        u = (x - self.low) / (self.high - self.low)
        return -sign * window(WINDOWS[int(self.v["window"])], self.v["window_exponent"], u, sign < 0)

    def conductance(self, x):
        u = (x - self.low) / (self.high - self.low)
        R_on, R_off = self.v["R_on"], self.v["R_off"]
        law = LAWS[int(self.v["law"])]
        if law == "linear_resistance":
            return 1 / (R_on + (R_off - R_on) * u)
        if law == "exponential_resistance":
            return math.exp(-math.log(R_off / R_on) * u) / R_on
        return 1 / R_on + (1 / R_off - 1 / R_on) * u


class SaturatingUpdate:
    """State u: fraction of the conductance range."""

    low, high = 0.0, 1.0

    def __init__(self, values):
        self.v = values

    def rate(self, voltage):
        v = self.v
        side = "set" if voltage >= 0 else "reset"
        nominal, scale = v[f"{side}_voltage"], v[f"{side}_scale"]
        return v[f"{side}_rate"] * math.sinh(voltage / scale) / math.sinh(nominal / scale)

    def speed(self, u, sign):
        return 1 - u if sign > 0 else -u

    def conductance(self, u):
        return self.v["G_min"] + (self.v["G_max"] - self.v["G_min"]) * u


CELLS = {
    "linear_ion_drift": LinearIonDrift,
    "voltage_threshold": VoltageThreshold,
    "saturating_update": SaturatingUpdate,
}


def march(cell, state, dose, steps=3000):
    """State after a dose, and the average conductance on the way: midpoint steps, the state held in its range."""
    sign = 1.0 if dose > 0 else -1.0
    step = abs(dose) / steps

    def held(x):
        return min(max(x, cell.low), cell.high)

    total = 0.0
    for _ in range(steps):
        middle = held(state + 0.5 * step * cell.speed(state, sign))
        after = held(state + step * cell.speed(middle, sign))
        total += (cell.conductance(state) + 4 * cell.conductance(middle) + cell.conductance(after)) / 6
        state = after
    return state, total / steps
