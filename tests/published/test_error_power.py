"""Error powers of an array under a sine: noise, offset, jitter and skew against published arithmetic."""

import numpy as np
import pytest

from flashplan.array.window import Comparators, Signal, convert, reach
from flashplan.budget.shares import hysteresis_limit, noise_limit, timing_limit
from flashplan.metrics.ideal import (
    enob_from_sndr,
    ideal_error_power_lsb2,
    ideal_signal_amplitude_lsb,
    ideal_sndr_db,
    sndr_from_enob,
)
from flashplan.metrics.pinned_walk import walk_spectrum, walk_variance
from flashplan.metrics.quadratic_form import quadratic_form_quantile
from flashplan.metrics.sine import sine_positions, sine_slews, sine_weights
from flashplan.metrics.spectrum import sine_metrics


@pytest.mark.parametrize(
    ("bits", "snr"), [(4, 25.84), (6, 37.88), (8, 49.92), (10, 61.96)]
)
def test_6_02_n_plus_1_76(bits: int, snr: float) -> None:
    # W. R. Bennett 1948; IEEE Std 1241 (memory).
    # The printed 6.02 N + 1.76 rounds its own constants: 0.006 N + 0.001 at most.
    assert sndr_from_enob(bits) == pytest.approx(snr, abs=0.01)
    assert enob_from_sndr(sndr_from_enob(bits)) == pytest.approx(bits, rel=1e-12)


@pytest.mark.parametrize("bits", [2, 3, 6, 8])
def test_the_ideal_quantiser_is_what_numpy_fft_measures(bits: int) -> None:
    # A dense coherent record of np.floor, measured with numpy's own FFT.
    samples, cycles, half = 2**20, 99991, 2.0 ** (bits - 1)
    sine = half + half * np.sin(2 * np.pi * cycles * np.arange(samples) / samples)
    codes = np.clip(np.floor(sine), 0, 2**bits - 1)
    power = 2 * np.abs(np.fft.rfft(codes - codes.mean()) / samples) ** 2
    signal = power[cycles]
    error = power.sum() - signal
    assert ideal_signal_amplitude_lsb(bits) ** 2 / 2 == pytest.approx(signal, rel=2e-4)
    assert ideal_error_power_lsb2(bits) == pytest.approx(error, rel=2e-3)
    assert ideal_sndr_db(bits) < sndr_from_enob(bits)


@pytest.mark.parametrize(
    ("frequency", "jitter", "snr"),
    [
        (1e9, 1e-12, 44.036),
        (10e6, 10e-12, 64.036),
        (100e6, 1e-12, 64.036),
        (500e6, 0.5e-12, 56.078),
    ],
)
def test_jitter_limits_the_snr_by_its_slope(
    frequency: float, jitter: float, snr: float
) -> None:
    # "Aperture jitter", rfessentials.com glossary, and the formula's arithmetic; a fine converter's thresholds.
    bits = 12
    slews = sine_slews(bits, 1.0, frequency) * 2**bits
    weight = float((sine_weights(bits) * slews**2).sum())
    error = (2.0 ** (bits - 1)) ** 2 / 2 / 10 ** (snr / 10)
    assert timing_limit(error, weight) == pytest.approx(jitter, rel=3e-4)


def test_250_ps_on_a_20_khz_volt_make_22_uv() -> None:
    # Univ. of Rhode Island ELE541, solution 6.11: amplitude 1 V, 20 kHz, 250 ps rms: 22.2 uV rms.
    slews = sine_slews(12, 2.0, 20e3)
    assert 250e-12 * np.sqrt((sine_weights(12) * slews**2).sum()) == pytest.approx(
        22.2e-6, abs=0.05e-6
    )


@pytest.mark.parametrize(
    ("sigma", "loss"), [(0.1, 0.4922), (0.2, 1.7026), (0.3, 3.1806), (0.5, 6.0206)]
)
def test_a_threshold_error_adds_its_square_to_a_uniform_input(
    sigma: float, loss: float
) -> None:
    # MSE = LSB^2/12 + sigma^2: 10 log10(1 + 12 sigma^2) dB; derivation: a threshold moved by e adds e^2 per LSB.
    assert 10 * np.log10((1 / 12 + sigma**2) / (1 / 12)) == pytest.approx(
        loss, abs=1e-4
    )
    # The array itself, converting a ramp over the middle of the range with this noise.
    draw = np.random.default_rng(5)
    value = np.linspace(16, 48, 200_000, endpoint=False)
    signal = Signal(value, np.zeros_like(value), np.zeros_like(value))
    comparators = Comparators(np.arange(1.0, 64.0), np.zeros(63), sigma, 0.0, 0.0)
    codes = convert(signal, comparators, draw, reach(comparators, signal)).ones()
    squares = (codes + 0.5 - value) ** 2
    interval = 4 * squares.std() / np.sqrt(value.size)
    # Thresholds that cross are put in order again by counting ones, so that the rule bounds a large sigma from above.
    assert np.mean(squares) < 1 / 12 + sigma**2 + interval
    if sigma <= 0.2:
        assert np.mean(squares) > 1 / 12 + sigma**2 - interval


