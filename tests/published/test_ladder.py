"""The reference ladder against closed forms, networkx, scipy and published formulas."""

import networkx as nx
import numpy as np
import pytest
from scipy.constants import Boltzmann
from scipy.integrate import solve_ivp
from scipy.linalg import expm

from flashplan.ladder import LadderResult, kickback_per_charge, solve_ladder
from flashplan.ladder.modes import network_modes
from flashplan.ladder.network import Network
from flashplan.ladder.reference import build_reference
from flashplan.plan import Datasheet, Plan, changed_plan
from tests.plans import starter_plan


def ladder_plan(bits: int, **ladder: object) -> Plan:
    changes = {
        "converter.bits": bits,
        "goals.enob": bits - 0.6,
        "ladder.end_resistance": 0,
        "ladder.resistor_sigma": 0,
    }
    return changed_plan(
        starter_plan(),
        {**changes, **{f"ladder.{key}": value for key, value in ladder.items()}},
    )


def ladder_network(plan: Plan, cell: Datasheet, resistance: float) -> Network:
    return build_reference(plan, cell, resistance).network


def solved(plan: Plan) -> LadderResult:
    return solve_ladder(plan, plan.datasheet)


def test_the_resistance_seen_at_a_tap_is_that_of_network_theory() -> None:
    # R_u k (m - k) / m, at most R_total / 4: network theory; networkx.resistance_distance on the same graph.
    plan = ladder_plan(4, total_resistance=160)
    network = ladder_network(plan, plan.datasheet, 160.0)
    seen = np.diag(np.linalg.inv(network.conductance.toarray()))
    k = np.arange(1, 16)
    np.testing.assert_allclose(seen, 10.0 * k * (16 - k) / 16, rtol=1e-12)
    graph = nx.cycle_graph(16)  # both ends are the same node for small signals
    for tap in (1, 5, 8):
        # networkx takes edge values as resistances when they are inverted on demand.
        nx.set_edge_attributes(graph, 10.0, "ohm")
        assert seen[tap - 1] == pytest.approx(
            nx.resistance_distance(graph, 0, tap, weight="ohm", invert_weight=True)
        )
    assert seen.max() == pytest.approx(160 / 4)


@pytest.mark.parametrize(
    ("units", "factor"), [(16, 26.0217), (64, 415.0949), (256, 6640.268)]
)
def test_the_slowest_mode_settles_with_the_known_time_constant(
    units: int, factor: float
) -> None:
    # tau = R_u C_u / (4 sin^2(pi / 2 m)) ~ R_total C_total / pi^2; closed form of a uniform line.
    bits = int(np.log2(units))
    plan = ladder_plan(bits, total_resistance=float(units), tap_capacitance=1e-12)
    cell = plan.datasheet.model_copy(update={"coupling_capacitance": 0.0})
    modes = network_modes(ladder_network(plan, cell, float(units)))
    assert 1 / modes.rate[0] == pytest.approx(factor * 1e-12, rel=1e-5)


def test_feedthrough_at_the_middle_is_pi_over_4_f_r_c() -> None:
    # |V_mid / V_in| = (pi / 4) f R_total C_total at low frequency: Venes and van de Plassche, JSSC 31(12) 1996 (memory).
    plan = ladder_plan(6, total_resistance=100)
    plan = changed_plan(
        plan,
        {
            "converter.input_frequency": "10 MHz",
            "comparator.datasheet.coupling_capacitance": "2 fF",
        },
    )
    through = solved(plan).feedthrough_lsb
    assert through is not None
    ratio = np.abs(through) * plan.lsb / (plan.converter.full_scale / 2)
    total = 63 * 2e-15
    assert ratio[31] == pytest.approx(np.pi / 4 * 10e6 * 100 * total, rel=0.02)
    assert ratio.argmax() == 31


@pytest.mark.parametrize(
    ("bits", "frequency", "capacitance", "resistance"),
    [(6, 100e6, 1e-12, 99.472), (6, 500e6, 0.5e-12, 39.789), (8, 50e6, 5e-12, 9.9472)],
)
def test_half_an_lsb_of_feedthrough_limits_the_resistance(
    bits: int, frequency: float, capacitance: float, resistance: float
) -> None:
    # R_max = 2^-(N+1) 4 / (pi f C): same formula solved for R with a full-scale input.
    plan = ladder_plan(bits, total_resistance=resistance, tap_capacitance=1e-18)
    each = capacitance / (2**bits - 1)
    plan = changed_plan(
        plan,
        {
            "converter.input_frequency": frequency,
            "comparator.datasheet.coupling_capacitance": each,
        },
    )
    through = solved(plan).feedthrough_lsb
    assert through is not None
    # The input's amplitude is half its span; the formula relates full scales. It is a first-order law, hence 2 %.
    assert 2 * np.abs(through).max() == pytest.approx(0.5, rel=0.02)


