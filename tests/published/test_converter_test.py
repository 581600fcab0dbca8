"""Converter tests against figures from outside: standards, handbooks, papers, general libraries."""

import numpy as np
import pytest
from scipy import signal
from scipy.special import jv
from scipy.stats import arcsine, norm, uniform

from flashplan.metrics.histogram import (
    ramp_thresholds,
    sine_histogram_samples,
    sine_thresholds,
)
from flashplan.metrics.ideal import (
    ideal_signal_amplitude_lsb,
    ideal_sndr_db,
    sndr_from_enob,
)
from flashplan.metrics.linearity import dnl_inl
from flashplan.metrics.spectrum import (
    coherent_frequency,
    power_spectrum,
    sine_metrics,
)
from flashplan.metrics.staircase import staircase_error_power
from flashplan.metrics.transfer import falling_steps
from flashplan.metrics.windowed import windowed_spectrum


@pytest.mark.parametrize(
    "bits, decibel", [(4, 25.84), (6, 37.88), (8, 49.92), (10, 61.96)]
)
def test_six_decibels_per_bit(bits: int, decibel: float) -> None:
    # 6.02 N + 1.76. W. R. Bennett 1948; IEEE Std 1241 (memory). The rounded factors leave 0.0006 N + 0.001 open.
    assert sndr_from_enob(bits) == pytest.approx(decibel, abs=0.0006 * bits + 0.002)
    # What a fitted sine shows lies a little below: most of it at few bits.
    assert 0 < sndr_from_enob(bits) - ideal_sndr_db(bits) < 0.3


def test_a_full_scale_sine_at_fourteen_bits() -> None:
    # 86.0 dB. TU Delft course ET4369, first homework (seen).
    assert sndr_from_enob(14) == pytest.approx(86.0, abs=0.05)


def _harmonic_of_an_ideal_quantiser(order: int, amplitude: int) -> float:
    """Harmonic in LSB that a mid-riser quantiser adds to a sine: sum over m of 2 / (pi m) J_order(2 pi m amplitude).

    N. M. Blachman, "The intermodulation and distortion due to quantization of sinusoids", IEEE Trans. Acoust., Speech,
    Signal Process. 33(6), 1985 (memory). With a whole number of LSB all far terms have one sign; the Bessel function's
    asymptote sums them.
    """
    last = 20_000
    term = np.arange(1, last + 1)
    near = np.sum(2 / (np.pi * term) * jv(order, 2 * np.pi * term * amplitude))
    far = np.cos(np.pi / 4 + order * np.pi / 2) / (np.pi * np.sqrt(amplitude))
    return float(near + 2 / np.pi * far * 2 / np.sqrt(last + 0.5))


@pytest.mark.parametrize("bits", [2, 4, 6, 8])
def test_the_spectrum_of_an_ideal_quantiser_is_a_sum_of_bessel_functions(
    bits: int,
) -> None:
    amplitude = 2 ** (bits - 1)
    assert ideal_signal_amplitude_lsb(bits) == pytest.approx(
        amplitude + _harmonic_of_an_ideal_quantiser(1, amplitude), abs=1e-6
    )
    count = 2**22
    sine = np.sin(2 * np.pi * (np.arange(count) + 0.5) / count)
    power = power_spectrum(np.floor(amplitude * sine) + 0.5)
    for order in (3, 5, 7, 31):
        expected = _harmonic_of_an_ideal_quantiser(order, amplitude)
        # Each jump of the record is misplaced by up to half of the 2**22 samples' distance: together some 1e-5.
        assert np.sqrt(2 * power[order]) == pytest.approx(abs(expected), abs=3e-5)


@pytest.mark.parametrize(
    "frequency, sigma, decibel",
    [
        (1e9, 1e-12, 44.036),
        (10e6, 10e-12, 64.036),
        (100e6, 1e-12, 64.036),
        (500e6, 0.5e-12, 56.078),
    ],
)
def test_jitter_limits_the_ratio(
    frequency: float, sigma: float, decibel: float
) -> None:
    # -20 log10(2 pi f sigma): closed form; the formula is tabulated in B. Murmann's ADC survey (seen).
    count = 2**17
    cycles, tone = coherent_frequency(2.2 * frequency, frequency, count)
    moments = np.arange(count) / (2.2 * frequency)
    moments += np.random.default_rng(1).normal(scale=sigma, size=count)
    metrics = sine_metrics(np.sin(2 * np.pi * tone * moments), cycles)
    # The slope squared scatters beside the noise: 3 sigma of the power are 3 sqrt(3.5 / n), 0.07 dB.
    assert metrics.sndr_db[0] == pytest.approx(decibel, abs=0.07)


