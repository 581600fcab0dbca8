import numpy as np
import pytest

from flashplan.metrics.gaussian_path import (
    GaussianPath,
    hermite_rule,
    levelled_path,
    line_vectors,
    loose_path,
    pinned_path,
    string_covariance_times,
)

TAPS = np.arange(1.0, 16.0)
STRING = np.minimum.outer(TAPS, TAPS) * (16 - np.maximum.outer(TAPS, TAPS)) / 16


def neighbours(path: GaussianPath) -> np.ndarray:
    return path.correlation[1:] * path.deviation[1:] * path.deviation[:-1]


def test_pinned_path_is_the_string() -> None:
    path = pinned_path(16, 0.1, TAPS, 8)
    assert np.allclose(path.deviation**2, 0.01 * np.diag(STRING))
    assert np.allclose(neighbours(path), 0.01 * np.diag(STRING, 1))


def test_loose_path_adds_a_tilt_to_the_string() -> None:
    path = loose_path(16, 0.1, 0.3, TAPS, 8)
    tilt = 0.3 * (1 - TAPS / 16)
    covariance = 0.01 * STRING + np.outer(tilt, tilt)
    assert np.allclose(path.deviation**2, np.diag(covariance))
    assert np.allclose(neighbours(path), np.diag(covariance, 1))
    start = path.correlation[0] * path.deviation[0] * 0.3
    assert np.isclose(start, 0.3 * tilt[0])


def test_levelled_path_has_the_neighbours_of_the_levelled_string() -> None:
    line = line_vectors(15)
    level = np.eye(15) - line @ line.T
    covariance = 0.01 * level @ STRING @ level
    path = levelled_path(16, 0.1, TAPS, 8)
    assert np.allclose(path.deviation**2, np.diag(covariance))
    assert np.allclose(neighbours(path), np.diag(covariance, 1))


def test_string_covariance_in_linear_time() -> None:
    vectors = np.random.default_rng(2).normal(size=(15, 3))
    assert np.allclose(string_covariance_times(vectors, 0.1), 0.01 * STRING @ vectors)


@pytest.mark.parametrize("modes", [5, 40, 300])
def test_hermite_rule_has_the_moments_of_a_normal(modes: int) -> None:
    nodes, weights, hermite = hermite_rule(modes)
    assert np.allclose([weights @ nodes**p for p in (0, 2, 4, 8)], [1, 1, 3, 105])
    gram = hermite[:, :5].T @ (hermite[:, :5] * weights[:, None])
    assert np.allclose(gram, np.eye(5))


def test_expectation_smooths_towards_the_mean() -> None:
    path = pinned_path(16, 0.1, TAPS, 12)
    rho = path.correlation[4]
    found = path.expectation(4) @ np.exp(0.5 * path.nodes)
    expected = np.exp(0.5 * rho * path.nodes + 0.125 * (1 - rho**2))
    near = np.abs(path.nodes) < 3
    assert np.allclose(found[near], expected[near], rtol=1e-6)
    assert np.allclose(path.expectation(0), path.weights)  # nothing known before
