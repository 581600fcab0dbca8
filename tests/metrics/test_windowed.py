"""Records whose sine is not coherent."""

import numpy as np
import pytest
from scipy.signal import get_window

from flashplan.metrics.ideal import ideal_sndr_db
from flashplan.metrics.spectrum import sine_metrics
from flashplan.metrics.windowed import WINDOWS, windowed_metrics

SAMPLES = 8192
TIME = np.arange(SAMPLES)


def _sine(frequency: float, bits: int | None = None) -> np.ndarray:
    sine = np.cos(2 * np.pi * frequency * TIME + 0.4)
    if bits is None:
        return sine
    return np.clip(np.floor((sine + 1) * 2 ** (bits - 1)), 0, 2**bits - 1)


@pytest.mark.parametrize("window", WINDOWS)
@pytest.mark.parametrize("bin_offset", [0.0, 0.37, 0.5])
def test_little_of_a_sine_leaks_past_its_skirt(window, bin_offset: float) -> None:
    found = windowed_metrics(_sine((1000 + bin_offset) / SAMPLES), window)
    leakage = 1e-9 if window == "blackmanharris" else 1.1e-8
    assert found.sine.error_power[0] < leakage * found.sine.signal_power[0]
    assert found.sine.signal_power[0] == pytest.approx(0.5, rel=1e-6)
    assert found.frequency * SAMPLES == pytest.approx(1000 + bin_offset, abs=1e-3)


@pytest.mark.parametrize("window", WINDOWS)
def test_an_ideal_converter_reaches_its_ceiling_with_any_window(window) -> None:
    # 8192 samples of an error that is no white noise: what is filled in under the skirt limits the agreement.
    found = windowed_metrics(_sine(0.0987, bits=6), window)
    assert found.sine.sndr_db[0] == pytest.approx(ideal_sndr_db(6), abs=0.05)


@pytest.mark.parametrize("window", WINDOWS)
def test_white_noise_reads_as_what_it_is(window) -> None:
    noise = np.random.default_rng(3).normal(size=SAMPLES)
    found = windowed_metrics(_sine(0.0789) + 0.01 * noise, window).sine
    # SAMPLES / 2 bins, of which a window leaves less than half independent: 3 sigma of the power is some 8 %.
    assert found.error_power[0] == pytest.approx(1e-4, rel=0.08)
    assert found.noise_floor_db[0] == pytest.approx(
        10 * np.log10(1e-4 / (SAMPLES / 2) / 0.5), abs=0.4
    )


@pytest.mark.parametrize("window", WINDOWS)
def test_harmonics_and_spurs_are_told_from_noise(window) -> None:
    frequency = 0.217
    record = (
        0.7
        + _sine(frequency)
        + 1e-2 * np.cos(2 * np.pi * 3 * frequency * TIME)  # folds to 0.349
        + 2e-2 * np.cos(2 * np.pi * 0.05111 * TIME)
    )
    found = windowed_metrics(record, window).sine
    scalloping = {"hann": 1.43, "blackmanharris": 0.83, "flattop": 0.02}[window]
    spur = 20 * np.log10(50)
    assert found.thd_db[0] == pytest.approx(-40.0, abs=0.05)
    assert spur - 0.02 <= found.sfdr_db[0] <= spur + scalloping
    # The spur raises the mean that is filled in under the skirts, by no more than their share of the bins.
    hidden = 10 * np.log10(1 + (3 * WINDOWS[window].skirt + 2) / (SAMPLES / 2))
    sndr = -10 * np.log10(5e-4)
    assert sndr - hidden <= found.sndr_db[0] <= sndr + 1e-3


def test_a_coherent_record_reads_the_same_with_and_without_window() -> None:
    record = _sine(1001 / SAMPLES) + 0.01 * np.random.default_rng(5).normal(
        size=SAMPLES
    )
    plain, windowed = sine_metrics(record, 1001), windowed_metrics(record).sine
    assert windowed.sndr_db[0] == pytest.approx(plain.sndr_db[0], abs=0.2)


def test_scalloping_is_what_is_promised() -> None:
    for window, promised in [("hann", 1.4), ("blackmanharris", 0.8), ("flattop", 0.0)]:
        weights = get_window(window, 4096)
        half_bin = np.exp(1j * np.pi * np.arange(4096) / 4096)
        loss = -20 * np.log10(abs(weights @ half_bin) / weights.sum())
        assert loss == pytest.approx(promised, abs=0.05)


@pytest.mark.parametrize(
    "record, window, message",
    [
        (_sine(0.1), "square", "window must be one of"),
        (_sine(0.1)[:100], "hann", "320 samples or more"),
        (np.stack([_sine(0.1)] * 2), "hann", "one record"),
        (np.ones(SAMPLES), "flattop", "holds no signal"),
        (_sine(0.0003), "hann", "too near dc"),
        (_sine(0.4999), "hann", "half the sample rate"),
    ],
)
def test_a_record_that_cannot_be_measured_is_refused(record, window, message) -> None:
    with pytest.raises(ValueError, match=message):
        windowed_metrics(record, window)
