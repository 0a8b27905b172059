"""Incremental-step programming and pulse counts: the real loop against closed forms.

The cells and the one-sided strategy are a user's own file (plugin_cells.py). x is the state of a cell, D the mean step.
Sampled laws are held to 4 standard errors of the sample at hand; seeds are fixed.

Sources: Suh et al., IEEE J. Solid-State Circuits 30:1149 (1995) for incremental-step pulses; Cox, Renewal Theory (1962)
for overshoot and counts; Lorden 1970 for the bound; Chang & Peres, Ann. Probab. 25:787 (1997) and Siegmund, Sequential
Analysis (1985) for signed steps (all from memory). Where a comment says "derived", the formula was worked out for this
bench and its value checked by quadrature or simulation elsewhere.
"""

from dataclasses import replace
from math import exp, log, sqrt

import numpy as np
import pytest
from scipy.stats import kstest, norm, uniform

from device_models.contract_checks import ContractError, check_device
from programming.job import PulseTrain, Targets
from tests.jobs import quiet_verify
from tests.outside.plugin_jobs import (
    CELL,
    final_state,
    plugin_job,
    read_noise,
    relative_cycle,
    sample,
    starting_at,
    step_targets,
)
from tests.outside.standard_errors import agrees, deviation_of, mean_of, standard_errors, variance_of

DIES = 256  # of 64 x 64 cells


def approx(value, rel=1e-9):
    return pytest.approx(value, rel=rel, abs=0)


# ---- the cells themselves


@pytest.mark.parametrize("name", ["steps", "moving_threshold"])
def test_the_cells_keep_the_contract(name):
    check_device(replace(CELL, sets={name: CELL.sets[name]}))


def test_a_redraw_breaks_the_contract():
    with pytest.raises(ContractError, match="direction"):
        check_device(replace(CELL, sets={"redraw": CELL.sets["redraw"]}))


# ---- steady shift of a cell with a moving threshold (Suh et al. 1995; closed form derived)

D, V0, SPEED, WIDTH = 0.05, 0.1, 1.0, 1e-3
OFFSET = V0 * log(SPEED * WIDTH / V0 / (1.0 - exp(-D / V0)))  # steady x_n less V_n


def staircase_job(**changes):
    """V_n = n D, n = 0, 1, ...; half-selected cells stay in the dead zone."""
    start = CELL.sets["moving_threshold"]().values["shift"].value
    cell = {"initial_S": 1e-5 - 1e-6, "initial_spread": 0.0}  # x = -1
    train = PulseTrain(start, D, start + 4.0, WIDTH)
    return plugin_job("moving_threshold", set=train, reset=train, **{"cell": cell} | changes)


def state_after(pulses):
    out_of_reach = Targets("levels", 13e-6, 13e-6, np.array([13e-6]))
    return final_state(staircase_job(rows=2, columns=2, max_pulses=pulses, targets=out_of_reach))


def test_staircase_reaches_its_steady_shift():
    x = np.array([state_after(n + 1)[0] for n in range(51)])  # x_n: after the pulse at V_n
    for n, printed in ((10, 0.132349888), (20, 0.632755449), (50, 2.132758194)):
        assert x[n] == approx(printed, rel=4e-9)
    assert approx(-0.367241806, rel=2e-9) == OFFSET
    assert x[50] - 50 * D == approx(OFFSET)
    assert x[50] - x[49] == approx(D)
    expected = -1.0
    for n in range(51):  # every pulse against the recursion
        expected = V0 * log(exp(expected / V0) + SPEED * WIDTH / V0 * exp(n * D / V0))
        assert x[n] == approx(expected)
    # the factor by which exp((x - steady x) / v0) - 1 dies out, while it is well above rounding
    transient = np.expm1((x - D * np.arange(51) - OFFSET) / V0)
    np.testing.assert_allclose(transient[1:16] / transient[:15], 0.606530660, rtol=1e-8, atol=0)


def test_overshoot_of_the_staircase_is_uniform():
    # targets over ten whole steps: a random phase. Mean D/2, sd D/sqrt(12), derived
    result = sample(staircase_job(targets=Targets("uniform", 11e-6, 11.5e-6)), 16)
    u = result.overshoot / D
    assert agrees(mean_of(u), 0.5)
    assert agrees(deviation_of(u), 0.288675135)
    assert kstest(u, uniform.cdf).pvalue > 1e-4
    assert kstest(u, uniform(0.0, 1.02).cdf).pvalue < 1e-4  # a step two per cent larger would be noticed


