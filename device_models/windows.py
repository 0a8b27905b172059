"""Window functions: how the speed of a state between 0 and 1 falls off towards its ends.

A state u moves with a dose q (positive: rising) as du/dq = f(u). The windows f, with exponent p:

    none             1                              both directions; u stops at 0 and 1
    joglekar         1 - (2u - 1)^(2p)              both directions
    biolek           1 - u^(2p) rising, 1 - (1 - u)^(2p) falling
    prodromakis      1 - [(u - 0.5)^2 + 0.75]^p     both directions; its peak is 1 - 0.75^p, not 1
    distance_left    1 - u rising, u falling        the change is proportional to the distance left

Sources: Joglekar & Wolf, Eur. J. Phys. 30:661 (2009), eq. for the window with parameter p; Biolek, Biolek & Biolkova,
Radioengineering 18:210 (2009); Prodromakis et al., IEEE Trans. Electron Devices 58:3099 (2011) with scale j = 1;
distance_left is the soft bound of Fusi & Abbott, Nature Neurosci. 10:485 (2007). Equation numbers not at hand: the
formulas are cited from memory.

The ends of the Joglekar and Prodromakis windows are absorbing: a state at exactly 0 or 1 could never leave. Here such
a state is held EDGE inside, so that a cell driven to an end (or set up there) can be brought back.
"""

from __future__ import annotations

from math import ceil, exp, expm1, log, log1p, pow, tanh

from device_models.compiled import compiled

CHOICES = ("none", "joglekar", "biolek", "prodromakis", "distance_left")
# Codes as floats: a parameter record holds floats only, so that every model compiles to one signature.
NONE, JOGLEKAR, BIOLEK, PRODROMAKIS, DISTANCE_LEFT = 0.0, 1.0, 2.0, 3.0, 4.0

EDGE = 1e-9
# Runge-Kutta sub-steps are this long, in units of 1 / (4p), the shortest time constant of the windows.
SUB_STEP = 0.04
# More dose than any window needs from one end to the other, where it would only cost sub-steps.
LARGEST_DOSE = 1e6


@compiled
def window(kind: float, exponent: float, u: float, rising: bool) -> float:
    """f(u) of the window `kind` (a code above) with exponent p; u in 0..1, all without unit."""
    if kind == DISTANCE_LEFT:
        return 1.0 - u if rising else u
    if kind == JOGLEKAR:
        return 1.0 - pow(abs(2.0 * u - 1.0), 2.0 * exponent)
    if kind == BIOLEK:
        return 1.0 - pow(u if rising else 1.0 - u, 2.0 * exponent)
    if kind == PRODROMAKIS:
        return 1.0 - pow((u - 0.5) * (u - 0.5) + 0.75, exponent)
    return 1.0


@compiled
def inside(kind: float, u: float) -> float:
    """u clipped to 0..1, and to EDGE inside that where the ends of the window are absorbing."""
    edge = EDGE if kind in (JOGLEKAR, PRODROMAKIS) else 0.0
    return min(max(u, edge), 1.0 - edge)


@compiled
def closed_form(kind: float, exponent: float) -> bool:
    """Whether flow and mean_state have a closed form: no window, distance_left, and the others at p = 1."""
    return kind in (DISTANCE_LEFT, NONE) or exponent == 1.0


@compiled
def flow(kind: float, exponent: float, u: float, dose: float) -> float:
    """The state after a dose (positive: rising), from a state u in 0..1.

    Closed form where there is one (see closed_form), else fourth-order Runge-Kutta, better than 1e-6 relative.
    """
    if kind == DISTANCE_LEFT:
        if dose < 0.0:
            return u * exp(dose)
        return 1.0 - (1.0 - u) * exp(-dose)
    if kind == NONE:
        return min(max(u + dose, 0.0), 1.0)
    if exponent == 1.0:
        if kind == BIOLEK:
            return _biolek_flow(u, dose)
        return inside(kind, _logistic_flow(inside(kind, u), _logistic_rate(kind) * dose))
    limited = min(max(dose, -LARGEST_DOSE), LARGEST_DOSE)
    sub_steps = ceil(abs(limited) * 4.0 * exponent / SUB_STEP)
    return inside(kind, runge_kutta(kind, exponent, inside(kind, u), limited, sub_steps))


@compiled
def _logistic_rate(kind: float) -> float:
    # With p = 1 the Joglekar window is 4 u (1 - u) and that of Prodromakis u (1 - u).
    return 4.0 if kind == JOGLEKAR else 1.0


@compiled
def _logistic_flow(u: float, dose: float) -> float:
    if dose < 0.0:
        grown = u * exp(dose)
        return grown / (1.0 - u + grown)
    return u / (u + (1.0 - u) * exp(-dose))


