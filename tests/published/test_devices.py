"""MOS equation, matching and noise against handbook limits and published figures."""

from dataclasses import replace

import numpy as np
import pytest
from scipy.special import wrightomega

from flashplan.cell.charge import inversion_charge
from flashplan.cell.circuit import device_parameters
from flashplan.cell.device import (
    channel_state,
    drain_current,
    small_signal,
    transit_frequency,
)
from flashplan.cell.device_noise import sampled_noise, thermal_current_density
from flashplan.cell.mismatch import draw_mismatch, pair_sigma
from flashplan.cell.process import (
    BOLTZMANN,
    at_corner,
    at_temperature,
    choose_process,
    generic_names,
    load_process,
)

LONG = load_process("generic-2um")


def parameters(process=LONG, width=10e-6, length=10e-6, kind="nmos", **changes):
    polarity = getattr(process, kind).model_copy(update=changes)
    return device_parameters(process, [polarity], np.array([width]), np.array([length]))


def long_channel(**changes):
    """No velocity saturation and no channel-length modulation to speak of: the textbook device."""
    return parameters(saturation_velocity=1e12, early_field=1e15, **changes)


def test_inversion_charge_is_the_omega_function():
    # scipy.special.wrightomega solves w + ln w = x independently
    x = np.linspace(-29, 400, 4001)
    expected = wrightomega(x + np.log(2)).real / 2
    assert np.max(np.abs(inversion_charge(x) / expected - 1)) < 5e-9


def test_strong_inversion_follows_the_square_law():
    # I = beta Vov^2 / (2 n) in saturation, the long-channel limit of every textbook
    p = long_channel()
    overdrive = 3.0
    beta = LONG.nmos.mobility_factor
    current = drain_current(p, p.threshold + overdrive, np.array([5.0]), np.zeros(1))
    expected = beta / (2 * LONG.nmos.slope_factor) * overdrive**2
    assert current == pytest.approx(expected, rel=0.08)
    # within the logarithm that moderate inversion adds, and it approaches the law as the overdrive grows over n U_T
    doubled = drain_current(p, p.threshold + 30.0, np.array([60.0]), np.zeros(1))
    assert doubled == pytest.approx(expected * 100, rel=0.015)


def test_triode_region_is_the_square_laws():
    # I = beta (Vov Vds - n Vds^2 / 2), source at the bulk
    p = long_channel()
    overdrive, across = 10.0, 1.0
    current = drain_current(p, p.threshold + overdrive, np.array([across]), np.zeros(1))
    expected = LONG.nmos.mobility_factor * (
        overdrive * across - LONG.nmos.slope_factor * across**2 / 2
    )
    assert current == pytest.approx(expected, rel=0.02)


def test_weak_inversion_is_exponential_with_the_slope_factor():
    # one decade per n U_T ln 10; gm/ID = 1 / (n U_T), 29.8 per V at n = 1.3 and 300 K
    p = long_channel(slope_factor=1.3)
    gates = p.threshold + np.array(
        [-0.5, -0.5 + 1.3 * LONG.thermal_voltage * np.log(10)]
    )
    current = drain_current(p, gates, np.array([1.0]), np.zeros(1))
    assert current[1] / current[0] == pytest.approx(10.0, rel=1e-3)
    point = small_signal(p, p.threshold - 0.5, np.array([1.0]), np.zeros(1))
    assert point.efficiency == pytest.approx(29.8, rel=2e-3)


@pytest.mark.parametrize(
    ("inversion", "expected"), [(0.01, 0.990), (1.0, 0.618), (100.0, 0.0951)]
)
def test_normalised_transconductance_efficiency(inversion, expected):
    # C. Enz, F. Krummenacher, E. Vittoz 1995 (from memory; form from the interpolation IC = q + q^2)
    p = long_channel()
    charge = (np.sqrt(1 + 4 * inversion) - 1) / 2
    gate = p.threshold + LONG.nmos.slope_factor * LONG.thermal_voltage * (
        2 * charge + np.log(charge)
    )
    point = small_signal(p, gate, np.array([60.0]), np.zeros(1))
    assert point.inversion == pytest.approx(inversion, rel=1e-6)
    normalised = point.efficiency * LONG.nmos.slope_factor * LONG.thermal_voltage
    assert normalised == pytest.approx(expected, rel=1e-3)


