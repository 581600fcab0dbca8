"""Codes from a bench or a transistor-level run, read from a file and refused where they are not what they claim."""

import csv
from dataclasses import dataclass
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from flashplan.errors import InputError

FEWEST_SAMPLES = 1024


@dataclass(frozen=True)
class Capture:
    """A record in the order it was taken. codes: (n,); decisions: (n, 2**bits - 1), lowest threshold first, or None
    where the file holds one column of codes."""

    codes: NDArray[np.int64]
    decisions: NDArray[np.bool_] | None


def read_capture(path: str | Path, bits: int) -> Capture:
    """Read a CSV or .npy file with one column of codes, or one column of 0 and 1 per comparator.

    A CSV file may have one line of column names. Raises InputError that names file and line for a gap, text, a code out
    of range, a wrong number of columns, or too few samples.
    """
    path = Path(path)
    table, first_line = _read_npy(path) if path.suffix == ".npy" else _read_csv(path)
    count = 2**bits - 1
    rows, columns = table.shape
    if columns not in (1, count):
        raise InputError(
            f"has {columns} columns; {bits} bits need 1 (codes) or {count} (one per comparator)",
            str(path),
        )
    if rows < FEWEST_SAMPLES:
        raise InputError(
            f"has {rows} samples; at least {FEWEST_SAMPLES} are needed", str(path)
        )
    top = 1 if columns == count and count > 1 else count
    wrong = ~((table >= 0) & (table <= top) & (table == np.floor(table)))
    if wrong.any():
        row, column = np.argwhere(wrong)[0]
        place = (
            f"{path}: {'row' if path.suffix == '.npy' else 'line'} {row + first_line}"
        )
        what = f"a whole code from 0 to {count}" if columns == 1 else "0 or 1"
        raise InputError(f"expected {what}, found {table[row, column]:g}", place)
    if columns == 1:
        return Capture(table[:, 0].astype(np.int64), None)
    decisions = table.astype(bool)
    return Capture(decisions.sum(axis=1, dtype=np.int64), decisions)


def _read_npy(path: Path) -> tuple[NDArray[np.float64], int]:
    try:
        table = np.load(path, allow_pickle=False)
    except (OSError, ValueError) as error:
        raise InputError(f"cannot read the array: {error}", str(path)) from None
    if table.ndim not in (1, 2) or not (
        np.issubdtype(table.dtype, np.number) or table.dtype == bool
    ):
        raise InputError(
            f"expected one or two dimensions of numbers, found {table.ndim} of {table.dtype}",
            str(path),
        )
    return np.asarray(table.reshape(table.shape[0], -1), dtype=float), 0


def _read_csv(path: Path) -> tuple[NDArray[np.float64], int]:
    try:
        lines = path.read_text(encoding="utf-8").splitlines()
    except (OSError, UnicodeDecodeError) as error:
        raise InputError(
            f"cannot read the file: {getattr(error, 'strerror', None) or error}",
            str(path),
        ) from None
    while lines and not lines[-1].strip():
        lines.pop()
    if not lines:
        raise InputError("is empty", str(path))
    named = not _numbers(next(csv.reader([lines[0]])))
    first_line = 2 if named else 1
    body = lines[1:] if named else lines
    if not body:
        raise InputError("holds a line of names and no samples", str(path))
    try:
        table = np.loadtxt(body, delimiter=",", ndmin=2, comments=None)
    except ValueError:
        table = None
    if table is None or table.shape[0] != len(body):
        raise _first_bad_line(path, body, first_line)
    return table, first_line


def _first_bad_line(path: Path, body: list[str], first_line: int) -> InputError:
    """The slow search for what is wrong, done once the fast reading has failed."""
    width = None
    for number, line in enumerate(body, first_line):
        cells = next(csv.reader([line]), [])
        where = f"{path}: line {number}"
        if not line.strip() or any(not cell.strip() for cell in cells):
            return InputError("a gap where a number is expected", where)
        if not _numbers(cells):
            return InputError(f"expected numbers, found {line.strip()[:40]!r}", where)
        width = len(cells) if width is None else width
        if len(cells) != width:
            return InputError(
                f"has {len(cells)} columns where the first line has {width}", where
            )
    return InputError("is not a table of numbers", str(path))


def _numbers(cells: list[str]) -> bool:
    try:
        return bool([float(cell) for cell in cells])
    except ValueError:
        return False
