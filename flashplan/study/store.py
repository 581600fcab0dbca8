"""Finished chunks in one SQLite file, kept as they finish, so that a study killed at any moment goes on from there."""

import sqlite3
from collections.abc import Iterator, Mapping
from contextlib import contextmanager
from pathlib import Path
from types import TracebackType
from typing import Any, Self

from flashplan.errors import InputError
from flashplan.study.codec import decode_result, encode_result
from flashplan.study.fingerprint import DIGEST

# Marks the file as ours in its first page, where SQLite reserves room for such a mark; and the layout's version.
_APPLICATION = 0x666C7370
_LAYOUT = 1
_BUSY_SECONDS = 60.0


class Store:
    """The file of one study. A second process may use it at the same time.

    Each chunk is one transaction with SQLite's own journal: a reader, now or after a crash, meets it whole or not at
    all. A chunk that the other process has kept before stays as it is; both computed the same.
    Every method raises InputError that names the file when it cannot be read or written.
    """

    def __init__(self, path: str | Path, fingerprint: Mapping[str, str]) -> None:
        """Open the file, or make it. Raises InputError if it belongs to a study with another fingerprint."""
        self._path = Path(path)
        with self._clear_messages("cannot be used as a store of finished work"):
            self._database = sqlite3.connect(
                self._path, timeout=_BUSY_SECONDS, isolation_level=None
            )
            try:
                self._enter_study(dict(fingerprint))
            except BaseException:
                self._database.close()
                raise

    def finished(self) -> dict[int, Any]:
        """Return the results that are kept, by chunk index."""
        with self._clear_messages("finished work cannot be read"):
            rows = self._database.execute("SELECT number, result FROM chunk")
            return {number: decode_result(data) for number, data in rows}

    def keep(self, index: int, result: Any) -> None:
        """Keep one chunk's result; when this returns it outlives the process."""
        data = encode_result(result)
        with self._clear_messages(
            "finished work cannot be kept; all before it is safe, and the study goes on from there once there is room"
        ):
            self._database.execute(
                "INSERT OR IGNORE INTO chunk (number, result) VALUES (?, ?)",
                (index, data),
            )

    def close(self) -> None:
        """Close the file; what was kept stays."""
        self._database.close()

    def __enter__(self) -> Self:
        return self

    def __exit__(
        self,
        kind: type[BaseException] | None,
        error: BaseException | None,
        trace: TracebackType | None,
    ) -> None:
        self.close()

    def _enter_study(self, fingerprint: dict[str, str]) -> None:
        database = self._database
        # One writer at a time: of two processes that find no file, the second meets the header of the first.
        database.execute("BEGIN IMMEDIATE")
        (application,) = database.execute("PRAGMA application_id").fetchone()
        (layout,) = database.execute("PRAGMA user_version").fetchone()
        (tables,) = database.execute("SELECT count(*) FROM sqlite_master").fetchone()
        if tables == 0:
            database.execute(f"PRAGMA application_id = {_APPLICATION}")
            database.execute(f"PRAGMA user_version = {_LAYOUT}")
            database.execute("CREATE TABLE study (name TEXT PRIMARY KEY, value TEXT)")
            database.execute(
                "CREATE TABLE chunk (number INTEGER PRIMARY KEY, result BLOB NOT NULL)"
            )
            database.executemany("INSERT INTO study VALUES (?, ?)", fingerprint.items())
        elif (application, layout) != (_APPLICATION, _LAYOUT):
            raise InputError(
                "is a database, but not one that keeps the work of a study in this version's layout; "
                "give another file",
                str(self._path),
            )
        found = dict(database.execute("SELECT name, value FROM study"))
        if found != fingerprint:
            raise InputError(
                f"keeps the work of another study ({_differences(found, fingerprint)}); "
                "give another file, or delete this one to start anew",
                str(self._path),
            )
        database.execute("COMMIT")

    @contextmanager
    def _clear_messages(self, what: str) -> Iterator[None]:
        try:
            yield
        except sqlite3.Error as error:
            raise InputError(f"{what}: {error}", str(self._path)) from error


def _differences(found: dict[str, str], wanted: dict[str, str]) -> str:
    """Name what differs between two fingerprints, with the values where these are readable."""
    parts = []
    for name in sorted(found.keys() | wanted.keys()):
        there, here = found.get(name, "none"), wanted.get(name, "none")
        if there == here:
            continue
        if there.startswith(DIGEST) or here.startswith(DIGEST):
            parts.append(f"another {name}")
        else:
            parts.append(f"{name} {there} there, {here} here")
    return "; ".join(parts)
