"""Output files, written whole or not at all."""

import csv
import io
import json
import os
import tempfile
from collections.abc import Iterable, Sequence
from pathlib import Path
from typing import Any

from flashplan.errors import InputError


def write_whole(path: str | Path, content: str | bytes) -> None:
    """Write a file so that a reader, or an interruption, never meets half of it. Raises InputError."""
    path = Path(path)
    data = content.encode() if isinstance(content, str) else content
    temporary = None
    try:
        with tempfile.NamedTemporaryFile(
            dir=path.parent, prefix=f".{path.name}.", delete=False
        ) as file:
            temporary = file.name
            file.write(data)
        os.chmod(temporary, 0o666 & ~_umask())
        os.replace(temporary, path)
    except OSError as error:
        raise InputError(
            f"cannot write the file: {error.strerror or error}", str(path)
        ) from None
    finally:
        if temporary is not None and os.path.exists(temporary):
            os.unlink(temporary)


def make_folder(folder: str | Path) -> None:
    """Make a folder, and those above it, where it is not there. Raises InputError."""
    try:
        Path(folder).mkdir(parents=True, exist_ok=True)
    except OSError as error:
        raise InputError(
            f"cannot make the folder: {error.strerror or error}", str(folder)
        ) from None


def as_json(document: dict[str, Any]) -> str:
    """One JSON document as text; a number that is not finite is an error of ours, not JSON."""
    return json.dumps(document, indent=2, allow_nan=False, ensure_ascii=False) + "\n"


def as_csv(columns: Sequence[str], rows: Iterable[Sequence[Any]]) -> str:
    """A table with its column names in the first line; what is not known is empty."""
    buffer = io.StringIO()
    writer = csv.writer(buffer, lineterminator="\n")
    writer.writerow(columns)
    writer.writerows(["" if cell is None else cell for cell in row] for row in rows)
    return buffer.getvalue()


def _umask() -> int:
    mask = os.umask(0)
    os.umask(mask)
    return mask
