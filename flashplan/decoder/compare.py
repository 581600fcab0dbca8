"""All schemes on the same thermometer words: how wrong each one is, what it costs, and which to take."""

from collections.abc import Sequence
from dataclasses import asdict, dataclass
from typing import Any, Literal

import numpy as np

from flashplan.decoder.cost import PackedWords, transitions_per_word
from flashplan.decoder.evaluate import compile_netlist, pack, run, unpack_codes
from flashplan.decoder.netlist import depth, fan_out, gate_total, transistors
from flashplan.decoder.schemes import SCHEMES
from flashplan.decoder.undecided import undecided_errors
from flashplan.decoder.words import DecoderWords, clean_words
from flashplan.metrics.bubbles import count_bubbles_by_order
from flashplan.plan.model import Plan

Order = Literal["energy", "error", "depth"]

# A decoder is good enough when it costs no more effective bits than this, as `enob_loss` counts them.
ENOB_LOSS = 0.01


@dataclass(frozen=True)
class SchemeResult:
    """One scheme on the words of a run; errors in LSB against the number of thresholds passed.

    gates, depth, largest_fan_out, transistors: off the netlist. rms_error_lsb, max_error_lsb, wrong_word_rate,
    sparkle_rate (errors over 2 LSB): over all conversions. undecided_*: given an undecided comparator, to the nearer
    legal code; the two rates are per conversion; undecided_exact: all readings tried. transitions: gate outputs that
    change per conversion; energy: J per conversion, None without decoder.gate_energy (J per transition). enob_loss:
    effective bits that the errors cost beside the error power of the ENOB goal. good_enough: within ENOB_LOSS, and
    sparkles from undecided comparators within the word error goal.
    """

    name: str
    gates: int
    depth: int
    largest_fan_out: int
    transistors: int
    rms_error_lsb: float
    max_error_lsb: int
    wrong_word_rate: float
    sparkle_rate: float
    undecided_rms_error_lsb: float
    undecided_max_error_lsb: int
    undecided_wrong_rate: float
    undecided_sparkle_rate: float
    undecided_exact: bool
    transitions: float
    energy: float | None
    enob_loss: float
    good_enough: bool


@dataclass(frozen=True)
class DecoderTable:
    """All schemes, the bubbles they met, and in plain words which is the cheapest that will do."""

    schemes: tuple[SchemeResult, ...]
    conversions: int
    bubbles_by_order: dict[int, int]
    sentence: str

    def to_dict(self) -> dict[str, Any]:
        """Plain types for JSON."""
        return {
            "schemes": [asdict(scheme) for scheme in self.schemes],
            "conversions": self.conversions,
            "bubbles_by_order": {
                str(order): count for order, count in self.bubbles_by_order.items()
            },
            "sentence": self.sentence,
        }


def compare_schemes(plan: Plan, words: DecoderWords) -> DecoderTable:
    """Every scheme through its gates on the words of the plan's array.

    Readings of comparators with many readers are drawn from the plan's seed, the same for every scheme.
    """
    conversions = int(words.clean_counts.sum()) + words.bubbly.shape[0]
    packed = _packed(words)
    passed = words.bubbly.sum(axis=1, dtype=np.int64)
    schemes = tuple(_judge(name, plan, words, packed, passed) for name in SCHEMES)
    orders = count_bubbles_by_order(words.bubbly)
    return DecoderTable(schemes, conversions, orders, _sentence(schemes, orders))


def scheme_energy(plan: Plan, words: DecoderWords) -> float | None:
    """Energy of the plan's own scheme in J per conversion, None without decoder.gate_energy."""
    if plan.decoder.gate_energy is None:
        return None
    program = compile_netlist(SCHEMES[plan.decoder.scheme].build(plan.converter.bits))
    return plan.decoder.gate_energy * transitions_per_word(program, _packed(words))


def _packed(words: DecoderWords) -> PackedWords:
    comparators = words.clean_counts.size - 1
    return PackedWords(
        pack(clean_words(comparators)),
        words.clean_counts,
        pack(words.bubbly),
        words.bubbly.shape[0],
    )


def rank(schemes: Sequence[SchemeResult], by: Order) -> list[SchemeResult]:
    """Best first: by error (rms, then undecided rms), depth, or energy (transitions); transistors break ties."""
    keys = {
        "error": lambda s: (s.rms_error_lsb, s.undecided_rms_error_lsb, s.transistors),
        "depth": lambda s: (s.depth, s.transistors),
        "energy": lambda s: (s.transitions, s.transistors),
    }
    return sorted(schemes, key=keys[by])


def _judge(
    name: str,
    plan: Plan,
    words: DecoderWords,
    packed: PackedWords,
    passed: np.ndarray[Any, np.dtype[np.int64]],
) -> SchemeResult:
    netlist = SCHEMES[name].build(plan.converter.bits)
    program = compile_netlist(netlist)
    clean = unpack_codes(run(program, packed.clean), packed.clean_counts.size)
    bubbly = unpack_codes(run(program, packed.bubbly), packed.bubbly_count)
    counts = np.concatenate(
        [packed.clean_counts, np.ones(packed.bubbly_count, dtype=np.int64)]
    )
    errors = np.abs(
        np.concatenate([clean - np.arange(plan.comparators + 1), bubbly - passed])
    )
    total = max(int(counts.sum()), 1)
    power = float(counts @ errors**2.0) / total
    undecided = undecided_errors(program, words, np.random.default_rng(plan.array.seed))
    transitions = transitions_per_word(program, packed)
    gate_energy = plan.decoder.gate_energy
    allowed = 4.0 ** (plan.converter.bits - plan.goals.enob) / 12
    loss = 0.5 * float(np.log2(1 + power / allowed))
    return SchemeResult(
        name=name,
        gates=gate_total(netlist),
        depth=depth(netlist),
        largest_fan_out=max(fan_out(netlist).values()),
        transistors=transistors(netlist),
        rms_error_lsb=float(np.sqrt(power)),
        max_error_lsb=int(errors[counts > 0].max(initial=0)),
        wrong_word_rate=int(counts @ (errors > 0)) / total,
        sparkle_rate=int(counts @ (errors > 2)) / total,
        undecided_rms_error_lsb=undecided.rms_lsb,
        undecided_max_error_lsb=undecided.max_lsb,
        undecided_wrong_rate=undecided.wrong_rate,
        undecided_sparkle_rate=undecided.sparkle_rate,
        undecided_exact=undecided.exact,
        transitions=transitions,
        energy=None if gate_energy is None else gate_energy * transitions,
        enob_loss=loss,
        good_enough=loss <= ENOB_LOSS
        and undecided.sparkle_rate <= plan.goals.word_error_rate,
    )


def _sentence(schemes: tuple[SchemeResult, ...], orders: dict[int, int]) -> str:
    good = [scheme for scheme in schemes if scheme.good_enough]
    met = (
        f"bubbles up to order {max(orders)}"
        if orders
        else "no bubbles, so these words cannot tell the schemes apart but for undecided comparators"
    )
    if not good:
        return f"The array makes {met}; no scheme is good enough."
    cheapest = min(good, key=lambda scheme: scheme.transistors)
    return (
        f"The array makes {met}; the cheapest scheme that costs at most {ENOB_LOSS:g} effective bits and keeps sparkles"
        f" within the word error goal is {cheapest.name}, with about {cheapest.transistors} transistors."
    )
