"""Accuracy of the flows and mean states where a plain formula would cancel: tiny doses, and states close to an end."""

from math import exp, expm1, log1p

import pytest

from device_models.windows import BIOLEK, DISTANCE_LEFT, EDGE, JOGLEKAR, NONE, PRODROMAKIS, flow, mean_state, mixed_flow


def approx(value, rel=1e-13):
    return pytest.approx(value, rel=rel, abs=0)


def mean(kind, u, dose):
    return mean_state(kind, u, flow(kind, 1.0, u, dose), dose)


@pytest.mark.parametrize("size", [1e-12, 1e-4, 0.0099, 0.0101, 0.5, 30.0])
def test_mean_under_distance_left(size):
    faded = -expm1(-size) / size
    assert mean(DISTANCE_LEFT, 0.7, -size) == approx(0.7 * faded, rel=5e-13)
    assert mean(DISTANCE_LEFT, 0.3, size) == approx(1 - 0.7 * faded, rel=5e-13)


@pytest.mark.parametrize(("kind", "speed"), [(JOGLEKAR, 4.0), (PRODROMAKIS, 1.0)])
@pytest.mark.parametrize("u", [1e-8, 0.3, 1 - 1e-8])
@pytest.mark.parametrize("travelled", [1e-9, 0.1, 15.0])
def test_mean_of_a_logistic_flow(kind, speed, u, travelled):
    # another form of the same integral, which keeps all digits; states lie in 0..1, so a few of their last bits may differ
    rising = log1p(u * expm1(travelled)) / travelled
    assert abs(mean(kind, u, travelled / speed) - rising) < 1e-15
    falling = 1 - log1p((1 - u) * expm1(travelled)) / travelled
    assert abs(mean(kind, u, -travelled / speed) - falling) < 1e-15


def test_mean_stops_with_the_state_when_there_is_no_window():
    # from 0.6 to 1 in 0.4, then at rest for another 0.6
    assert mean(NONE, 0.6, 1.0) == approx(0.4 * 0.8 + 0.6)
    assert mean(NONE, 0.6, -2.0) == approx(0.3 * 0.3)


def test_zero_dose_leaves_the_mean_at_the_state():
    for kind in (NONE, JOGLEKAR, BIOLEK, PRODROMAKIS, DISTANCE_LEFT):
        assert mean(kind, 0.37, 0.0) == 0.37


@pytest.mark.parametrize("kind", [NONE, JOGLEKAR, BIOLEK, PRODROMAKIS, DISTANCE_LEFT])
@pytest.mark.parametrize("exponent", [1.0, 2.5])
def test_endless_doses_end_at_the_ends(kind, exponent):
    for dose in (1e4, 1e300):
        assert 1.0 - flow(kind, exponent, 0.4, dose) <= EDGE * (1 + 1e-6)
        assert 0.0 <= flow(kind, exponent, 0.4, -dose) <= EDGE * (1 + 1e-6)


def test_mixed_doses_under_distance_left_relax_towards_their_share():
    assert mixed_flow(DISTANCE_LEFT, 1.0, 0.9, 300.0, 100.0) == approx(0.75)
    assert mixed_flow(DISTANCE_LEFT, 1.0, 0.9, 0.3, 0.1) == approx(0.75 + 0.15 * exp(-0.4))


def test_mixed_doses_under_biolek_end_in_balance():
    # up (1 - u^2) = down (1 - (1 - u)^2); equal doses balance where the window is symmetric
    assert mixed_flow(BIOLEK, 1.0, 0.9, 50.0, 50.0) == approx(0.5, rel=1e-12)
    u = mixed_flow(BIOLEK, 2.0, 0.1, 60.0, 20.0)
    assert 60.0 * (1 - u**4) == approx(20.0 * (1 - (1 - u) ** 4), rel=1e-9)
