"""The schemes by name: each module has `decode`, what it means word by word, and `build`, its gates."""

from collections.abc import Callable
from functools import cache
from typing import NamedTuple

from flashplan.decoder.netlist import Netlist
from flashplan.decoder.schemes import (
    fat_tree,
    folded_adder,
    gray_logic,
    gray_rom,
    majority_rom,
    mux_tree,
    ones_counter,
    rom,
    rom_3and,
    sorted_rom,
)
from flashplan.decoder.schemes.lines import Codes, Words
from flashplan.errors import InputError


class SchemeDefinition(NamedTuple):
    """One scheme. decode: words (n, 2**bits - 1) bool -> codes (n,); build: bits -> netlist."""

    decode: Callable[[Words], Codes]
    build: Callable[[int], Netlist]


SCHEMES: dict[str, SchemeDefinition] = {
    name: SchemeDefinition(module.decode, cache(module.build))
    for name, module in {
        "rom": rom,
        "rom-3and": rom_3and,
        "gray-rom": gray_rom,
        "majority-rom": majority_rom,
        "ones-counter": ones_counter,
        "mux-tree": mux_tree,
        "fat-tree": fat_tree,
        "gray-logic": gray_logic,
        "folded-adder": folded_adder,
        "sorted-rom": sorted_rom,
    }.items()
}


def scheme(name: str) -> SchemeDefinition:
    """A scheme by its name. Raises InputError that names the known ones."""
    if name not in SCHEMES:
        known = ", ".join(SCHEMES)
        raise InputError(
            f'unknown decoder scheme "{name}"; the known ones are {known}',
            "decoder.scheme",
        )
    return SCHEMES[name]