# ---- overshoot of equal steps, and what read noise does to it


def test_overshoot_of_equal_steps_is_uniform():
    result = sample(plugin_job(cell=starting_at(0.0), targets=step_targets(5.0, 8.0)), 16)
    u = result.overshoot
    assert u.min() > -1e-9
    assert u.max() < 1.0 + 1e-9
    assert agrees(mean_of(u), 0.5)
    assert agrees(deviation_of(u), 1.0 / sqrt(12.0))
    assert kstest(u, uniform.cdf).pvalue > 1e-4
    assert np.array_equal(result.verifies, result.pulses + 1)


# s_v / D, then mean, sd and P(u < 0) of the true level less the target: density (1/D) Phi(u/s) prod_j Phi(-(u-jD)/s), derived
VERIFY_NOISE = [
    (0.05, 0.5, 0.292973264, 0.019947114),
    (0.1, 0.5, 0.305505046, 0.039894228),
    (0.25, 0.499755494, 0.381560962, 0.099734825),
    (0.5, 0.474627902, 0.554221514, 0.197878133),
    (1.0, 0.272706328, 0.892977028, 0.367627727),
    (2.0, -0.489458820, 1.519352313, 0.607584337),
]


def verify_noise_density(s):
    """Grid of u and the density on it."""
    u = np.linspace(-10.0 * s - 2.0, 10.0 * s + 2.0, 40_001)
    logarithm = norm.logcdf(u / s)
    for j in range(1, int(20.0 * s) + 20):
        logarithm += norm.logcdf(-(u - j) / s)
    return u, np.exp(logarithm)


@pytest.mark.parametrize("row", VERIFY_NOISE, ids=lambda row: f"{row[0]}")
def test_verify_noise(row):
    s, mean, deviation, low = row
    u, density = verify_noise_density(s)
    step = u[1] - u[0]
    assert density.sum() * step == approx(1.0)
    law_mean = (u * density).sum() * step
    assert law_mean == approx(mean, rel=2e-9)
    assert sqrt((u**2 * density).sum() * step - law_mean**2) == approx(deviation, rel=4e-9)
    # start so far below the target that no read noise accepts there; the noise is constant within 2e-5
    noise, verify = read_noise(s)
    distance = float(round(8.0 * s) + 2)
    a_job = plugin_job(cell=starting_at(0.0, noise=noise), verify=verify, targets=step_targets(distance, distance + 1.0))
    result = sample(a_job, DIES)
    assert agrees(mean_of(result.overshoot), mean)
    assert agrees(deviation_of(result.overshoot), deviation)
    assert agrees(mean_of((result.overshoot < 0.0).astype(float)), low)
    quadrature = standard_errors(deviation_of(result.overshoot), sqrt(1.0 / 12.0 + s * s))
    assert (quadrature > 4.0) == (s >= 0.5)  # the usual formula: right up to a quarter of a step, then too large


@pytest.mark.parametrize("s", [0.5, 1.0])
def test_a_fixed_offset_adds_in_quadrature(s):
    # each bit line with a converter gain of its own (and a step of 1e-7 D): an offset that is the same at every read; derived
    gain = s * 1e-10 / 1e-4
    verify = quiet_verify(bits=44, range_S=2e-4, gain_spread=gain)
    distance = float(round(8.0 * s) + 2)
    targets = step_targets(distance, distance + 1.0)
    result = sample(plugin_job(rows=1, columns=65_536, cell=starting_at(0.0), verify=verify, targets=targets), 1)
    assert agrees(mean_of(result.overshoot), 0.5)
    assert agrees(deviation_of(result.overshoot), sqrt(1.0 / 12.0 + s * s))
    fresh = {row[0]: row[2] for row in VERIFY_NOISE}[s]
    assert standard_errors(deviation_of(result.overshoot), fresh) > 8.0


# ---- noisy steps: overshoot and pulse counts


def walk(law, relative, distance, dies=DIES, phase=0.0):
    """Steps of mean 1 and that standard deviation, from 0 to a distance (plus a random phase)."""
    cell = starting_at(0.0, cycle=relative_cycle(law, relative))
    return sample(plugin_job(cell=cell, targets=step_targets(distance, distance + phase)), dies)


