"""The digits classifier against the data it claims to use and against a reference computed outside this package.

Data: the handwritten digits that scikit-learn ships, test part of the UCI optical recognition of handwritten digits set
(Alpaydin & Kaynak; from memory). Counts, checksums, the software accuracy and the accuracies under weight noise were
computed from that set with numpy alone (derived).
"""

from __future__ import annotations

import hashlib

import numpy as np
import pytest
from sklearn import datasets

from benchmarks.classifier import Classifier, load_digits, train

LOW_S, HIGH_S = 15e-6, 85e-6
# Derived: standard deviation of the noise over max|W| -> (mean accuracy over 400 draws, its standard error).
NOISE = {
    0.01: (0.8942974, 0.0002046),
    0.05: (0.8434348, 0.0013126),
    0.1: (0.6934881, 0.0038282),
    0.2: (0.4212767, 0.0048511),
}
DRAWS = 400


@pytest.fixture(scope="module")
def classifier() -> Classifier:
    return train(LOW_S, HIGH_S)


def test_the_data_are_the_data() -> None:
    """Shape, sum, class counts and checksums of the uint8 values (derived)."""
    pixels, labels = datasets.load_digits(return_X_y=True)
    assert pixels.shape == (1797, 64)
    assert pixels.max() == 16
    assert pixels.sum() == 561718
    assert np.bincount(labels).tolist() == [178, 182, 177, 183, 181, 182, 181, 179, 174, 180]
    assert hashlib.sha256(pixels.astype(np.uint8).tobytes()).hexdigest().startswith("8f26b2bd9d135c25")
    assert hashlib.sha256(labels.astype(np.uint8).tobytes()).hexdigest().startswith("8ba4f891220f5e4c")


def test_inputs_are_scaled_pixels_and_a_bias() -> None:
    inputs, labels = load_digits()
    pixels, wanted = datasets.load_digits(return_X_y=True)
    np.testing.assert_array_equal(inputs[:, :64] * 16.0, pixels)
    assert (inputs[:, 64] == 1.0).all()
    np.testing.assert_array_equal(labels, wanted)


def test_software_reference(classifier: Classifier) -> None:
    """713 of 797, one more or less with another linear-algebra library; max|W| and Frobenius norm (derived)."""
    assert classifier.samples == 797
    assert abs(round(classifier.reference * 797) - 713) <= 1
    assert np.abs(classifier.weights).max() == pytest.approx(1.2059021775, rel=1e-9, abs=0)
    assert np.linalg.norm(classifier.weights) == pytest.approx(5.7177497309, rel=1e-9, abs=0)


def test_ridge_regression_is_where_its_gradient_vanishes(classifier: Classifier) -> None:
    """X'(XW - T) + W = 0, the normal equations of the ridge regression: an independent look at `solve`."""
    inputs, labels = load_digits()
    x = inputs[:1000]
    wanted = np.where(np.equal.outer(labels[:1000], np.arange(10)), 1.0, -1.0)
    gradient = x.T @ (x @ classifier.weights - wanted) + classifier.weights
    assert np.abs(gradient).max() < 1e-9 * np.abs(x.T @ wanted).max()


@pytest.mark.parametrize("fraction", NOISE)
def test_accuracy_under_weight_noise(fraction: float, classifier: Classifier) -> None:
    """Mean over 400 draws within 4 standard errors of both means; the noise goes in through the conductances."""
    matrix = classifier.target_matrix(65, 20)
    sd_S = fraction * (HIGH_S - LOW_S)  # of a difference of two cells: max|W| stands for high - low
    accuracies = []
    for seed in range(DRAWS):
        noise = np.random.default_rng(seed).standard_normal((65, 10)) * sd_S
        programmed = matrix.copy()
        programmed[:, 0::2] += noise
        accuracies.append(classifier.accuracy_of(programmed))
    mean, error = NOISE[fraction]
    own_error = np.std(accuracies, ddof=1) / np.sqrt(DRAWS)
    assert np.mean(accuracies) == pytest.approx(mean, rel=0, abs=4 * np.hypot(error, own_error))


def test_output_noise_follows_error_propagation(classifier: Classifier) -> None:
    """sd of an output is the sd of a weight times |x| (error propagation); variance ratio within 1 % over 400 draws."""
    sd = 0.1 * np.abs(classifier.weights).max()
    x = classifier.test_inputs
    ratios = []
    for seed in range(DRAWS):
        noise = np.random.default_rng(seed).standard_normal(classifier.weights.shape) * sd
        ratios.append(np.mean((x @ noise) ** 2 / (sd**2 * (x**2).sum(axis=1))[:, None]))
    assert np.mean(ratios) == pytest.approx(1.0, rel=0, abs=0.01)


# ---- the mapping to pairs


def test_pairs_lie_on_adjacent_bit_lines_with_one_scale(classifier: Classifier) -> None:
    matrix = classifier.target_matrix(65, 20)
    scale = (HIGH_S - LOW_S) / np.abs(classifier.weights).max()
    for row, label in ((0, 0), (20, 3), (64, 9), tuple(np.unravel_index(np.argmax(np.abs(classifier.weights)), (65, 10)))):
        weight = classifier.weights[row, label]
        plus, minus = matrix[row, 2 * label], matrix[row, 2 * label + 1]
        assert min(plus, minus) == LOW_S
        assert plus - minus == pytest.approx(scale * weight, rel=1e-9, abs=0)
    assert matrix.max() == pytest.approx(HIGH_S, rel=1e-12, abs=0)
    assert matrix.min() == LOW_S


def test_targets_give_back_the_weights(classifier: Classifier) -> None:
    matrix = classifier.target_matrix(70, 24)
    np.testing.assert_allclose(classifier.weights_of(matrix), classifier.weights, rtol=1e-9, atol=1e-15)
    assert classifier(matrix) == classifier.reference
    assert np.isnan(matrix[65:]).all()
    assert np.isnan(matrix[:, 20:]).all()
    assert not np.isnan(matrix[:65, :20]).any()


@pytest.mark.parametrize("shape", [(64, 20), (65, 19)])
def test_an_array_too_small_is_refused(shape: tuple[int, int], classifier: Classifier) -> None:
    with pytest.raises(ValueError, match="needs 65 rows x 20 columns"):
        classifier.target_matrix(*shape)
