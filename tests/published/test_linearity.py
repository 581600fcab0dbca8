"""DNL and INL against worked examples of textbooks."""

import numpy as np

from flashplan.metrics.linearity import dnl_inl


def test_end_point_linearity_of_a_four_bit_ramp_histogram() -> None:
    # M. Burns, G. W. Roberts, "An Introduction to Mixed-Signal IC Test and Measurement", exercise 7.13 (data read in
    # a public copy at tutorsglobe.com; results worked out by hand from the end-point rule)
    counts = np.array([4, 5, 5, 7, 8, 7, 9, 5, 6, 3, 6, 7, 9, 6, 5, 9])
    hits_per_lsb = counts[1:-1].mean()
    thresholds = np.concatenate([[0.0], np.cumsum(counts[1:-1])]) / hits_per_lsb
    dnl, inl = dnl_inl(thresholds - np.arange(15), "endpoint")
    assert np.allclose(
        dnl,
        [-.2045, -.2045, .1136, .2727, .1136, .4318, -.2045, -.0455, -.5227, -.0455, .1136, .4318, -.0455, -.2045],
        atol=5e-5,
    )  # fmt: skip
    assert np.allclose(
        inl,
        [0, -.2045, -.4091, -.2955, -.0227, .0909, .5227, .3182, .2727, -.25, -.2955, -.1818, .25, .2045, 0],
        atol=5e-5,
    )  # fmt: skip


def test_end_point_linearity_with_absolute_edges() -> None:
    # Same book, 3-bit ramp histogram with first edge 32 mV and last edge 3.125 V (data read at tutorsglobe.com)
    counts = np.array([6, 6, 5, 6, 4, 6, 5, 6])
    first, last, ideal = 0.032, 3.125, 0.5
    hits_per_lsb = counts[1:-1].mean()
    assert np.isclose(hits_per_lsb, 5.3333, atol=1e-4)
    edges = first + (last - first) * np.concatenate(
        [[0], np.cumsum(counts[1:-1]) / counts[1:-1].sum()]
    )
    assert np.isclose((last - first) / 6, 0.5155)
    dnl, _ = dnl_inl(edges / ideal - np.arange(1, 8), "endpoint")
    assert np.allclose(dnl, [0.125, -0.0625, 0.125, -0.25, 0.125, -0.0625], atol=1e-4)


def test_linearity_without_a_fitted_line() -> None:
    # S. Franco, "Design with Operational Amplifiers and Analog Integrated Circuits", example 12.1 (read in a public
    # repository of worked examples): levels of a 3-bit converter in eighths of full scale
    levels = 8 * np.array([0, 1 / 8, 3 / 16, 7 / 16, 3 / 8, 11 / 16, 11 / 16, 7 / 8])
    dnl, inl = dnl_inl(levels - np.arange(8), "none")
    assert inl.tolist() == [0, 0, -0.5, 0.5, -1, 0.5, -0.5, 0]
    assert dnl.tolist() == [0, -0.5, 1, -1.5, 1.5, -1, 0.5]
    assert np.flatnonzero(dnl < -1).tolist() == [
        3
    ]  # the book: not monotonic 011 -> 100
