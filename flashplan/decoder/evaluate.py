"""Evaluates a netlist bit-parallel: 64 thermometer words to a machine word, gate after gate."""

from collections import Counter
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from flashplan.decoder.netlist import Netlist, gates

Lanes = NDArray[np.uint64]

# Columns of 64 words evaluated at once: long enough to hide the cost of a call, short enough for the rows that one gate
# touches to stay in a processor's nearest cache.
_COLUMNS = 2048
# Words turned from rows into bit rows at once; a longer block leaves the cache.
_WORDS = 512


@dataclass(frozen=True)
class Program:
    """A netlist as a straight line of operations on rows of a value table.

    steps: (kind, row written, rows read), each after the rows that it reads; inputs are rows 0 .. inputs - 1, and each
    step writes the next row.
    """

    inputs: int
    steps: tuple[tuple[str, int, tuple[int, ...]], ...]
    outputs: tuple[int, ...]


def compile_netlist(netlist: Netlist) -> Program:
    """The netlist as a program, one step a gate."""
    order = list(netlist.inputs) + gates(netlist)
    row = {net: index for index, net in enumerate(order)}
    nodes = netlist.graph.nodes
    steps = tuple(
        (
            nodes[net]["kind"],
            row[net],
            tuple(row[source] for source in nodes[net]["inputs"]),
        )
        for net in order[len(netlist.inputs) :]
    )
    return Program(
        len(netlist.inputs), steps, tuple(row[net] for net in netlist.outputs)
    )


def split_readers(program: Program) -> tuple[Program, NDArray[np.int64]]:
    """A program in which every reader of an input has an input of its own, and which old input each new one was.

    The readers of an undecided comparator may each see another level; an output that is the input itself counts as a
    reader. Readers of one input follow each other.
    """
    reads = Counter(row for _, _, rows in program.steps for row in rows)
    reads.update(program.outputs)
    readers = np.array([max(reads[row], 1) for row in range(program.inputs)])
    origin = np.repeat(np.arange(program.inputs), readers)
    free = (np.cumsum(readers) - readers).tolist()
    shift = origin.size - program.inputs

    def take(row: int) -> int:
        if row >= program.inputs:
            return row + shift
        free[row] += 1
        return free[row] - 1

    steps = tuple(
        (kind, written + shift, tuple(take(row) for row in rows))
        for kind, written, rows in program.steps
    )
    outputs = tuple(take(row) for row in program.outputs)
    return Program(origin.size, steps, outputs), origin


def pack(words: NDArray[np.bool_]) -> Lanes:
    """Words (n, M) bool as bit rows (M, ceil(n / 64)) uint64; word i is bit i % 64 of column i // 64."""
    count, width = words.shape
    packed = np.zeros((width, -(-count // 64) * 8), dtype=np.uint8)
    for start in range(0, count, _WORDS):
        turned = np.ascontiguousarray(words[start : start + _WORDS].T)
        rows = np.packbits(turned, axis=1, bitorder="little")
        packed[:, start // 8 : start // 8 + rows.shape[1]] = rows
    return packed.view(np.dtype("<u8"))


def unpack_codes(rows: Lanes, count: int) -> NDArray[np.int64]:
    """Bit rows (bits, columns), lowest bit first, as `count` codes."""
    levels = np.unpackbits(
        np.ascontiguousarray(rows).view(np.uint8), axis=1, bitorder="little"
    )
    codes = np.zeros(count, dtype=np.int64)
    for bit, level in enumerate(levels):
        codes |= level[:count].astype(np.int64) << bit
    return codes


def run(program: Program, lanes: Lanes) -> Lanes:
    """Output rows (bits, columns) for input rows (inputs, columns). Any dtype with bitwise operators will do, bool too."""
    compact, slots = _reuse_rows(program)
    columns = lanes.shape[1]
    result = np.empty((len(program.outputs), columns), dtype=lanes.dtype)
    table = np.empty((slots, min(columns, _COLUMNS)), lanes.dtype)
    for start in range(0, columns, _COLUMNS):
        part = lanes[:, start : start + _COLUMNS]
        values = list(part) + list(table[:, : part.shape[1]])
        _execute(compact.steps, values)
        for bit, row in enumerate(compact.outputs):
            result[bit, start : start + _COLUMNS] = values[row]
    return result


def run_all(program: Program, lanes: Lanes) -> list[Lanes]:
    """Values of every row, inputs first, for input rows (inputs, columns)."""
    table = np.empty((len(program.steps), lanes.shape[1]), lanes.dtype)
    values = list(lanes) + list(table)
    _execute(program.steps, values)
    return values


def _reuse_rows(program: Program) -> tuple[Program, int]:
    """The same program on as few rows as it needs at any time, and how many beside the inputs."""
    last = {
        row: index for index, (_, _, rows) in enumerate(program.steps) for row in rows
    }
    last.update(dict.fromkeys(program.outputs, len(program.steps)))
    place = {row: row for row in range(program.inputs)}
    free: list[int] = []
    slots = 0
    steps = []
    for index, (kind, written, rows) in enumerate(program.steps):
        if not free:
            free.append(program.inputs + slots)
            slots += 1
        # Taken before the rows read are given back: a gate may not write over what it still reads.
        place[written] = free.pop()
        steps.append((kind, place[written], tuple(place[row] for row in rows)))
        free += [
            place[row]
            for row in set(rows)
            if row >= program.inputs and last[row] == index
        ]
    outputs = tuple(place[row] for row in program.outputs)
    return Program(program.inputs, tuple(steps), outputs), slots


def _execute(
    steps: tuple[tuple[str, int, tuple[int, ...]], ...], values: list[Lanes]
) -> None:
    """Write every step's row, in place."""
    scratch = np.empty_like(values[0])
    for kind, written, rows in steps:
        out = values[written]
        first, last = values[rows[0]], values[rows[-1]]
        if kind == "not":
            np.bitwise_not(first, out)
        elif kind == "mux":
            low = values[rows[1]]
            np.bitwise_xor(low, last, out)
            np.bitwise_and(out, first, out)
            np.bitwise_xor(out, low, out)
        elif kind == "carry":
            # The majority is the first bit unless both others differ from it.
            np.bitwise_xor(first, values[rows[1]], out)
            np.bitwise_xor(first, last, scratch)
            np.bitwise_and(out, scratch, out)
            np.bitwise_xor(out, first, out)
        else:
            operate = _MANY[kind]
            operate(first, values[rows[1]], out)
            for row in rows[2:]:
                operate(out, values[row], out)


_MANY = {
    "and": np.bitwise_and,
    "or": np.bitwise_or,
    "wired-or": np.bitwise_or,
    "xor": np.bitwise_xor,
    "sum": np.bitwise_xor,
}


def evaluate(program: Program, words: NDArray[np.bool_]) -> NDArray[np.int64]:
    """Codes (n,) of words (n, inputs) bool through the gates; bounded memory beside the packed words."""
    return unpack_codes(run(program, pack(words)), words.shape[0])
