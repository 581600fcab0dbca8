"""The reference ladder against closed forms, networkx, scipy and published formulas."""

import networkx as nx
import numpy as np
import pytest
from scipy import signal
from scipy.constants import Boltzmann
from scipy.integrate import solve_ivp
from scipy.linalg import expm

from flashplan.ladder import LadderResult, kickback_per_charge, solve_ladder
from flashplan.ladder.effects import feedthrough_phasor
from flashplan.ladder.modes import network_modes
from flashplan.ladder.network import (
    GROUND,
    Network,
    Part,
    ac_voltages,
    build_network,
    dc_voltages,
)
from flashplan.ladder.reference import build_reference
from flashplan.ladder.response import modal_response, stepped_response
from flashplan.ladder.states import network_states
from flashplan.plan import Datasheet, Plan, changed_plan
from tests.ladder.ladders import ladder_plan as perfect_ladder_plan
from tests.ladder.ladders import reference_of


def ladder_plan(bits: int, **ladder: object) -> Plan:
    resistance = ladder.pop("total_resistance", 200.0)
    return perfect_ladder_plan(bits, float(str(resistance)), **ladder)


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


def test_the_resistance_seen_at_some_taps_of_64_units() -> None:
    # R_th(k) = R_u k (m - k) / m: 0.984375, 7, 12, 16 units at k = 1, 8, 16, 32; closed form.
    plan = ladder_plan(6, total_resistance=64)
    network = ladder_network(plan, plan.datasheet, 64.0)
    seen = np.diag(np.linalg.inv(network.conductance.toarray()))
    np.testing.assert_allclose(seen[[0, 7, 15, 31]], [0.984375, 7, 12, 16], rtol=1e-12)


def test_a_coarse_string_lowers_the_resistance_seen_as_networkx_says() -> None:
    plan = ladder_plan(4, total_resistance=160, coarse_segments=4, coarse_ratio=0.3)
    network = ladder_network(plan, plan.datasheet, 160.0)
    seen = np.diag(np.linalg.inv(network.conductance.toarray()))
    graph = nx.MultiGraph()
    for k in range(16):
        graph.add_edge(k, (k + 1) % 16, ohm=10.0)
    for k in range(0, 16, 4):
        graph.add_edge(k, (k + 4) % 16, ohm=12.0)
    for tap in range(1, 16):
        assert seen[tap - 1] == pytest.approx(
            nx.resistance_distance(graph, 0, tap, weight="ohm", invert_weight=True)
        )


