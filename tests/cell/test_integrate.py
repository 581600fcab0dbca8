"""The batch integrator against closed forms and scipy, and its bookkeeping of failures."""

import numpy as np
import pytest
from scipy.integrate import solve_ivp

from flashplan.cell.integrate import integrate


def test_many_decays_end_where_the_exponential_does():
    rate = np.array([1.0, 3.0, 10.0])
    path = integrate(lambda t, v: -rate * v, np.ones((1, 3)), (0.0, 1.0), 1e-8)
    assert path.voltages[-1, 0] == pytest.approx(np.exp(-rate), abs=1e-7)
    assert not path.failed.any()


def test_error_falls_with_the_tolerance_and_agrees_with_scipy():
    def slope(t, v):
        return np.array([v[1], 5.0 * (1.0 - v[0] ** 2) * v[1] - v[0]])

    reference = solve_ivp(slope, (0.0, 8.0), [2.0, 0.0], rtol=1e-12, atol=1e-12)
    errors = []
    for tolerance in (1e-4, 1e-6, 1e-8):
        path = integrate(slope, np.array([[2.0], [0.0]]), (0.0, 8.0), tolerance)
        errors.append(abs(path.voltages[-1, 0, 0] - reference.y[0, -1]))
    assert errors[0] > errors[1] > errors[2]
    assert errors[2] < 1e-6


def test_it_lands_on_every_corner_and_stops_when_asked():
    path = integrate(
        lambda t, v: np.ones_like(v), np.zeros((1, 1)), (0.0, 1.0), 1e-3, [0.3, 0.7]
    )
    assert {0.3, 0.7, 1.0} <= set(path.time.tolist())
    early = integrate(
        lambda t, v: np.ones_like(v),
        np.zeros((1, 1)),
        (0.0, 1.0),
        1e-3,
        stop=lambda t, v: bool(v.min() > 0.5),
        largest_step=0.05,
    )
    assert 0.5 < early.time[-1] < 0.56


def test_a_failing_instance_is_flagged_and_the_others_go_on():
    def slope(t, v):
        rates = -v
        rates[:, 1] = np.nan if t > 0.4 else rates[:, 1]
        return rates

    path = integrate(slope, np.ones((2, 3)), (0.0, 1.0), 1e-7)
    assert path.failed.tolist() == [False, True, False]
    assert path.voltages[-1][:, [0, 2]] == pytest.approx(np.exp(-1.0), abs=1e-6)
    assert np.isfinite(path.voltages).all()


def test_a_blow_up_is_a_failure_not_a_hang():
    def slope(t, v):
        with np.errstate(over="ignore"):
            return np.array([np.where([True, False], v[0] ** 2, 0.0 * v[0])])

    path = integrate(slope, np.ones((1, 2)), (0.0, 2.0), 1e-6)
    assert path.failed.tolist() == [True, False]
