"""The exported Verilog passes its own bench in a Verilog simulator, and the bench can fail."""

import shutil
import subprocess

import numpy as np
import pytest

from flashplan.decoder import decode, verilog_bench, verilog_module
from flashplan.decoder.schemes import SCHEMES

pytestmark = pytest.mark.skipif(
    shutil.which("iverilog") is None, reason="no iverilog to simulate Verilog with"
)


def simulated(folder, netlist, words, codes):
    source, program = folder / "decoder.v", folder / "decoder.vvp"
    source.write_text(verilog_module(netlist) + verilog_bench(netlist, words, codes))
    subprocess.run(["iverilog", "-g2005", "-o", program, source], check=True)
    run = subprocess.run(["vvp", program], check=True, capture_output=True, text=True)
    return run.stdout


@pytest.mark.parametrize("name", SCHEMES)
@pytest.mark.parametrize("bits", [2, 3, 6])
def test_exported_verilog_passes_its_own_bench(name, bits, tmp_path):
    rng = np.random.default_rng(3)
    width = 2**bits - 1
    words = (np.arange(width) < rng.integers(0, width + 1, (200, 1))) ^ (
        rng.random((200, width)) < 0.05
    )
    netlist = SCHEMES[name].build(bits)
    printed = simulated(tmp_path, netlist, words, decode(name, words))
    assert printed.strip() == "PASS 200 words"


def test_the_bench_fails_on_a_wrong_code(tmp_path):
    words = np.array([[1, 1, 0], [1, 0, 0]], dtype=bool)
    netlist = SCHEMES["rom"].build(2)
    printed = simulated(tmp_path, netlist, words, np.array([2, 2]))
    assert "word 001 gives 1, not 2" in printed
    assert "FAIL 1 words" in printed
