"""Modes: complete, orthogonal, and only those asked for."""

import numpy as np
import pytest
from scipy.linalg import expm

from flashplan.ladder.modes import network_modes
from flashplan.ladder.network import GROUND, Part, build_network
from tests.ladder.ladders import LAYOUTS, dense_system, ladder_plan, reference_of


@pytest.mark.parametrize("layout", LAYOUTS)
def test_modes_move_a_charge_as_the_matrix_exponential_does(layout: str) -> None:
    reference = reference_of(ladder_plan(4, 800.0, **LAYOUTS[layout]))
    system, pushed, nodes = dense_system(reference.network)
    charge = reference.taps.T @ np.sin(np.arange(15.0) ** 2) * 1e-15
    modes = network_modes(reference.network)
    for time in (1e-13, 3e-12, 1e-10):
        exact = nodes @ expm(-system * time) @ (pushed @ charge)
        found = modes.shape @ (np.exp(-modes.rate * time) * (modes.shape.T @ charge))
        scale = np.abs(exact).max()
        np.testing.assert_allclose(found.real, exact, atol=1e-8 * scale)
        assert np.abs(np.imag(found)).max() < 1e-8 * scale


@pytest.mark.parametrize("layout", ["straight", "coarse", "ringing", "a ringing pair"])
def test_a_few_slow_modes_are_the_slowest_of_all(layout: str) -> None:
    changes = LAYOUTS[layout]
    network = reference_of(ladder_plan(8, 4000.0, **changes)).network
    every = network_modes(network).rate
    fastest = 3e10
    some = network_modes(network, fastest=fastest).rate
    assert 0 < some.size < every.size / 4
    order = np.lexsort((some.imag, some.real.round(-3)))
    slow = every[every.real <= fastest]
    slow = slow[np.lexsort((slow.imag, slow.real.round(-3)))]
    np.testing.assert_allclose(np.sort(some[order].real), np.sort(slow.real), rtol=1e-7)
    np.testing.assert_allclose(
        np.sort(np.abs(some.imag)), np.sort(np.abs(slow.imag)), atol=1e2
    )


def test_a_period_that_outlasts_every_mode_leaves_none() -> None:
    network = reference_of(ladder_plan(6, 10.0)).network
    assert network_modes(network, fastest=1.0).rate.size == 0


def test_capacitance_between_free_nodes_is_taken_in() -> None:
    parts = [
        Part("voltage", "source", GROUND, 1.0, "source"),
        Part("resistor", "source", "a", 100.0, "first arm"),
        Part("resistor", "a", "b", 100.0, "second arm"),
        Part("capacitor", "a", GROUND, 1e-12, "first load"),
        Part("capacitor", "b", GROUND, 1e-12, "second load"),
        Part("capacitor", "a", "b", 2e-12, "bridge"),
    ]
    network = build_network(parts)
    system, pushed, nodes = dense_system(network)
    modes = network_modes(network)
    np.testing.assert_allclose(
        np.sort(modes.rate), np.sort(np.linalg.eigvals(system).real), rtol=1e-10
    )
    time, charge = 1e-10, np.array([1e-15, 0.0])
    np.testing.assert_allclose(
        modes.shape @ (np.exp(-modes.rate * time) * (modes.shape.T @ charge)),
        nodes @ expm(-system * time) @ (pushed @ charge),
        rtol=1e-10,
    )
