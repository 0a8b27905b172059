"""Estimates from a sample with their standard errors, and the tolerance that sampled laws are held to."""

from math import sqrt


def mean_of(values):
    """Mean and its standard error."""
    return values.mean(), values.std() / sqrt(values.size)


def variance_of(values):
    """Variance and its standard error, from the fourth moment of the sample."""
    square = (values - values.mean()) ** 2
    return square.mean(), square.std() / sqrt(values.size)


def deviation_of(values):
    """Standard deviation and its standard error."""
    variance, error = variance_of(values)
    return sqrt(variance), error / (2.0 * sqrt(variance))


def standard_errors(estimate, expected):
    """How many standard errors an estimate is away from a value."""
    value, error = estimate
    return abs(value - expected) / error


def agrees(estimate, expected):
    return standard_errors(estimate, expected) < 4.0
