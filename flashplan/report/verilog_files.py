"""The plan's decoder as Verilog files: the module, and a bench that checks it against the word definition."""

from pathlib import Path

import numpy as np

from flashplan.decoder import decode, verilog_bench, verilog_module
from flashplan.decoder.schemes import SCHEMES
from flashplan.decoder.words import clean_words
from flashplan.files import make_folder, write_whole
from flashplan.plan.model import Plan

_BUBBLY = 1000
_FLIPPED = 0.03  # part of the decisions of those words that are wrong


def write_verilog(plan: Plan, folder: Path) -> None:
    """Write decoder.v and bench.v for the plan's scheme. Vectors: every clean word, and a thousand with random bubbles.

    Raises InputError.
    """
    generator = np.random.default_rng(plan.array.seed)
    clean = clean_words(plan.comparators)
    bubbly = clean[generator.integers(0, clean.shape[0], _BUBBLY)]
    bubbly = bubbly ^ (generator.random(bubbly.shape) < _FLIPPED)
    words = np.concatenate([clean, bubbly])
    scheme = plan.decoder.scheme
    netlist = SCHEMES[scheme].build(plan.converter.bits)
    make_folder(folder)
    write_whole(folder / "decoder.v", verilog_module(netlist))
    write_whole(
        folder / "bench.v", verilog_bench(netlist, words, decode(scheme, words))
    )
