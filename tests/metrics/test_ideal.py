"""The ideal quantiser's ceiling against records of one."""

import numpy as np
import pytest

from flashplan.metrics.ideal import (
    enob_from_sndr,
    ideal_error_power_lsb2,
    ideal_signal_amplitude_lsb,
    ideal_sndr_db,
    sndr_from_enob,
)


@pytest.mark.parametrize("bits", [1, 2, 3, 6, 8, 10, 12])
def test_the_closed_form_agrees_with_a_dense_record(bits: int) -> None:
    # Evenly spread phases on purpose off the thresholds; a jump misplaced by one phase step sets the tolerance.
    count = 2**21
    sine = np.sin(2 * np.pi * (np.arange(count) + 0.5) / count)
    codes = np.clip(np.floor((sine + 1) * 2 ** (bits - 1)), 0, 2**bits - 1)
    codes = codes - codes.mean()
    amplitude = 2 * np.mean(codes * sine)
    error = np.mean((codes - amplitude * sine) ** 2)
    assert amplitude == pytest.approx(ideal_signal_amplitude_lsb(bits), abs=1e-4)
    assert error == pytest.approx(ideal_error_power_lsb2(bits), rel=2e-4)


def test_the_error_goes_to_a_twelfth_with_many_bits() -> None:
    excess = np.array([12 * ideal_error_power_lsb2(bits) - 1 for bits in range(6, 13)])
    assert np.all(np.diff(excess) < 0)
    assert 0 < excess[-1] < 0.01


def test_the_ceiling_lies_below_six_decibels_per_bit() -> None:
    ceilings = np.array([ideal_sndr_db(bits) for bits in range(1, 13)])
    shortfall = sndr_from_enob(np.arange(1.0, 13.0)) - ceilings
    assert np.all(shortfall > 0)
    assert np.all(np.diff(shortfall) < 0)


def test_effective_bits_and_back() -> None:
    assert enob_from_sndr(sndr_from_enob(7.3)) == pytest.approx(7.3, rel=1e-14)
