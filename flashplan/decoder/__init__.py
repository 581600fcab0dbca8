"""Thermometer code to word: gate netlists, one module per scheme, cost, comparison."""

from flashplan.decoder.compare import (
    DecoderTable,
    SchemeResult,
    compare_schemes,
    rank,
    scheme_energy,
)
from flashplan.decoder.decode import decode
from flashplan.decoder.fault_map import FaultMaps, fault_maps
from flashplan.decoder.verilog import verilog_bench, verilog_module
from flashplan.decoder.words import DecoderWords

__all__ = [
    "DecoderTable",
    "DecoderWords",
    "FaultMaps",
    "SchemeResult",
    "compare_schemes",
    "decode",
    "fault_maps",
    "rank",
    "scheme_energy",
    "verilog_bench",
    "verilog_module",
]
