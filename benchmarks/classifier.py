"""A real thing to programme: a linear classifier of handwritten digits, as differential pairs of conductances.

Data: the 1797 8x8 digits that scikit-learn ships, the test part of the UCI optical recognition of handwritten digits
set (Alpaydin & Kaynak). The classifier is a ridge regression on targets +-1, trained on the first 1000 digits; in
software it gets 713 of the other 797 right.

Each weight w becomes two cells of one word line on adjacent bit lines: the first carries low + s w where w > 0, the
second low + s |w| where w < 0, and the side not used stays at low. One scale s = (high - low) / max|W| serves all.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

Floats = npt.NDArray[np.float64]

TRAINING_DIGITS = 1000
INPUTS = 65  # 64 pixels and the bias
CLASSES = 10
ROWS, COLUMNS = INPUTS, 2 * CLASSES


@dataclass(frozen=True)
class Classifier:
    """A trained classifier and the digits to test it on; called with programmed conductances it gives their accuracy.

    weights: (65, 10). test_inputs: (797, 65). test_labels: (797,). low_S, high_S: range of the conductances [S].
    """

    weights: Floats
    test_inputs: Floats
    test_labels: npt.NDArray[np.int64]
    low_S: float
    high_S: float

    @property
    def siemens_per_weight(self) -> float:
        """The one scale between a weight and a difference of conductances [S]."""
        return (self.high_S - self.low_S) / float(np.abs(self.weights).max())

    def target_matrix(self, rows: int, columns: int) -> Floats:
        """Target conductances [S], (rows, columns), NaN outside the 65 x 20 corner in use.

        Raises ValueError if the array is smaller than 65 x 20.
        """
        if rows < ROWS or columns < COLUMNS:
            raise ValueError(f"the classifier needs {ROWS} rows x {COLUMNS} columns, got {rows} x {columns}")
        matrix = np.full((rows, columns), np.nan)
        scaled = self.siemens_per_weight * self.weights
        matrix[:ROWS, 0:COLUMNS:2] = self.low_S + np.maximum(scaled, 0.0)
        matrix[:ROWS, 1:COLUMNS:2] = self.low_S + np.maximum(-scaled, 0.0)
        return np.where(np.isnan(matrix), np.nan, np.clip(matrix, self.low_S, self.high_S))

    def weights_of(self, conductance_S: Floats) -> Floats:
        """The weights (65, 10) that conductances (rows, columns) [S] stand for."""
        used = conductance_S[:ROWS, :COLUMNS]
        return (used[:, 0::2] - used[:, 1::2]) / self.siemens_per_weight

    def accuracy(self, weights: Floats) -> float:
        """Fraction of the 797 test digits that weights (65, 10) get right."""
        guessed = np.argmax(self.test_inputs @ weights, axis=1)
        return float(np.mean(guessed == self.test_labels))

    def accuracy_of(self, conductance_S: Floats) -> float:
        """Fraction of the 797 test digits that programmed conductances (rows, columns) [S] get right."""
        return self.accuracy(self.weights_of(conductance_S))

    def __call__(self, conductance_S: Floats) -> float:
        """The same: how the summary of a die scores its array."""
        return self.accuracy_of(conductance_S)

    @property
    def samples(self) -> int:
        """Number of test digits."""
        return len(self.test_labels)

    @property
    def reference(self) -> float:
        """Accuracy of the weights themselves, in software."""
        return self.accuracy(self.weights)


def load_digits() -> tuple[Floats, npt.NDArray[np.int64]]:
    """Inputs (1797, 65), pixels in 0..1 and a bias of 1, and labels (1797,)."""
    from sklearn import datasets

    pixels, labels = datasets.load_digits(return_X_y=True)
    return np.column_stack((pixels / 16.0, np.ones(len(pixels)))), np.asarray(labels, dtype=np.int64)


def train(low_S: float, high_S: float) -> Classifier:
    """The ridge regression (penalty 1 on all 65 weights of a class) on the first 1000 digits."""
    inputs, labels = load_digits()
    x = inputs[:TRAINING_DIGITS]
    wanted = np.where(labels[:TRAINING_DIGITS, None] == np.arange(CLASSES), 1.0, -1.0)
    weights = np.linalg.solve(x.T @ x + np.eye(INPUTS), x.T @ wanted)
    return Classifier(np.asarray(weights, dtype=np.float64), inputs[TRAINING_DIGITS:], labels[TRAINING_DIGITS:], low_S, high_S)