@pytest.mark.parametrize("part", [2.0**-8, 0.01])
def test_a_step_in_the_units_moves_the_middle_tap_by_half_of_it(part: float) -> None:
    # Lower half +p, upper half -p: p 2^(N-1) LSB, so that half an LSB allows p = 2^-N, 0.39 % at 8 bits; closed form.
    m = 256
    units = np.where(np.arange(m) < m // 2, 1 + part, 1 - part)
    nodes = [GROUND, *(f"tap {k}" for k in range(1, m)), "top"]
    parts = [Part("voltage", "top", GROUND, float(m), "top")]
    for k, value in enumerate(units):
        parts.append(Part("resistor", nodes[k], nodes[k + 1], value, f"unit {k + 1}"))
    network = build_network(parts)
    taps = dict(zip(network.names, dc_voltages(network), strict=True))
    errors = np.array([taps[f"tap {k}"] - k for k in range(1, m)])
    assert errors.max() == pytest.approx(part * 2**7)
    assert errors.argmax() == m // 2 - 1


def test_gradients_bow_the_taps_by_a_parabola_and_a_cubic() -> None:
    # Sums of the units' own deviations: linear g (x - 1/2): -g k (m - k) / 2 m, g m / 8 at the middle;
    # quadratic q u^2 with u = 2 x - 1: (q m / 6) (u^3 - u). Closed forms, the second for many small units.
    m, k = 256, np.arange(1, 256)
    linear = solved(ladder_plan(8, gradient_linear=0.01)).gradient_lsb
    np.testing.assert_allclose(linear, -0.01 * k * (m - k) / (2 * m), rtol=1e-9)
    assert linear.min() == pytest.approx(-0.01 * m / 8)
    u = 2 * k / m - 1
    cubic = solved(ladder_plan(8, gradient_quadratic=1e-4)).gradient_lsb
    np.testing.assert_allclose(cubic, 1e-4 * m / 6 * (u**3 - u), rtol=1e-3, atol=1e-7)


def test_a_decoupled_reference_rings_as_two_roots_say() -> None:
    # R - L in series into C beside R2: s^2 L C + s (R C + L / R2) + 1 + R / R2 = 0; any textbook on circuits.
    r, coil, c, load = 2.0, 1e-9, 10e-12, 50.0
    network = build_network(
        [
            Part("voltage", "source", GROUND, 1.0, "source"),
            Part("resistor", "source", "lead", r, "lead"),
            Part("inductor", "lead", "end", coil, "bond"),
            Part("capacitor", "end", GROUND, c, "decoupling"),
            Part("resistor", "end", GROUND, load, "load"),
        ]
    )
    roots = np.roots([coil * c, r * c + coil / load, 1 + r / load])
    found = network_modes(network).rate
    np.testing.assert_allclose(
        np.sort_complex(found), np.sort_complex(-roots), rtol=1e-10
    )
    assert dc_voltages(network)[network.names.index("end")] == pytest.approx(50 / 52)
    frequencies = np.geomspace(1e7, 1e11, 7)
    s = 2j * np.pi * frequencies
    gain = ac_voltages(network, frequencies, {"source": 1.0})
    below = coil * c * s**2 + (r * c + coil / load) * s + 1 + r / load
    np.testing.assert_allclose(
        gain[:, network.names.index("end")], 1 / below, rtol=1e-10
    )


RINGING = {
    "reference_resistance": 1,
    "lead_inductance": "0.5 nH",
    "decoupling_capacitance": "5 pF",
    "rows": 4,
    "turn_resistance": 2,
}


def test_a_ringing_ladder_moves_as_scipy_integrates_it() -> None:
    # scipy.integrate.solve_ivp (Radau) on the same matrices, beside the modes and the steps.
    reference = reference_of(ladder_plan(3, total_resistance=100, **RINGING))
    states = network_states(reference.network)
    storage = states.storage.diagonal()
    system = states.loss.toarray() / storage[:, None]
    charge = reference.taps.T @ np.array([1, 1, 1, 0, -1, -1, -1.0]) * 1e-15
    start = states.nodes.T @ charge / storage
    times = np.array([5e-12, 1e-10, 5e-10, 2e-9])
    integrated = solve_ivp(
        lambda _, x: -system @ x,
        (0, times[-1]),
        start,
        method="Radau",
        jac=-system,
        t_eval=times,
        rtol=1e-8,
        atol=1e-10 * np.abs(start).max(),
    ).y
    expected = (states.nodes @ integrated).T
    # Radau's own tolerance; the steps' 1e-7 of the start, some of which add.
    for respond, part in ((modal_response, 1e-8), (stepped_response, 1e-6)):
        found = respond(reference.network, charge, times)
        np.testing.assert_allclose(found, expected, atol=part * np.abs(start).max())


@pytest.mark.parametrize("layout", [{}, RINGING])
def test_feedthrough_is_the_frequency_response_that_scipy_signal_gives(
    layout: dict[str, object],
) -> None:
    plan = ladder_plan(3, total_resistance=2000, **layout)
    reference = reference_of(plan)
    states = network_states(reference.network)
    storage = states.storage.diagonal()
    # In picoseconds, in which the polynomials that scipy makes of the states are well scaled.
    system = -states.loss.toarray() / storage[:, None] * 1e-12
    coupling = plan.datasheet.coupling_capacitance
    assert coupling is not None
    # The input's slope drives a current into each tap: v_dot = ... + C_c / C u_dot, taken as an input of its own.
    into = states.nodes.T @ (reference.taps.T @ np.full(7, coupling)) / storage
    read = reference.taps.toarray() @ states.nodes.toarray()
    frequencies = np.array([1e8, 1e9, 2e10])
    model = signal.StateSpace(system, into[:, None], read, np.zeros((7, 1)))
    expected = []
    for frequency in frequencies:
        turn = 2 * np.pi * frequency * 1e-12
        per_output = [
            signal.freqresp(
                signal.StateSpace(model.A, model.B, model.C[k : k + 1], [[0.0]]),
                [turn],
            )[1][0]
            for k in range(7)
        ]
        expected.append(1j * turn * np.array(per_output))
    found = feedthrough_phasor(reference, frequencies, 1.0)
    np.testing.assert_allclose(found, expected, rtol=1e-7)


def test_a_unit_step_at_the_input_decays_as_scipy_signal_says() -> None:
    # scipy.signal.lsim of the straight ladder's state space, at rest after a charge.
    reference = reference_of(ladder_plan(4, total_resistance=3000))
    states = network_states(reference.network)
    storage = states.storage.diagonal()
    system = -states.loss.toarray() / storage[:, None]
    charge = reference.taps.T @ np.linspace(-1, 1, 15) * 1e-15
    times = np.linspace(0, 5e-11, 26)
    _, voltages, _ = signal.lsim(
        (system, np.zeros((15, 1)), np.eye(15), np.zeros((15, 1))),
        np.zeros(26),
        times,
        X0=states.nodes.T @ charge / storage,
    )
    found = modal_response(reference.network, charge, times[1:])
    np.testing.assert_allclose(found, voltages[1:], rtol=1e-8, atol=1e-12)


@pytest.mark.parametrize(
    "layout", [{}, {"lead_inductance": "0.1 nH", "end_resistance": 20}]
)
def test_shaped_resistor_noise_adds_up_to_kt_over_c(layout: dict[str, object]) -> None:
    # Each resistor's 4 k T / R (H. Nyquist 1928), through the network, integrated over all frequencies.
    plan = ladder_plan(2, total_resistance=400, tap_capacitance="10 fF", **layout)
    reference = reference_of(plan)
    network = reference.network
    frequencies = np.concatenate([[0.0], np.geomspace(1e7, 1e17, 4001)])
    inductance = network.inductors.value
    size = len(network.names) + inductance.size
    loss = np.zeros((size, size))
    storage = np.zeros((size, size))
    f = len(network.names)
    loss[:f, :f] = network.conductance.toarray()
    loss[:f, f:] = network.inductors.free.toarray()
    loss[f:, :f] = -network.inductors.free.toarray().T
    storage[:f, :f] = network.capacitance.toarray()
    storage[f:, f:] = np.diag(inductance)
    source = np.zeros((size, network.resistors.value.size))
    source[:f] = network.resistors.free.toarray()
    turn = 2j * np.pi * frequencies[:, None, None]
    gain = np.linalg.solve(loss + turn * storage, source[None])[:, :f]
    seen = np.abs(np.einsum("kf,nfr->nkr", reference.taps.toarray(), gain)) ** 2
    density = (seen * 4 * Boltzmann * 300 / network.resistors.value).sum(axis=2)
    total = np.trapezoid(density, frequencies, axis=0)
    noise = solved(plan).noise_sigma_lsb * plan.lsb
    np.testing.assert_allclose(np.sqrt(total), noise, rtol=1e-3)