@compiled
def _biolek_flow(u: float, dose: float) -> float:
    if dose < 0.0:
        # u / (2 - u) decays as exp(-2 |dose|)
        decayed = u * exp(2.0 * dose)
        return 2.0 * decayed / (2.0 - u + decayed)
    moved = tanh(dose)
    return (u + moved) / (1.0 + u * moved)


@compiled
def runge_kutta(kind: float, exponent: float, u: float, dose: float, sub_steps: int) -> float:
    """The state after a dose by the classical fourth-order rule in equal sub-steps; stops EDGE before an end."""
    if sub_steps == 0:
        return u
    step = dose / sub_steps
    rising = dose > 0.0
    direction = 1.0 if rising else -1.0
    half = 0.5 * abs(step) * direction
    for _ in range(sub_steps):
        if (rising and u >= 1.0 - EDGE) or (not rising and u <= EDGE):
            break
        k1 = window(kind, exponent, u, rising)
        k2 = window(kind, exponent, u + half * k1, rising)
        k3 = window(kind, exponent, u + half * k2, rising)
        k4 = window(kind, exponent, u + step * k3, rising)
        u += step * (k1 + 2.0 * k2 + 2.0 * k3 + k4) / 6.0
    return min(max(u, 0.0), 1.0)


@compiled
def mixed_flow(kind: float, exponent: float, u: float, rising: float, falling: float) -> float:
    """The state after doses of both directions (both >= 0), finely interleaved.

    distance_left relaxes towards rising / (rising + falling); windows that are the same in both directions see the
    difference; Biolek's by fourth-order Runge-Kutta until the balance is reached.
    """
    if rising == 0.0 or falling == 0.0:
        return flow(kind, exponent, u, rising - falling)
    total = rising + falling
    if kind == DISTANCE_LEFT:
        goal = rising / total
        return goal + (u - goal) * exp(-total)
    if kind != BIOLEK:
        return flow(kind, exponent, u, rising - falling)
    sub_steps = ceil(min(total, LARGEST_DOSE) * 4.0 * exponent / SUB_STEP)
    up, down = rising / sub_steps, falling / sub_steps
    for _ in range(sub_steps):
        k1 = _balance(exponent, u, up, down)
        k2 = _balance(exponent, u + 0.5 * k1, up, down)
        k3 = _balance(exponent, u + 0.5 * k2, up, down)
        k4 = _balance(exponent, u + k3, up, down)
        change = (k1 + 2.0 * k2 + 2.0 * k3 + k4) / 6.0
        u += change
        if abs(change) < 1e-16:
            break
    return min(max(u, 0.0), 1.0)


@compiled
def _balance(exponent: float, u: float, up: float, down: float) -> float:
    return up * window(BIOLEK, exponent, u, True) - down * window(BIOLEK, exponent, u, False)


@compiled
def mean_state(kind: float, u: float, after: float, dose: float) -> float:
    """Average of the state over a dose that leads from u to `after`; for windows with a closed form (p = 1) only."""
    if dose == 0.0:
        return u
    if kind == DISTANCE_LEFT:
        return _mean_distance_left(u, after, dose)
    if kind == NONE:
        moving = min(abs((after - u) / dose), 1.0)
        return moving * 0.5 * (u + after) + (1.0 - moving) * after
    size = abs(dose)
    if kind == BIOLEK:
        if dose < 0.0:
            return -log1p(0.5 * u * expm1(-2.0 * size)) / size
        return 1.0 + log1p(0.5 * (1.0 - u) * expm1(-2.0 * size)) / size
    travelled = _logistic_rate(kind) * size
    if dose < 0.0:
        return -_log_of_mixture(1.0 - u, u, travelled) / travelled
    return 1.0 + _log_of_mixture(u, 1.0 - u, travelled) / travelled


@compiled
def _log_of_mixture(kept: float, fading: float, travelled: float) -> float:
    # ln(kept + fading exp(-travelled)) with kept + fading = 1, accurate both near 0 and near 1
    mixture = kept + fading * exp(-travelled)
    if mixture < 0.5:
        return log(mixture)
    return log1p(fading * expm1(-travelled))


@compiled
def _mean_distance_left(u: float, after: float, dose: float) -> float:
    size = abs(dose)
    if size > 0.01:
        covered = (after - u) / dose
        return 1.0 - covered if dose > 0.0 else covered
    # (1 - exp(-s)) / s by its series: the quotient above would cancel
    faded = 1.0 - size * (0.5 - size * (1.0 / 6.0 - size * (1.0 / 24.0 - size / 120.0)))
    return 1.0 - (1.0 - u) * faded if dose > 0.0 else u * faded
