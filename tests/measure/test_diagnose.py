"""Planted errors are found again, within the interval that is stated."""

from dataclasses import asdict

import numpy as np
import pytest

from flashplan.measure.measure import measure_capture
from tests.measure.captures import Planted, capture, plan

CAPTURES = 10  # at each frequency
RECORDS = [(6, 501), (6, 3501), (6, 7501), (6, 15001), (8, 7501.5)]


def test_nine_of_ten_captures_hold_each_planted_value_in_its_interval() -> None:
    """From slow to near half the sample rate. An honest 95 % interval would hold fewer than 45 of 50 in 4 % of such tests."""
    held = dict.fromkeys(asdict(Planted()), 0)
    for bits, cycles in RECORDS:
        shrink = 2.0 ** (6 - bits)
        planted = Planted(skew_sigma=1e-12 * shrink, jitter_sigma=0.8e-12 * shrink)
        for seed in range(CAPTURES):
            record = capture(planted, plan(bits), cycles, seed, samples=32768)
            diagnosis = measure_capture(record, plan(bits), {}).diagnosis
            for name, truth in asdict(planted).items():
                held[name] += diagnosis[name].low <= truth <= diagnosis[name].high
    assert min(held.values()) >= 0.9 * CAPTURES * len(RECORDS), held


def test_estimates_close_in_on_what_the_record_tells() -> None:
    """At a middle frequency the six are told apart: relative errors of about 1/sqrt(2 x 63 comparators) or less."""
    record = capture(Planted(), plan(6), 30001, seed=3)
    found = measure_capture(record, plan(6), {}).diagnosis
    for name in ("offset_sigma", "skew_sigma", "noise_sigma", "jitter_sigma"):
        assert found[name].value == pytest.approx(getattr(Planted(), name), rel=0.3)
        assert found[name].high < 1.6 * found[name].value


def test_skew_and_jitter_start_at_zero_under_a_slow_input() -> None:
    """1 ps moves a threshold by 0.003 LSB at 1001 cycles: nothing that 0.12 LSB of noise lets through."""
    found = measure_capture(
        capture(Planted(), plan(6), 1001, seed=1), plan(6), {}
    ).diagnosis
    assert found["skew_sigma"].low == 0
    assert found["jitter_sigma"].low == 0
    assert found["jitter_sigma"].high > Planted().jitter_sigma


def test_without_any_error_every_interval_starts_at_zero() -> None:
    """Perfectly separated decisions: a scatter above the samples' own spacing, pi A / n = 0.0015 LSB, is excluded."""
    none = Planted(0, 0, 0, 0, 0, 0)
    found = measure_capture(capture(none, plan(6), 7001, seed=0), plan(6), {}).diagnosis
    for name, finding in found.items():
        assert finding.low <= 0, name
        assert finding.unit == "s" or finding.high < 0.003 * plan(6).lsb, name


def test_codes_alone_tell_the_same_while_bubbles_are_rare() -> None:
    calm = Planted(noise_sigma=0.6e-3, skew_sigma=0.3e-12)
    record = capture(calm, plan(6), 15001, seed=2)
    whole = measure_capture(record, plan(6), {}).diagnosis
    alone = measure_capture(type(record)(record.codes, None), plan(6), {}).diagnosis
    for name, finding in whole.items():
        assert alone[name].value == pytest.approx(
            finding.value, abs=0.5 * (finding.high - finding.low)
        )


def test_codes_alone_say_nothing_where_bubbles_are_many() -> None:
    record = capture(Planted(skew_sigma=10e-12), plan(6), 30001, seed=2)
    alone = measure_capture(type(record)(record.codes, None), plan(6), {})
    assert alone.rebuilt
    assert alone.diagnosis == {}
    assert "skew_sigma" in measure_capture(record, plan(6), {}).diagnosis


def test_a_lone_wild_decision_does_not_move_the_findings() -> None:
    record = capture(Planted(), plan(6), 15001, seed=4)
    assert record.decisions is not None
    before = measure_capture(record, plan(6), {}).diagnosis
    row = int(np.flatnonzero(record.codes == 50)[0])
    record.decisions[row, 10] = False
    after = measure_capture(record, plan(6), {}).diagnosis
    for name in before:
        assert after[name].value == pytest.approx(before[name].value, rel=0.02), name