@pytest.mark.parametrize("bits", [6, 8])
def test_a_bias_current_bows_the_ladder(bits: int) -> None:
    # I R_u k (m - k) / 2, I R_u m^2 / 8 at the middle: sum of triangular responses.
    plan = ladder_plan(bits, total_resistance=2.0**bits, bias_current=1e-6)
    m, k = 2**bits, np.arange(1, 2**bits)
    bow = solved(plan).bias_lsb * plan.lsb
    np.testing.assert_allclose(bow, -1e-6 * k * (m - k) / 2, rtol=1e-9)
    assert -bow[m // 2 - 1] == pytest.approx(1e-6 * m**2 / 8)


def test_mismatch_is_a_random_walk_with_pinned_ends() -> None:
    # s sqrt(k (m - k) / m): closed form, and drawn strings of resistors from numpy's generator.
    plan = ladder_plan(6, resistor_sigma=0.01)
    sigma = solved(plan).mismatch_sigma_lsb
    assert sigma[31] == pytest.approx(0.01 * np.sqrt(64) / 2)
    units = 1 + 0.01 * np.random.default_rng(3).standard_normal((20_000, 64))
    taps = np.cumsum(units, axis=1)[:, :-1] / units.sum(axis=1, keepdims=True) * 64
    np.testing.assert_allclose(taps.std(axis=0), sigma, rtol=0.03)
    pinned = solved(changed_plan(plan, {"ladder.forced_taps": [32]})).mismatch_sigma_lsb
    assert pinned[31] == 0
    assert pinned[15] == pytest.approx(0.01 * np.sqrt(32) / 2)


def test_thermal_noise_is_kt_over_c() -> None:
    # 1 pF at 300 K: 64.4 uV, any handbook; here sqrt(k T / C) of the tap and its coupling capacitance together.
    plan = changed_plan(
        ladder_plan(6, tap_capacitance=1e-12),
        {"comparator.datasheet.coupling_capacitance": 0},
    )
    noise = solved(plan).noise_sigma_lsb * plan.lsb
    np.testing.assert_allclose(noise, 64.36e-6, rtol=1e-3)
    # The same from the modes of the resistors' own noise: each mode adds k T x^2.
    modes = network_modes(ladder_network(plan, plan.datasheet, 200.0))
    np.testing.assert_allclose(
        noise**2, Boltzmann * 300 * (modes.shape**2).sum(axis=1), rtol=1e-9
    )


def test_a_lead_squeezes_the_taps() -> None:
    # Two leads in series with the string: a voltage divider.
    plan = ladder_plan(4, total_resistance=100, end_resistance=1)
    k = np.arange(1, 16)
    expected = (1 + 100 * k / 16) / 102 * 16 - k
    np.testing.assert_allclose(solved(plan).lead_lsb, expected, atol=1e-12)


def test_modes_are_what_scipy_integrates() -> None:
    plan = ladder_plan(4, total_resistance=3000)
    network = ladder_network(plan, plan.datasheet, 3000.0)
    modes = network_modes(network)
    charge = np.zeros(15)
    charge[4] = 1e-15
    start = charge / network.capacitance.diagonal()
    end = 2e-11
    rate = network.conductance.toarray() / network.capacitance.diagonal()[:, None]
    integrated = solve_ivp(
        lambda _, v: -rate @ v, (0, end), start, rtol=1e-9, atol=1e-15
    ).y[:, -1]
    exact = modes.shape @ (np.exp(-modes.rate * end) * (modes.shape.T @ charge))
    np.testing.assert_allclose(exact, integrated, rtol=1e-6, atol=1e-9)


def test_kickback_at_rest_is_what_a_march_over_clock_periods_ends_with() -> None:
    # Brute force: scipy's matrix exponential over 400 clock edges for each threshold.
    plan = ladder_plan(4, total_resistance=20_000)
    network = ladder_network(plan, plan.datasheet, 20_000.0)
    own = network.capacitance.diagonal()
    step = expm(
        -network.conductance.toarray() / own[:, None] / plan.converter.sample_rate
    )
    found = kickback_per_charge(plan, plan.datasheet)
    for k in range(15):
        push = np.where(np.arange(15) < k, 1.0, -1.0) / own
        push[k] = 0.0
        voltage = np.zeros(15)
        for _ in range(400):
            voltage = step @ (voltage + push)
        assert found[k] == pytest.approx(
            voltage[k], rel=1e-9, abs=1e-6 * np.abs(found).max()
        )


def test_a_ladder_upside_down_is_the_same_ladder() -> None:
    plan = ladder_plan(
        5,
        total_resistance=5000,
        end_resistance=2,
        bias_current=1e-7,
        resistor_sigma=0.01,
    )
    result = solved(plan)
    assert result.kickback_lsb is not None
    assert result.feedthrough_lsb is not None
    np.testing.assert_allclose(result.lead_lsb, -result.lead_lsb[::-1], atol=1e-12)
    np.testing.assert_allclose(
        result.kickback_lsb, -result.kickback_lsb[::-1], atol=1e-9
    )
    np.testing.assert_allclose(result.bias_lsb, result.bias_lsb[::-1], rtol=1e-9)
    np.testing.assert_allclose(
        result.feedthrough_lsb, result.feedthrough_lsb[::-1], rtol=1e-9
    )