def test_a_four_bit_ramp_histogram() -> None:
    # Counts of Burns and Roberts, exercise 7.13, end-point method (data seen; results worked out from them).
    counts = [4, 5, 5, 7, 8, 7, 9, 5, 6, 3, 6, 7, 9, 6, 5, 9]
    hits = ramp_thresholds(counts, 0.0, sum(counts))
    dnl, inl = dnl_inl(hits - np.arange(1, 16), "endpoint")
    # fmt: off
    np.testing.assert_allclose(dnl, [
        -.2045, -.2045, .1136, .2727, .1136, .4318, -.2045, -.0455, -.5227, -.0455, .1136, .4318, -.0455, -.2045,
    ], atol=5e-5)
    np.testing.assert_allclose(inl, [
        0, -.2045, -.4091, -.2955, -.0227, .0909, .5227, .3182, .2727, -.25, -.2955, -.1818, .25, .2045, 0,
    ], atol=5e-5)
    # fmt: on


def test_a_three_bit_ramp_histogram_with_its_edges() -> None:
    # Counts and the two edges of Burns and Roberts, following exercise (data seen; results worked out from them).
    counts, first, last = [6, 6, 5, 6, 4, 6, 5, 6], 0.032, 3.125
    hit = (last - first) / sum(counts[1:-1])
    assert hit == pytest.approx(96.656e-3, abs=1e-6)
    thresholds = ramp_thresholds(
        counts, first - counts[0] * hit, last + counts[-1] * hit
    )
    assert thresholds[[0, -1]] == pytest.approx([first, last], rel=1e-12)
    lsb = np.diff(thresholds).mean()
    assert lsb == pytest.approx(0.5155, abs=1e-4)
    dnl, _ = dnl_inl(thresholds / lsb - np.arange(1, 8), "endpoint")
    np.testing.assert_allclose(
        dnl, [0.125, -0.0625, 0.125, -0.25, 0.125, -0.0625], atol=1e-4
    )


def test_a_textbook_transfer_curve_that_falls() -> None:
    # S. Franco, design textbook, example 12.1: outputs in LSB, INL, DNL; not monotonic from 011 to 100 (seen).
    curve = np.array([0, 1, 1.5, 3.5, 3, 5.5, 5.5, 7])
    dnl, inl = dnl_inl(curve - np.arange(8), "none")
    assert inl.tolist() == [0, 0, -0.5, 0.5, -1, 0.5, -0.5, 0]
    assert dnl.tolist() == [0, -0.5, 1, -1.5, 1.5, -1, 0.5]
    assert falling_steps(curve).tolist() == [3]


def test_the_error_of_a_good_and_of_a_broken_quantiser() -> None:
    # LSB^2/12, and 17/24 LSB^2 with codes 0 and 1 missing. TU Delft course ET4369, first homework (seen).
    ramp = uniform(-4.5, 8)
    good = staircase_error_power(np.arange(-3.5, 3), np.arange(-4, 4), ramp)
    broken = staircase_error_power(
        [-3.5, -2.5, -1.5, 1.5, 2.5], [-4, -3, -2, -1, 2, 3], ramp
    )
    assert good == pytest.approx(1 / 12, rel=1e-9)
    assert broken == pytest.approx(17 / 24, rel=1e-9)


@pytest.mark.parametrize(
    "levels, step, error",
    [
        (2, 1.5958, 0.36338),
        (4, 0.9957, 0.11885),
        (8, 0.5860, 0.037440),
        (16, 0.3352, 0.011543),
        (32, 0.18814, 0.0034952),
        (64, 0.104063, 0.00104005),
        (128, 0.056868, 3.0433e-4),
        (256, 0.030762, 8.7686e-5),
    ],
)
def test_the_best_uniform_quantiser_of_a_gaussian(
    levels: int, step: float, error: float
) -> None:
    # J. Max, "Quantizing for minimum distortion", IRE Trans. Inf. Theory 6(1), 1960 (table from memory, recomputed).
    outputs = step * (np.arange(levels) - (levels - 1) / 2)
    thresholds = (outputs[1:] + outputs[:-1]) / 2
    power = staircase_error_power(thresholds, outputs, norm())
    assert power == pytest.approx(error, rel=1e-4)


