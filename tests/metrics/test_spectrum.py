"""Spectral metrics of coherent records."""

import math

import numpy as np
import pytest

from flashplan.metrics.ideal import ideal_error_power_lsb2, ideal_sndr_db
from flashplan.metrics.spectrum import (
    coherent_frequency,
    folded_bin,
    power_spectrum,
    sine_metrics,
)

SAMPLES = 4096
CYCLES = 409
PHASE = 2 * np.pi * CYCLES * np.arange(SAMPLES) / SAMPLES


@pytest.mark.parametrize("length", [63, 64])
def test_bins_add_up_to_the_mean_square(length: int) -> None:
    record = np.random.default_rng(1).normal(size=(3, length))
    np.testing.assert_allclose(
        power_spectrum(record).sum(axis=1), np.mean(record**2, axis=1), rtol=1e-12
    )


@pytest.mark.parametrize("bits", [3, 6, 8])
def test_an_ideal_converter_reaches_its_ceiling(bits: int) -> None:
    count, cycles = 2**18, 12345
    sine = np.sin(2 * np.pi * cycles * np.arange(count) / count + 0.1)
    codes = np.clip(np.floor((sine + 1) * 2 ** (bits - 1)), 0, 2**bits - 1)
    metrics = sine_metrics(codes, cycles)
    assert metrics.sndr_db[0] == pytest.approx(ideal_sndr_db(bits), abs=0.01)
    assert metrics.error_power[0] == pytest.approx(
        ideal_error_power_lsb2(bits), rel=2e-3
    )


def test_every_metric_of_a_made_up_spectrum() -> None:
    record = (
        5.0
        + 2.0 * np.cos(PHASE)
        + 0.02 * np.cos(2 * PHASE + 1)
        + 0.01 * np.cos(5 * PHASE)
        + 0.04 * np.cos(2 * np.pi * 100 * np.arange(SAMPLES) / SAMPLES)
    )
    metrics = sine_metrics(record, CYCLES)
    error = (0.02**2 + 0.01**2 + 0.04**2) / 2
    distortion = (0.02**2 + 0.01**2) / 2
    bins = SAMPLES // 2 + 1 - 2 - 9
    assert metrics.signal_power[0] == pytest.approx(2.0, rel=1e-12)
    assert metrics.error_power[0] == pytest.approx(error, rel=1e-9)
    assert metrics.sndr_db[0] == pytest.approx(10 * math.log10(2 / error))
    assert metrics.sfdr_db[0] == pytest.approx(20 * math.log10(2 / 0.04))
    assert metrics.thd_db[0] == pytest.approx(10 * math.log10(distortion / 2))
    assert metrics.noise_floor_db[0] == pytest.approx(
        10 * math.log10(0.04**2 / 2 / bins / 2)
    )


def test_an_undersampled_sine_is_folded() -> None:
    record = np.cos(PHASE) + 0.1 * np.cos(2 * PHASE)
    plain = sine_metrics(record, CYCLES)
    folded = sine_metrics(record, SAMPLES - CYCLES)
    assert plain.to_dict() == folded.to_dict()
    assert folded_bin(3 * SAMPLES - CYCLES, SAMPLES) == CYCLES


def test_a_batch_in_chunks_equals_its_records(monkeypatch: pytest.MonkeyPatch) -> None:
    records = np.random.default_rng(2).normal(size=(7, 64)) + np.sin(
        2 * np.pi * 5 * np.arange(64) / 64
    )
    alone = [sine_metrics(record, 5).sndr_db[0] for record in records]
    monkeypatch.setattr("flashplan.metrics.spectrum._CHUNK_SAMPLES", 128)
    np.testing.assert_array_equal(sine_metrics(records, 5).sndr_db, alone)


def test_a_record_without_a_sine_is_refused() -> None:
    with pytest.raises(ValueError, match="record 1 has no sine"):
        sine_metrics(np.stack([np.sin(PHASE), np.zeros(SAMPLES)]), CYCLES)


@pytest.mark.parametrize("cycles", [0, SAMPLES // 2, SAMPLES])
def test_a_sine_on_dc_or_half_the_rate_is_refused(cycles: int) -> None:
    with pytest.raises(ValueError, match="stand clear"):
        sine_metrics(np.sin(PHASE), cycles)


@pytest.mark.parametrize("samples", [16, 1000, 4095, 4096, 65536])
@pytest.mark.parametrize("share", [1e-6, 0.123, 0.25, 0.5, 0.77])
def test_the_coherent_frequency_visits_every_phase(samples: int, share: float) -> None:
    cycles, frequency = coherent_frequency(1e9, share * 1e9, samples)
    assert len(np.unique(cycles * np.arange(samples) % samples)) == samples
    assert cycles % 2 == 1
    assert frequency == pytest.approx(cycles * 1e9 / samples)
    fit = [other for other in range(1, 2 * samples, 2) if math.gcd(other, samples) == 1]
    distance = abs(np.array(fit) - share * samples)
    assert abs(cycles - share * samples) == pytest.approx(distance.min())


@pytest.mark.parametrize("rate, target, samples", [(0, 1, 64), (1, 0, 64), (1, 1, 8)])
def test_a_senseless_test_frequency_is_refused(rate, target, samples) -> None:
    with pytest.raises(ValueError, match="above zero and 16 samples"):
        coherent_frequency(rate, target, samples)
