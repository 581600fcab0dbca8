"""One module a scheme, each with the word definition `decode(words)` and the gates `build(bits)` side by side."""

from types import ModuleType

from flashplan.decoder.schemes import (
    fat_tree,
    gray_logic,
    gray_rom,
    majority_rom,
    mux_tree,
    ones_counter,
    rom,
    rom_3and,
)

SCHEMES: dict[str, ModuleType] = {
    "rom": rom,
    "rom-3and": rom_3and,
    "gray-rom": gray_rom,
    "majority-rom": majority_rom,
    "ones-counter": ones_counter,
    "mux-tree": mux_tree,
    "fat-tree": fat_tree,
    "gray-logic": gray_logic,
}
