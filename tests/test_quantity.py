"""Engineering notation in and out."""

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from flashplan.quantity import parse_quantity, show


@pytest.mark.parametrize(
    ("text", "unit", "value"),
    [
        ("2.5 GHz", "Hz", 2.5e9),
        ("2 GS/s", "Hz", 2e9),
        ("800 mV", "V", 0.8),
        ("1.2 fC", "C", 1.2e-15),
        ("60 ohm", "ohm", 60.0),
        ("120 mohm", "ohm", 0.12),
        ("0.4 %", "ratio", 0.004),
        ("25 um2", "m2", 25e-12),
        ("1e-12", "s", 1e-12),
        (7, "V", 7.0),
    ],
)
def test_quantities_are_read_in_si(text: object, unit: str, value: float) -> None:
    assert parse_quantity(text, unit) == pytest.approx(value, rel=1e-12)


@pytest.mark.parametrize(
    ("value", "unit"),
    [
        ("2 A", "V"),
        ("fast", "Hz"),
        (True, "V"),
        (None, "V"),
        (math.nan, "V"),
        ("inf", "V"),
        ("1 V V", "V"),
    ],
)
def test_what_is_no_quantity_is_refused(value: object, unit: str) -> None:
    with pytest.raises(ValueError, match="expected"):
        parse_quantity(value, unit)


@given(st.floats(1e-17, 1e14))
def test_a_printed_quantity_reads_back_to_its_digits(value: float) -> None:
    assert parse_quantity(show(value, "V", 6), "V") == pytest.approx(value, rel=1e-5)
