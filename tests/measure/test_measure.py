"""A capture against its plan: the broken line is named, the metrics agree with other roads, bad records are refused."""

import json
from dataclasses import replace

import numpy as np
import pytest

from flashplan.errors import InputError
from flashplan.measure.capture import Capture
from flashplan.measure.measure import measure_capture
from flashplan.metrics.ideal import ideal_sndr_db
from tests.measure.captures import Planted, capture, plan

LIMITS = {
    "offset_sigma": 1.2e-3,
    "noise_sigma": 1.0e-3,
    "hysteresis": 2.0e-3,
    "skew_sigma": 0.6e-12,
    "jitter_sigma": 0.4e-12,
}
HALF_OF_EACH = Planted(0.6e-3, 0.5e-3, 1e-3, 0.3e-12, 0.2e-12, 0.0)
COUNT = 65536
TIME = np.arange(COUNT)


def of_codes(codes: np.ndarray) -> Capture:
    return Capture(np.clip(np.floor(codes), 0, 63).astype(np.int64), None)


@pytest.mark.parametrize("fault", LIMITS)
def test_a_planted_fault_breaks_its_own_line_and_no_other(fault: str) -> None:
    """Four times its limit, under a fast input, where skew and jitter show."""
    planted = replace(HALF_OF_EACH, **{fault: 4 * LIMITS[fault]})
    result = measure_capture(capture(planted, plan(6), 30001, seed=8), plan(6), LIMITS)
    broken = [name for name, line in result.diagnosis.items() if line.met is False]
    assert broken == [fault]


def test_a_sound_array_meets_every_line_that_the_record_tells() -> None:
    result = measure_capture(
        capture(HALF_OF_EACH, plan(6), 15001, seed=8), plan(6), LIMITS
    )
    told = {name for name in LIMITS if result.diagnosis[name].met is True}
    assert told == set(LIMITS) - {"jitter_sigma"}
    assert result.diagnosis["jitter_sigma"].met is None  # noise hides half its limit
    assert result.diagnosis["ladder_bow"].met is None  # no limit was handed in


def test_an_interval_across_the_limit_is_not_judged() -> None:
    record = capture(Planted(), plan(6), 15001, seed=8)
    value = measure_capture(record, plan(6), {}).diagnosis["offset_sigma"].value
    judged = measure_capture(record, plan(6), {"offset_sigma": value}).diagnosis
    assert judged["offset_sigma"].met is None
    assert judged["offset_sigma"].limit == value


def test_an_ideal_quantiser_reaches_the_exact_ceiling_coherent_or_not() -> None:
    for cycles in (7001, 7001.37):
        codes = 32 + 32 * np.sin(2 * np.pi * TIME * cycles / COUNT + 0.3)
        result = measure_capture(of_codes(codes), plan(6), {})
        assert result.coherent == (cycles == 7001)
        assert result.cycles == pytest.approx(cycles, abs=1e-3)
        assert result.sndr_db == pytest.approx(ideal_sndr_db(6), abs=0.05)
        assert np.abs(result.dnl_lsb).max() < 0.01
        assert np.abs(result.inl_lsb).max() < 0.01


def test_a_spur_is_measured_alike_on_and_between_bins() -> None:
    """A third harmonic of 1 % is 40 dB down; the 8-bit quantiser's own spurs lie 20 dB lower."""
    for cycles in (3001, 3001.37):
        phase = 2 * np.pi * TIME * cycles / COUNT + 0.3
        codes = 128 + 126 * (np.sin(phase) + 0.01 * np.sin(3 * phase))
        record = Capture(np.floor(codes).astype(np.int64), None)
        assert measure_capture(record, plan(8), {}).sfdr_db == pytest.approx(
            40, abs=0.2
        )