@pytest.mark.parametrize(("s", "mean", "deviation"), [(0.1, 0.505, 0.297167181), (0.3, 0.545, 0.355398837)])
def test_pulse_noise_counts_half(s, mean, deviation):
    # mean (D^2 + s^2) / 2D, variance D^2/12 + s^2/2 - s^4/4D^2, derived from Cox 1962. A random phase over ten steps and a
    # distance of 20: the memory of the start, exp(-2 pi^2 s^2 b / D^2), is then far below the standard error
    assert mean == approx((1.0 + s * s) / 2.0)
    assert deviation == approx(sqrt(1.0 / 12.0 + s * s / 2.0 - s**4 / 4.0), rel=2e-9)
    u = walk("normal", s, 20.0, dies=128, phase=10.0).overshoot
    assert agrees(mean_of(u), mean)
    assert agrees(deviation_of(u), deviation)
    assert standard_errors(deviation_of(u), sqrt(1.0 / 12.0 + s * s)) > 8.0  # quadrature
    assert standard_errors(mean_of(u), 0.5) > 8.0


def count_variance(distance, s, third):
    """Var N of a renewal process of positive steps of mean 1 (Cox 1962); third: third central moment."""
    return s * s * distance + 1.0 / 12.0 + 1.25 * s**4 - 2.0 / 3.0 * third


def check_wald_and_lorden(result, s, distance):
    # Wald: E[N] mu = b + E[overshoot]; Lorden: E[overshoot] <= E[step^2] / mu
    assert agrees(mean_of(result.pulses - distance - result.overshoot), 0.0)
    assert result.overshoot.mean() <= 1.0 + s * s
    assert standard_errors(mean_of(result.pulses), distance) > 100.0  # distance over step alone: 5 % low


@pytest.mark.parametrize(("law", "s"), [("normal", 0.3), ("lognormal", 0.3), ("lognormal", 0.5)])
def test_renewal_pulse_counts(law, s):
    # Cox 1962: E[N] = b/mu + (mu^2 + s^2)/2mu^2, Var N = s^2 b/mu^3 + 1/12 + 5 s^4/4mu^4 - 2 m3/3mu^3
    third = s**4 * (s * s + 3.0) if law == "lognormal" else 0.0
    result = walk(law, s, 10.0)
    assert agrees(mean_of(result.pulses), 10.0 + (1.0 + s * s) / 2.0)
    assert agrees(variance_of(result.pulses), count_variance(10.0, s, third))
    if third:
        assert standard_errors(variance_of(result.pulses), count_variance(10.0, s, 0.0)) > 8.0
    check_wald_and_lorden(result, s, 10.0)


def test_pulse_counts_where_some_steps_go_back():
    # N(1, 0.5): one step in 44 is negative. 2.648 and 10.6195 simulated elsewhere, to three and four digits
    result = walk("normal", 0.5, 10.0)
    count = (20.0 + overshoot_constant(2.0)) / 2.0
    assert count == approx(10.6195, rel=2e-4)
    assert agrees(mean_of(result.pulses), count)
    assert variance_of(result.pulses)[0] == approx(2.648, rel=4e-3)
    check_wald_and_lorden(result, 0.5, 10.0)


def test_printed_renewal_values():
    assert approx(10.545) == 10.0 + 1.09 / 2.0
    assert count_variance(10.0, 0.3, 0.0) == approx(0.993458333, rel=4e-10)


def overshoot_constant(mu):
    """rho of a walk with steps N(mu, 1): mu/2 + 1/2mu - sum_n E[S_n^-]/n (Siegmund 1985; Chang & Peres 1997)."""
    n = np.arange(1, 200_001)
    root = np.sqrt(n)
    negative = root * norm.pdf(mu * root) - n * mu * norm.sf(mu * root)
    return mu / 2.0 + 1.0 / (2.0 * mu) - (negative / n).sum()


@pytest.mark.parametrize(
    ("mu", "rho", "count", "dies"),
    [(0.2, 0.634255171, 103.171276, 64), (0.5, 0.717937288, 41.4358746, 64), (1.0, 0.873627365, 20.8736274, 128)],
)
def test_signed_steps(mu, rho, count, dies):
    assert overshoot_constant(mu) == approx(rho, rel=2e-9)
    assert (20.0 + rho) / mu == approx(count, rel=2e-9)
    result = walk("normal", 1.0 / mu, 20.0 / mu, dies)  # in units of mu
    assert agrees(mean_of(result.pulses), count)
    assert agrees(mean_of(result.overshoot * mu), rho)
    assert standard_errors(mean_of(result.overshoot * mu), 0.582597157939) > 4.0  # the limit mu -> 0
    assert standard_errors(mean_of(result.pulses), 20.0 / mu) > 8.0
