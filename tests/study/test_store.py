"""The file of finished chunks, and what may befall it."""

import sqlite3
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest

from flashplan.errors import InputError
from flashplan.study import store as store_module
from flashplan.study.run import run_study
from flashplan.study.store import Store
from tests.study.tasks import Scaled, draw

ME = {"task": "a", "seed": "1"}


def test_what_is_kept_is_found_again(tmp_path: Path) -> None:
    path = tmp_path / "store"
    with Store(path, ME) as store:
        store.keep(4, {"x": 0.1})
        store.keep(2, (np.arange(3), None))
        store.keep(4, {"x": 9.9})  # another run was first; both computed the same
    with Store(path, ME) as store:
        found = store.finished()
    assert found[4] == {"x": 0.1}
    assert set(found) == {2, 4}
    np.testing.assert_array_equal(found[2][0], np.arange(3))


def test_a_store_of_another_study_is_refused(tmp_path: Path) -> None:
    path = tmp_path / "store"
    run_study(Scaled(1.0), 3, seed=1, store=path)
    before = path.read_bytes()
    with pytest.raises(
        InputError, match=r"\(another scale\); give another file"
    ) as caught:
        run_study(Scaled(2.0), 3, seed=1, store=path)
    assert caught.value.where == str(path)
    with pytest.raises(InputError, match=r"\(seed 1 there, 2 here\)"):
        run_study(Scaled(1.0), 3, seed=2, store=path)
    with pytest.raises(InputError, match=r"\(chunks 3 there, 4 here\)"):
        run_study(Scaled(1.0), 4, seed=1, store=path)
    with pytest.raises(InputError, match="another scale; task .*Scaled there, .*draw"):
        run_study(draw, 3, seed=1, store=path)
    assert path.read_bytes() == before


def test_a_store_of_another_version_is_refused(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    path = tmp_path / "store"
    run_study(draw, 3, seed=1, store=path)
    monkeypatch.setattr(
        "flashplan.study.fingerprint.metadata.version", lambda name: "99.0"
    )
    with pytest.raises(InputError, match="flashplan version .* there, 99.0 here"):
        run_study(draw, 3, seed=1, store=path)


def test_a_file_that_is_no_store_is_left_alone(tmp_path: Path) -> None:
    text = tmp_path / "notes.txt"
    text.write_text("not a database, and long enough to be looked at " * 50)
    before = text.read_bytes()
    with pytest.raises(InputError, match="file is not a database") as caught:
        run_study(draw, 3, seed=1, store=text)
    assert caught.value.where == str(text)
    assert text.read_bytes() == before

    foreign = tmp_path / "foreign.sqlite"
    with sqlite3.connect(foreign) as database:
        database.execute("CREATE TABLE mine (x)")
    database.close()
    before = foreign.read_bytes()
    with pytest.raises(InputError, match="not one that keeps the work of a study"):
        run_study(draw, 3, seed=1, store=foreign)
    assert foreign.read_bytes() == before


def test_an_empty_file_becomes_a_store(tmp_path: Path) -> None:
    path = tmp_path / "store"
    path.touch()
    assert len(run_study(draw, 3, seed=1, store=path)) == 3


@pytest.mark.parametrize("place", ["missing folder", "under a file", "a folder"])
def test_a_place_where_no_file_can_be_is_named(tmp_path: Path, place: str) -> None:
    (tmp_path / "file").touch()
    path = {
        "missing folder": tmp_path / "none" / "store",
        "under a file": tmp_path / "file" / "store",
        "a folder": tmp_path,
    }[place]
    with pytest.raises(InputError, match="cannot be used as a store") as caught:
        run_study(draw, 3, seed=1, store=path)
    assert caught.value.where == str(path)


def _every_connection(
    monkeypatch: pytest.MonkeyPatch, after: Callable[[sqlite3.Connection], None]
) -> None:
    def connect(*arguments: object, **options: object) -> sqlite3.Connection:
        database = sqlite3.Connection(*arguments, **options)  # type: ignore[arg-type]
        after(database)
        return database

    monkeypatch.setattr(store_module.sqlite3, "connect", connect)


def test_a_full_disk_is_told_and_finished_work_stays(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    # SQLite itself refuses to grow the file past a number of pages, with the words that it has for a full disk.
    path = tmp_path / "store"
    with monkeypatch.context() as limited:
        _every_connection(
            limited, lambda database: database.execute("PRAGMA max_page_count = 12")
        )
        with pytest.raises(InputError, match="all before it is safe.*disk is full"):
            run_study(draw, 40, seed=1, store=path)
    with sqlite3.connect(path) as database:
        (kept,) = database.execute("SELECT count(*) FROM chunk").fetchone()
        assert database.execute("PRAGMA integrity_check").fetchone() == ("ok",)
    database.close()
    assert 0 < kept < 40
    resumed = run_study(draw, 40, seed=1, store=path)
    assert [found["mean"] for found in resumed] == [
        found["mean"] for found in run_study(draw, 40, seed=1)
    ]


def test_a_store_that_may_only_be_read_is_told(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    # Told by SQLite itself; taking the permission from the folder would not bind a test that runs as root.
    path = tmp_path / "store"
    read_only = "PRAGMA query_only = ON"
    with Store(path, ME) as store:
        store.keep(0, 1.5)
        store._database.execute(read_only)
        with pytest.raises(InputError, match="cannot be kept.*readonly"):
            store.keep(1, 2.5)
        assert store.finished() == {0: 1.5}
    _every_connection(monkeypatch, lambda database: database.execute(read_only))
    with pytest.raises(InputError, match="cannot be used as a store.*readonly"):
        Store(path, ME)


def test_a_store_that_stays_locked_is_told(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    path = tmp_path / "store"
    Store(path, ME).close()
    monkeypatch.setattr(store_module, "_BUSY_SECONDS", 0.05)
    other = sqlite3.connect(path, isolation_level=None)
    other.execute("BEGIN EXCLUSIVE")
    with pytest.raises(InputError, match="database is locked"):
        Store(path, ME)
    other.close()
