"""A decoder as plain structural Verilog, with a test bench that checks itself against given words."""

import numpy as np
from numpy.typing import NDArray

from flashplan.decoder.netlist import Netlist, gates

_JOIN = {"and": " & ", "or": " | ", "wired-or": " | ", "xor": " ^ ", "sum": " ^ "}


def verilog_module(netlist: Netlist) -> str:
    """One module: input t[M:1], threshold 1 in t[1]; output code[bits-1:0]; one assignment a gate.

    Source: IEEE Std 1364-2005, continuous assignments (memory).
    """
    nodes = netlist.graph.nodes
    lines = [
        f"module {module_name(netlist)} (",
        f"    input wire [{len(netlist.inputs)}:1] t,",
        f"    output wire [{len(netlist.outputs) - 1}:0] code",
        ");",
    ]
    for net in gates(netlist):
        reads = [_net(netlist, source) for source in nodes[net]["inputs"]]
        lines.append(f"    wire {net} = {_expression(nodes[net]['kind'], reads)};")
    for bit, net in enumerate(netlist.outputs):
        lines.append(f"    assign code[{bit}] = {_net(netlist, net)};")
    return "\n".join([*lines, "endmodule", ""])


def verilog_bench(
    netlist: Netlist, words: NDArray[np.bool_], codes: NDArray[np.int64]
) -> str:
    """A bench that applies words (n, M) and compares with codes (n,): prints PASS, or each failure and FAIL.

    The words stand in the bench itself, so that it needs no other file.
    """
    width, bits = len(netlist.inputs), len(netlist.outputs)
    lines = [
        "module bench;",
        f"    reg [{width}:1] t;",
        f"    wire [{bits - 1}:0] code;",
        "    integer failures = 0;",
        f"    {module_name(netlist)} decoder (.t(t), .code(code));",
        f"    task check(input [{width}:1] word, input [{bits - 1}:0] expected);",
        "        begin",
        "            t = word;",
        "            #1;",
        "            if (code !== expected) begin",
        "                failures = failures + 1;",
        '                $display("word %b gives %0d, not %0d", word, code, expected);',
        "            end",
        "        end",
        "    endtask",
        "    initial begin",
    ]
    for word, code in zip(words.tolist(), codes.tolist(), strict=True):
        value = "".join("01"[bit] for bit in word[::-1])
        lines.append(f"        check({width}'b{value}, {bits}'d{code});")
    lines += [
        f'        if (failures == 0) $display("PASS %0d words", {len(codes)});',
        '        else $display("FAIL %0d words", failures);',
        "        $finish;",
        "    end",
        "endmodule",
        "",
    ]
    return "\n".join(lines)


def module_name(netlist: Netlist) -> str:
    """Name of the scheme's module, as Verilog allows it."""
    return f"{netlist.name.replace('-', '_')}_{len(netlist.outputs)}"


def _net(netlist: Netlist, net: str) -> str:
    kind = netlist.graph.nodes[net]["kind"]
    return f"t[{net[1:]}]" if kind == "input" else net


def _expression(kind: str, reads: list[str]) -> str:
    if kind == "not":
        return f"~{reads[0]}"
    if kind == "mux":
        select, low, high = reads
        return f"{select} ? {high} : {low}"
    if kind == "carry":
        a, b, c = reads
        return f"({a} & {b}) | ({a} & {c}) | ({b} & {c})"
    return _JOIN[kind].join(reads)
