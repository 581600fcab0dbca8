"""Undecided comparators: the exponential law against published figures."""

import math

import pytest

from flashplan.budget.regeneration import tau_limit, undecided_rate


def test_half_a_period_of_a_gigahertz_at_70_ps_leaves_one_in_a_thousand_undecided() -> (
    None
):
    # "Analog Circuit Design" (Huijsing, van de Plassche, Sansen, eds.), p. 149: 25 mV, gain 5, 10 mV steps, 70 ps,
    # 1 GHz, half a period: about 1e-3, and about 1e-6 with a second latch. Printed figures are rounded, hence 1.5.
    once = undecided_rate(500e-12, 70e-12, gain=5, level=25e-3, lsb=10e-3)
    assert once == pytest.approx(math.exp(-500 / 70), rel=1e-12)
    assert 1e-3 / 1.5 < once < 1e-3 * 1.5
    twice = undecided_rate(1000e-12, 70e-12, gain=5, level=25e-3, lsb=10e-3)
    assert twice == pytest.approx(6.249e-7, rel=1e-3)
    assert (
        1e-6 / 1.5**2 < twice < 1e-6 * 1.5**2
    )  # the square of a figure rounded to within 1.5


@pytest.mark.parametrize(
    ("level", "gain", "lsb", "time", "tau", "rate"),
    [
        (0.5, 4, 10e-3, 400e-12, 15e-12, 6.5577e-11),
        (0.5, 5, 8e-3, 450e-12, 20e-12, 4.2297e-9),
    ],
)
def test_only_the_comparator_nearest_to_the_input_matters(
    level: float, gain: float, lsb: float, time: float, tau: float, rate: float
) -> None:
    # P = 2 V exp(-t / tau) / (A LSB): Veendrick, JSSC 1980; Portmann and Meng, JSSC 1996 (formula from memory).
    assert undecided_rate(time, tau, gain, level, lsb) == pytest.approx(rate, rel=1e-4)


def test_a_gigahertz_and_1e_minus_12_ask_for_16_ps() -> None:
    # Same law, prefactor 2 V / (A LSB) = 25, half a period of 1 GHz: tau <= 16.2075 ps.
    tau = tau_limit(500e-12, 1e-12, gain=1, level=0.125, lsb=10e-3)
    assert tau == pytest.approx(16.2075e-12, rel=1e-5)
    assert undecided_rate(500e-12, tau, 1, 0.125, 10e-3) == pytest.approx(
        1e-12, rel=1e-9
    )


def test_a_rate_never_passes_one() -> None:
    assert undecided_rate(0.0, 1e-12, 1.0, 1.0, 1e-3) == 1.0