@pytest.mark.parametrize("bits", [4, 6, 8])
def test_noise_on_its_limit_costs_what_was_allowed(bits: int) -> None:
    # Closed form against simulation: the error power that the limit was derived from comes back from the spectrum.
    allowed = 0.05
    sigma = noise_limit(allowed, float(sine_weights(bits).sum()))
    samples, cycles, half = 2**17, 40503, 2.0 ** (bits - 1)
    phase = 2 * np.pi * cycles * np.arange(samples) / samples
    signal = Signal(half + half * np.sin(phase), half * np.cos(phase), phase)
    count = 2**bits - 1
    comparators = Comparators(
        np.arange(1.0, count + 1), np.zeros(count), sigma, 0.0, 0.0
    )
    codes = convert(
        signal, comparators, np.random.default_rng(bits), reach(comparators, signal)
    ).ones()
    measured = sine_metrics(codes[None].astype(float), cycles).error_power[
        0
    ] - ideal_error_power_lsb2(bits)
    # Beyond a third of an LSB quantisation and noise are no longer told apart by the fit; 5 % covers it here.
    assert measured == pytest.approx(allowed, rel=0.05)


def test_hysteresis_moves_each_decision_by_half_its_width() -> None:
    # A ramp up and down through one threshold: mean square (width / 2)^2 about the ideal code; common practice.
    width = hysteresis_limit(0.04, 1.0)
    assert width == pytest.approx(0.4)
    up = np.linspace(20.5, 40.5, 100_000, endpoint=False)
    value = np.concatenate([up, up[::-1]])
    signal = Signal(value, np.zeros_like(value), np.zeros_like(value))
    comparators = Comparators(np.arange(1.0, 64.0), np.zeros(63), 0.0, width, 0.0)
    codes = convert(
        signal, comparators, np.random.default_rng(0), reach(comparators, signal)
    ).ones()
    assert np.mean((codes + 0.5 - value) ** 2) == pytest.approx(1 / 12 + 0.04, rel=2e-3)


def test_the_pinned_walk_is_widest_at_the_middle() -> None:
    # Random walk with pinned ends: sigma s sqrt(m) / 2 at the middle of m units; closed form.
    assert np.sqrt(walk_variance(6)[31]) == pytest.approx(np.sqrt(64) / 2)
    draws = np.random.default_rng(1).standard_normal((4000, 64)).cumsum(axis=1)
    bridge = draws[:, :-1] - np.arange(1, 64) / 64 * draws[:, -1:]
    np.testing.assert_allclose(
        bridge.var(axis=0), walk_variance(6), rtol=4 * np.sqrt(2 / 4000) + 0.02
    )


def test_the_quantile_of_a_sum_of_squares_is_that_of_drawn_arrays() -> None:
    # chi-square table (scipy.stats.chi2 agrees): 99 % of 15 degrees of freedom is 30.578.
    assert quadratic_form_quantile(0.99, np.ones(15)) == pytest.approx(30.578, rel=2e-4)
    weights = np.concatenate([sine_weights(4), 0.3 * walk_spectrum(4)])
    drawn = (
        np.random.default_rng(2).standard_normal((200_000, weights.size)) ** 2 @ weights
    )
    below = np.mean(drawn < quadratic_form_quantile(0.99, weights))
    assert below == pytest.approx(
        0.99, abs=4 * np.sqrt(0.99 * 0.01 / drawn.size) + 2e-4
    )


def test_a_full_scale_sine_slews_fastest_at_the_middle() -> None:
    # rms slew of a 10 MHz full-scale sine: 0.022 full scales per ns (manufacturers' note AD-03, rounded there).
    assert sine_slews(10, 1.0, 10e6).max() == pytest.approx(np.pi * 10e6, rel=1e-6)
    rms = np.sqrt((sine_weights(12) * sine_slews(12, 1.0, 10e6) ** 2).sum())
    assert rms * 1e-9 == pytest.approx(0.022, abs=5e-4)
    assert sine_positions(6)[31] == 0.0
