"""The starter plan that `flashplan new` writes: every key with its default or a plain example, and what it means."""

from importlib.resources import files
from pathlib import Path

from flashplan.errors import InputError
from flashplan.files import write_whole


def starter_text() -> str:
    """Text of the commented starter plan, itself a valid plan."""
    return files("flashplan.plan").joinpath("starter.toml").read_text(encoding="utf-8")


def write_starter(path: str | Path) -> None:
    """Write the starter plan. Raises InputError rather than write over a file."""
    if Path(path).exists():
        raise InputError("the file is there already and is left as it is", str(path))
    write_whole(path, starter_text())