@pytest.mark.parametrize("fit", ["endpoint", "best"])
def test_linearity_recovers_the_thresholds_that_made_the_codes(fit: str) -> None:
    """Shifted thresholds 20 and 41, worked by hand: DNL jumps up and down by the shift about each."""
    thresholds = np.arange(1.0, 64)
    thresholds[[19, 40]] += [0.3, -0.4]
    value = 32 + 32 * np.sin(2 * np.pi * TIME * 7001 / COUNT)
    codes = np.searchsorted(thresholds, value).astype(np.int64)
    result = measure_capture(Capture(codes, None), plan(6, fit), {})
    dnl = np.zeros(62)
    dnl[[18, 19, 39, 40]] = [0.3, -0.3, -0.4, 0.4]
    np.testing.assert_allclose(result.dnl_lsb, dnl, atol=0.01)
    assert result.inl_lsb[19] == pytest.approx(0.3, abs=0.02)
    assert result.inl_lsb[40] == pytest.approx(-0.4, abs=0.02)


def test_thresholds_beyond_a_small_sine_are_left_out() -> None:
    codes = 32 + 19.9 * np.sin(2 * np.pi * TIME * 7001 / COUNT)
    result = measure_capture(of_codes(codes), plan(6), {})
    reached = np.flatnonzero(np.isfinite(result.inl_lsb)) + 1
    assert reached.tolist() == list(range(13, 52))
    assert result.amplitude_lsb == pytest.approx(19.9, abs=0.05)
    listed = json.loads(json.dumps(result.to_dict(), allow_nan=False))
    assert listed["inl_lsb"][0] is None
    assert len(listed["dnl_lsb"]) == 62


def test_the_document_holds_what_was_promised() -> None:
    result = measure_capture(capture(Planted(), plan(6), 15001, 1), plan(6), LIMITS)
    told = json.loads(json.dumps(result.to_dict(), allow_nan=False))
    assert {
        "samples",
        "dnl_lsb",
        "inl_lsb",
        "sndr_db",
        "sfdr_db",
        "enob",
        "diagnosis",
    } <= set(told)
    assert {"value", "low", "high", "unit"} <= set(told["diagnosis"]["skew_sigma"])


SINE = np.sin(2 * np.pi * TIME * 1001 / COUNT + 0.2)
DRAW = np.random.default_rng(5)
TRIANGLE = 2 / np.pi * np.arcsin(np.sin(2 * np.pi * TIME * 101 / COUNT))


@pytest.mark.parametrize(
    ("codes", "message"),
    [
        (32 + 34 * SINE, "clipped sine: it reaches 2 LSB above"),
        (31 + 32 * SINE, "clipped sine: it reaches 1 LSB below"),
        (32 + 200 * SINE, "clipped sine"),
        (32 + 14 * SINE, "amplitude; at least half the range, 16 LSB"),
        (np.full(COUNT, 12.0), "every sample holds code 12"),
        (DRAW.uniform(0, 64, COUNT), "is no sine"),
        (DRAW.normal(32, 8, COUNT), "is no sine"),
        (TIME * 64 / COUNT, "is no sine|cycles"),
        (TIME * 101 * 64 / COUNT % 64, "is no sine"),
        (32 + 32 * TRIANGLE, "is no sine"),
        (32 + 31 * np.sin(2 * np.pi * TIME * 3.3 / COUNT), "3.3 cycles"),
        (32 + 31 * np.sin(2 * np.pi * TIME * 1024 / COUNT), "64 different phases"),
    ],
)
def test_a_record_without_a_fit_sine_is_refused(
    codes: np.ndarray, message: str
) -> None:
    with pytest.raises(InputError, match=message):
        measure_capture(of_codes(codes), plan(6), {})


def test_a_stuck_comparator_is_named() -> None:
    record = capture(HALF_OF_EACH, plan(6), 7001, seed=1)
    assert record.decisions is not None
    decisions = record.decisions.copy()
    decisions[:, 29] = False
    codes = decisions.sum(axis=1, dtype=np.int64)
    with pytest.raises(InputError, match="comparator 30 never changes"):
        measure_capture(Capture(codes, decisions), plan(6), {})
