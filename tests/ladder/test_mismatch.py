"""Mismatch: the string's closed form, the network's sensitivities and drawn resistors say the same."""

import numpy as np
import pytest

from flashplan.ladder import mismatch_covariance
from flashplan.ladder.mismatch import mismatch_sigma, string_sigma
from tests.ladder.ladders import LAYOUTS, ladder_plan, reference_of

PLAIN = ["straight", "forced", "folded", "differential", "ringing", "a ringing pair"]


@pytest.mark.parametrize("layout", PLAIN)
def test_the_strings_closed_form_is_the_networks_sensitivity(layout: str) -> None:
    plan = ladder_plan(
        4,
        200.0,
        resistor_sigma=0.01,
        gradient_linear=0.1,
        **{"end_resistance": 2, **LAYOUTS[layout]},
    )
    covariance = mismatch_covariance(plan, 200.0)
    np.testing.assert_allclose(
        string_sigma(plan, 200.0) ** 2, np.diagonal(covariance), rtol=1e-9, atol=1e-18
    )


RESISTIVE = ["straight", "forced", "softly forced", "folded", "coarse", "differential"]


@pytest.mark.parametrize("layout", RESISTIVE)
def test_drawn_resistors_scatter_the_taps_by_the_covariance(layout: str) -> None:
    # Every drawn ladder solved densely by numpy.
    draws, sigma = 4000, 0.003
    changes = {"resistor_sigma": sigma, **LAYOUTS[layout]}
    if layout == "coarse":
        changes["coarse_sigma"] = 0.002
    plan = ladder_plan(3, 200.0, **{**changes, "forced_taps": _low(changes)})
    reference = reference_of(plan)
    network, resistors = reference.network, reference.network.resistors
    generator = np.random.default_rng(11)
    spread = generator.standard_normal((draws, resistors.value.size))
    weight = 1 / (resistors.value * (1 + resistors.sigma * spread))
    free, held = resistors.free.toarray(), resistors.held.toarray()
    conductance = np.einsum("fr,nr,gr->nfg", free, weight, free, optimize=True)
    source = -((weight * (held.T @ network.held_voltages())) @ free.T)
    voltages = np.linalg.solve(conductance, source[..., None])[..., 0]
    errors = (voltages @ reference.taps.T + reference.held) / plan.lsb
    covariance = mismatch_covariance(plan, 200.0)
    found = np.cov(errors.T)
    # Five standard errors of a covariance estimated from this many draws.
    variance = np.diagonal(covariance)
    error = np.sqrt((np.multiply.outer(variance, variance) + covariance**2) / draws)
    assert np.all(np.abs(found - covariance) < 5 * error + 1e-12)
    np.testing.assert_allclose(
        mismatch_sigma(plan, 200.0) ** 2, variance, rtol=1e-9, atol=1e-18
    )


def _low(changes: dict) -> list[int]:
    """The layout's forced taps moved into a 3-bit ladder."""
    return sorted({min(tap, 8) // 2 for tap in changes.get("forced_taps", [])})
