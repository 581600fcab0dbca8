import numpy as np
from scipy.special import ndtr

from flashplan.metrics.band_operator import band_matrix, make_panels


def test_bands_that_cut_panels_anywhere_are_integrated() -> None:
    panels = make_panels(1.0, [0.3, 0.1], 0.2, 2.8)
    generator = np.random.default_rng(1)
    lower, upper = np.sort(generator.uniform(-1.5, 1.5, (2, 200)), axis=0)
    density = np.exp(-0.5 * (panels.nodes / 0.2) ** 2) / (0.2 * np.sqrt(2 * np.pi))
    expected = ndtr(np.minimum(upper, 1) / 0.2) - ndtr(np.maximum(lower, -1) / 0.2)
    expected[(upper < -1) | (lower > 1)] = 0.0
    found = band_matrix(panels, lower, upper) @ density
    assert np.allclose(found, expected, rtol=0, atol=1e-9)


def test_an_empty_band_holds_nothing() -> None:
    panels = make_panels(1.0, [], 0.5, 2.8)
    matrix = band_matrix(panels, np.array([0.5]), np.array([0.2]))
    assert not matrix.any()


def test_nodes_are_symmetric() -> None:
    panels = make_panels(0.7, [0.2, -0.35], 0.1, 2.8)
    assert np.allclose(panels.nodes, -panels.nodes[::-1])
    assert np.isclose(panels.weights.sum(), 1.4)
