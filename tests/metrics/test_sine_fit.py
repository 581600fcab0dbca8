"""Sine fits against known sines and against a general optimiser."""

import numpy as np
import pytest
from scipy.optimize import least_squares

from flashplan.metrics.ideal import enob_from_sndr
from flashplan.metrics.sine_fit import (
    effective_bits,
    fit_four_parameters,
    fit_three_parameters,
)
from flashplan.metrics.spectrum import sine_metrics

TIME = np.arange(1000)


def _record(frequency: float, noise: float = 0.0) -> np.ndarray:
    clean = 1.5 + 2.0 * np.cos(2 * np.pi * frequency * TIME - 2.5)
    return clean + noise * np.random.default_rng(4).normal(size=TIME.size)


@pytest.mark.parametrize("frequency", [0.0123, 0.25, 0.31415, 0.48])
def test_both_fits_recover_a_clean_sine(frequency: float) -> None:
    for fit in (
        fit_three_parameters(_record(frequency), frequency),
        fit_four_parameters(_record(frequency), frequency + 2e-4),
    ):
        assert fit.frequency == pytest.approx(frequency, rel=1e-11)
        assert fit.amplitude == pytest.approx(2.0, rel=1e-9)
        assert fit.phase == pytest.approx(-2.5, abs=1e-8)
        assert fit.offset == pytest.approx(1.5, rel=1e-9)
        assert fit.residual_rms < 1e-9


def test_a_general_optimiser_finds_no_better_sine() -> None:
    record = _record(0.0777, noise=0.3)
    fit = fit_four_parameters(record)

    def rest(values: np.ndarray) -> np.ndarray:
        amplitude, cycles, phase, offset = values
        return (
            record
            - offset
            - amplitude * np.cos(2 * np.pi * cycles / TIME.size * TIME + phase)
        )

    start = [fit.amplitude, fit.frequency * TIME.size, fit.phase, fit.offset]
    other = least_squares(rest, np.array(start) * 1.001, xtol=1e-14, ftol=1e-14)
    np.testing.assert_allclose(other.x, start, rtol=1e-6)
    assert fit.residual_rms == pytest.approx(np.sqrt(np.mean(other.fun**2)), rel=1e-9)


def test_the_frequency_reaches_its_least_scatter() -> None:
    # Cramer-Rao bound of a sine's frequency: var(2 pi f) = 12 sigma^2 / (A^2/2 ... n^3), i.e. 24 sigma^2 / (A^2 n^3).
    # Source: D. C. Rife, R. R. Boorstyn, IEEE Trans. Inf. Theory 20(5), 1974 (memory).
    generator = np.random.default_rng(11)
    sigma, count, trials = 0.1, 256, 400
    time = np.arange(count)
    found = [
        fit_four_parameters(
            np.cos(2 * np.pi * 0.1234 * time + phase)
            + sigma * generator.normal(size=count),
            0.1234,
        ).frequency
        for phase in generator.uniform(0, 2 * np.pi, trials)
    ]
    bound = np.sqrt(24 * sigma**2 / count**3) / (2 * np.pi)
    assert np.std(found) == pytest.approx(bound, rel=3 / np.sqrt(2 * trials))


def test_a_coherent_record_leaves_the_same_as_its_spectrum() -> None:
    cycles, count = 101, 4096
    sine = np.cos(2 * np.pi * cycles * np.arange(count) / count + 0.2)
    codes = np.clip(np.floor((sine + 1) * 32), 0, 63)
    fit = fit_three_parameters(codes, cycles / count)
    metrics = sine_metrics(codes, cycles)
    assert fit.residual_rms**2 == pytest.approx(metrics.error_power[0], rel=1e-9)
    assert fit.amplitude**2 / 2 == pytest.approx(metrics.signal_power[0], rel=1e-9)
    # A sine that fills the range: the two definitions differ by the fitted amplitude only.
    assert effective_bits(fit.residual_rms, 2 * fit.amplitude) == pytest.approx(
        enob_from_sndr(metrics.sndr_db[0]), abs=1e-9
    )


def test_fits_without_a_sine_are_refused() -> None:
    with pytest.raises(ValueError, match="5 samples"):
        fit_four_parameters([1.0, 2.0, 1.0], 0.1)
    with pytest.raises(ValueError, match="can be told from the rest"):
        fit_three_parameters(_record(0.1), 0.0)
    with pytest.raises(ValueError, match="can be told from the rest"):
        fit_four_parameters(_record(0.1), 0.3)  # 200 cycles away: no slope to follow
    with pytest.raises(ValueError, match="no sine was found within one cycle"):
        fit_four_parameters(_record(0.1), 0.1013)
    with pytest.raises(ValueError, match="above zero"):
        effective_bits(0.0, 1.0)