@pytest.mark.parametrize(
    "bits, worst_inl, decibel, digits",
    [(10, 0.9, -58.849, 0.002), (11, 15.766, -40.0, 0.001)],
)
def test_a_cubic_bow_makes_a_third_harmonic(
    bits: int, worst_inl: float, decibel: float, digits: float
) -> None:
    # HD3 = INL_max 3 sqrt(3) / (4 2^B). TU Delft course ET4369, third homework (seen). The formula refers to the
    # input's amplitude, from which the bow takes a quarter of its cubic part.
    phase = 2 * np.pi * 101 * np.arange(4096) / 4096
    cubic = worst_inl * 3 * np.sqrt(3) / 2
    sine = np.cos(phase)
    half_scale = 2 ** (bits - 1)
    record = half_scale * sine + cubic * (sine**3 - sine)
    metrics = sine_metrics(record, 101)
    to_input = 10 * np.log10(metrics.signal_power[0] / (half_scale**2 / 2))
    assert metrics.thd_db[0] + to_input == pytest.approx(decibel, abs=digits)
    places = np.linspace(-1, 1, 10_001)
    assert np.max(cubic * (places**3 - places)) == pytest.approx(worst_inl, rel=1e-6)


@pytest.mark.parametrize(
    "bits, tolerance, quantile, samples, within",
    [
        (8, 0.1, 2.576, 266_840, 1),
        (8, 0.1, 2.58, 267_670, 1),  # the literature's 268 000
        (12, 0.1, 2.576, 4.269e6, 500),
        (6, 0.1, 2.576, 66_710, 1),
        (6, 0.01, 1.96, 3.862e6, 500),
    ],
)
def test_samples_of_a_sine_histogram(
    bits: int, tolerance: float, quantile: float, samples: float, within: float
) -> None:
    # J. Doernberg, H.-S. Lee, D. A. Hodges, IEEE J. Solid-State Circuits 19(6), 1984 (memory), with rounded quantiles.
    confidence = 2 * norm.cdf(quantile) - 1
    found = sine_histogram_samples(bits, tolerance, confidence)
    assert found == pytest.approx(samples, abs=within)


def test_thresholds_from_a_sines_own_law() -> None:
    # IEEE Std 1241 and 1057 (memory): T = C - A cos(pi share); the shares here are scipy's arcsine law.
    thresholds = np.array([-0.8, -0.1, 0.0, 0.35, 0.9])
    below = arcsine(loc=0.1 - 1.2, scale=2.4).cdf(thresholds)
    counts = np.diff(np.concatenate(([0.0], below, [1.0])))
    np.testing.assert_allclose(
        sine_thresholds(counts, 1.2, 0.1), thresholds, rtol=1e-12, atol=1e-12
    )


@pytest.mark.parametrize("length", [255, 256])
def test_spectra_agree_with_general_libraries(length: int) -> None:
    record = np.random.default_rng(1).normal(size=length)
    _, plain = signal.periodogram(record, detrend=False, scaling="spectrum")
    np.testing.assert_allclose(power_spectrum(record), plain, rtol=1e-9, atol=1e-15)
    for window in ("hann", "blackmanharris", "flattop"):
        weights = signal.get_window(window, length)
        centred = record - np.average(record, weights=weights)
        _, density = signal.periodogram(centred, window=window, detrend=False)
        np.testing.assert_allclose(
            windowed_spectrum(record, window), density / length, rtol=1e-9, atol=1e-15
        )


@pytest.mark.parametrize(
    "window, bandwidth", [("hann", 1.50), ("blackmanharris", 2.00), ("flattop", 3.77)]
)
def test_windows_have_their_published_noise_bandwidth(
    window: str, bandwidth: float
) -> None:
    # F. J. Harris, Proc. IEEE 66(1), 1978; the flat top's from handbooks of signal analysis (memory). A sine's highest
    # bin lies below the sum over its lobe by this.
    record = np.cos(2 * np.pi * 100 * np.arange(4096) / 4096)
    power = windowed_spectrum(record, window)
    assert power.sum() / power.max() == pytest.approx(bandwidth, abs=0.005)