def test_velocity_saturation_makes_the_current_linear_in_the_overdrive():
    # limit of a very short channel: I = W C_ox v_sat Vov (n = 1 at the drain end; handbook)
    process = load_process("generic-28nm")
    p = parameters(process, 1e-6, 1e-9, slope_factor=1.0, early_field=1e15)
    overdrive = 5.0
    current = drain_current(p, p.threshold + overdrive, np.array([9.0]), np.zeros(1))
    expected = (
        1e-6 * process.oxide_capacitance * process.nmos.saturation_velocity * overdrive
    )
    assert current == pytest.approx(expected, rel=0.03)


def test_current_is_symmetric_and_smooth_through_zero_drain_voltage():
    p = parameters(load_process("generic-28nm"), 1e-6, 30e-9)
    across = np.linspace(-0.05, 0.05, 41)
    forward = drain_current(p, np.array([0.7]), 0.2 + across / 2, 0.2 - across / 2)
    assert forward == pytest.approx(-forward[::-1], rel=1e-9, abs=1e-15)
    # a kink of the second derivative would show as a third difference that does not shrink with the step
    third = np.abs(np.diff(forward, 3)).max() / np.abs(np.diff(forward)).max()
    fine = np.linspace(-0.005, 0.005, 41)
    closer = drain_current(p, np.array([0.7]), 0.2 + fine / 2, 0.2 - fine / 2)
    assert np.abs(np.diff(closer, 3)).max() / np.abs(np.diff(closer)).max() < third / 50


def test_output_conductance_is_never_negative():
    for name in generic_names():
        process = load_process(name)
        for kind in ("nmos", "pmos"):
            p = parameters(
                process, 10 * process.minimum_width, process.minimum_length, kind
            )
            drain = np.linspace(0.0, process.supply, 200)[:, None]
            gate = np.linspace(0.0, process.supply, 30)[None, :]
            current = drain_current(p, gate, drain, np.zeros(1))
            assert np.all(np.diff(current, axis=0) > -1e-12 * current.max())


def test_intrinsic_gain_example():
    # Sedra & Smith Ex. 6.1: 0.1 mA, beta 267e-6 * 10, V_A = 5 V/um * 0.4 um: gm 0.73 mA/V, r_o 20 kohm, gain 14.6.
    # Their square law is ours at n = 1 without velocity saturation, to the few percent of moderate inversion.
    p = parameters(
        LONG,
        4e-6,
        0.4e-6,
        mobility_factor=267e-6,
        slope_factor=1.0,
        saturation_velocity=1e12,
        early_field=5e6,
    )
    gate = np.linspace(0.9, 1.4, 20001)
    drain = np.array([1.2])
    # the example's current is the one without channel-length modulation
    flat = replace(p, early_voltage=np.array([1e9]))
    chosen = gate[
        [np.argmin(np.abs(drain_current(flat, gate, drain, np.zeros(1)) - 1e-4))]
    ]
    assert small_signal(flat, chosen, drain, np.zeros(1)).transconductance == (
        pytest.approx(0.73e-3, rel=0.1)
    )
    point = small_signal(p, chosen, drain, np.zeros(1))
    assert point.output_conductance == pytest.approx(1 / 20e3, rel=0.05)


def test_thermal_noise_is_two_thirds_in_strong_and_shot_noise_in_weak_inversion():
    # 4 k T (2/3) gm (van der Ziel) and 2 q I, the two textbook limits
    p = long_channel()
    for gate, expected in (
        (p.threshold + 20.0, "thermal"),
        (p.threshold - 0.4, "shot"),
    ):
        state = channel_state(p, gate, np.array([60.0]), np.zeros(1))
        density = thermal_current_density(p, state, np.ones(1))
        point = small_signal(p, gate, np.array([60.0]), np.zeros(1))
        if expected == "thermal":
            reference = 4 * BOLTZMANN * 300 * (2 / 3) * point.source_transconductance
        else:
            reference = 2 * 1.602176634e-19 * point.current
        assert density == pytest.approx(reference, rel=0.02)


