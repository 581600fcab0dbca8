"""Files of codes: what is read, and what is refused at which line."""

from pathlib import Path

import numpy as np
import pytest

from flashplan.errors import InputError
from flashplan.measure.capture import read_capture

CODES = np.arange(2000) % 64


def write(folder: Path, lines: list[str]) -> Path:
    path = folder / "codes.csv"
    path.write_text("\n".join(lines) + "\n", encoding="utf-8")
    return path


def test_codes_come_back_with_and_without_a_line_of_names(tmp_path: Path) -> None:
    lines = [str(code) for code in CODES]
    for head in ([], ["code"]):
        read = read_capture(write(tmp_path, head + lines), 6)
        assert read.decisions is None
        np.testing.assert_array_equal(read.codes, CODES)


def test_decisions_come_back_with_their_sum_as_the_code(tmp_path: Path) -> None:
    decisions = CODES[:, None] > np.arange(63)
    decisions[5] = np.arange(63) == 40  # a lone bubble
    text = [",".join("1" if d else "0" for d in row) for row in decisions]
    np.save(tmp_path / "d.npy", decisions)
    for path in (write(tmp_path, text), tmp_path / "d.npy"):
        read = read_capture(path, 6)
        assert read.decisions is not None
        np.testing.assert_array_equal(read.decisions, decisions)
        assert read.codes[5] == 1


@pytest.mark.parametrize(
    ("line", "message"),
    [
        ("", "line 101: a gap"),
        ("ten", "line 101: expected numbers, found 'ten'"),
        ("64", "line 101: expected a whole code from 0 to 63, found 64"),
        ("-1", "line 101: expected a whole code from 0 to 63, found -1"),
        ("3.5", "line 101: expected a whole code from 0 to 63, found 3.5"),
        ("nan", "line 101: expected a whole code from 0 to 63, found nan"),
        ("3,4", "line 101: has 2 columns where the first line has 1"),
    ],
)
def test_a_bad_line_is_named(tmp_path: Path, line: str, message: str) -> None:
    lines = [str(code) for code in CODES]
    lines[100] = line
    with pytest.raises(InputError, match=message):
        read_capture(write(tmp_path, lines), 6)


def test_the_line_of_names_counts(tmp_path: Path) -> None:
    lines = ["code", *(str(code) for code in CODES)]
    lines[100] = "64"
    with pytest.raises(InputError, match="line 101:"):
        read_capture(write(tmp_path, lines), 6)


@pytest.mark.parametrize(
    ("lines", "message"),
    [
        (["1,2,3"] * 2000, "has 3 columns; 6 bits need 1 .* or 63"),
        (["1"] * 1000, "has 1000 samples; at least 1024"),
        ([], "is empty"),
        (["code"], "a line of names and no samples"),
        (["2," + ",".join(["0"] * 62)] * 2000, "line 1: expected 0 or 1, found 2"),
    ],
)
def test_a_wrong_table_is_refused(
    tmp_path: Path, lines: list[str], message: str
) -> None:
    path = tmp_path / "codes.csv"
    path.write_text("".join(line + "\n" for line in lines), encoding="utf-8")
    with pytest.raises(InputError, match=message):
        read_capture(path, 6)


def test_a_missing_or_foreign_file_is_refused(tmp_path: Path) -> None:
    foreign = tmp_path / "codes.npy"
    foreign.write_bytes(b"not an array")
    objects = tmp_path / "objects.npy"
    np.save(objects, np.array([{}], dtype=object), allow_pickle=True)
    for path in (tmp_path / "none.csv", tmp_path / "none.npy", foreign, objects):
        with pytest.raises(InputError, match=path.name):
            read_capture(path, 6)