def test_sampled_noise_of_a_picofarad():
    # any handbook: 64.4 uV rms at 300 K
    assert sampled_noise(1e-12, 300.0) == pytest.approx(64.4e-6, abs=0.05e-6)


@pytest.mark.parametrize(
    ("matching", "width", "length", "expected", "tolerance"),
    [
        (30e-9, 20e-6, 20e-6, 1.5e-3, 1e-6),  # Pelgrom et al. 1989 (from memory)
        (3.9e-9, 10e-6, 5e-6, 0.55e-3, 5e-6),  # JKU Linz notes, SG13G2 example box
        (3.9e-9, 20e-6, 3e-6, 0.50e-3, 5e-6),  # the same
        (5e-9, 5e-6, 5e-6, 1e-3, 1e-9),  # the same, exam question 11.1
    ],
)
def test_area_law(matching, width, length, expected, tolerance):
    assert pair_sigma(matching, width, length) == pytest.approx(expected, abs=tolerance)


def test_draws_follow_the_area_law():
    draws = draw_mismatch(np.array([1e-3, 3e-3]), 40_000, np.random.default_rng(1))
    # 4 standard errors of a standard deviation from 40 000 draws
    assert draws.std(axis=1) == pytest.approx([1e-3, 3e-3], rel=4 / np.sqrt(80_000))


def test_generic_matching_lies_in_published_ranges():
    # A_VT: about 1 mV um per nm of oxide (Pelgrom, Tuinhout, Vertregt 1998) and 0.18 um: 4-5, 65 nm: 3-3.5 mV um
    # (both from memory); within 30 % of the range's ends
    published = {"generic-180nm": (4e-9, 5e-9), "generic-65nm": (3e-9, 3.5e-9)}
    for name, (low, high) in published.items():
        assert low / 1.3 < load_process(name).nmos.threshold_matching < high * 1.3
    for name in ("generic-2um", "generic-1um"):
        process = load_process(name)
        oxide = 3.45e-11 / process.oxide_capacitance
        # 1 mV um per nm is 1 V
        ratio = process.nmos.threshold_matching / oxide
        assert ratio == pytest.approx(1.0, rel=0.35)


def test_corners_and_temperature_move_the_current_the_right_way():
    process = load_process("generic-65nm")

    def current(p):
        q = parameters(p, 1e-6, p.minimum_length)
        return drain_current(q, np.array([1.0]), np.array([1.2]), np.zeros(1))[0]

    assert current(at_corner(process, "slow", "typical")) < current(process)
    assert current(at_corner(process, "fast", "typical")) > current(process)
    assert current(at_temperature(process, 400.0)) < current(
        process
    )  # strong inversion


def test_process_is_chosen_by_supply():
    assert choose_process(1.2).name == "generic-65nm"
    assert choose_process(1.0).name == "generic-28nm"
    assert choose_process(5.0).name == "generic-1um"


def test_transit_frequency_of_a_saturated_channel():
    # f_T = 1.5 mu (V_GS - V_T) / (2 pi n L^2) with 2/3 W L C_ox of gate capacitance, the long-channel handbook form
    p = long_channel()
    overdrive, length = 20.0, 10e-6
    point = small_signal(p, p.threshold + overdrive, np.array([60.0]), np.zeros(1))
    capacitance = 2 / 3 * LONG.oxide_capacitance * 10e-6 * length
    mobility = LONG.nmos.mobility_factor / LONG.oxide_capacitance
    expected = (
        1.5 * mobility * overdrive / (2 * np.pi * LONG.nmos.slope_factor * length**2)
    )
    found = transit_frequency(point.transconductance, np.array([capacitance]))
    assert found == pytest.approx(expected, rel=0.02)
