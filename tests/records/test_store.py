"""What is no store, or not one that this Sameline can use, is refused in words, and left as it was."""

from __future__ import annotations

import os
import sqlite3
import sys
import tempfile
from collections.abc import Callable, Iterator
from contextlib import closing, contextmanager
from pathlib import Path

import pytest
from sqlalchemy import make_url

import laboratory
from sameline.errors import CallError, SamelineError, StoreError
from sameline.lab import make_lab, open_lab
from sameline.records import engine as engines
from sameline.records import schema
from sameline.records.store import Store
from servers import PostgreSQL


def refusal(action: Callable[[], object]) -> StoreError:
    with pytest.raises(StoreError) as caught:
        action()
    assert caught.value.exit_code == 3
    return caught.value


def test_a_store_that_is_not_there(tmp_path: Path):
    found = refusal(lambda: open_lab(tmp_path / "lab.db"))
    assert "no store here" in found.message
    assert "sameline init" in found.advice
    assert not (tmp_path / "lab.db").exists()


def test_a_folder(tmp_path: Path):
    assert "folder" in refusal(lambda: open_lab(tmp_path)).message
    assert "folder" in refusal(lambda: make_lab(tmp_path, by="ana", name="x")).message


def test_a_place_in_no_folder(tmp_path: Path):
    found = refusal(lambda: make_lab(tmp_path / "none" / "lab.db", by="ana", name="x"))
    assert "folder does not exist" in found.message


def test_an_empty_file(tmp_path: Path):
    path = tmp_path / "lab.db"
    path.touch()
    assert "empty" in refusal(lambda: open_lab(path)).message
    assert path.read_bytes() == b""


@pytest.mark.parametrize("content", [b"batch,value\nB1,70.1\n" * 100, b"SQLite format 3\0" + b"\xff" * 4000])
def test_a_file_of_another_kind(tmp_path: Path, content: bytes):
    path = tmp_path / "lab.db"
    path.write_bytes(content)
    for action in (lambda: open_lab(path), lambda: make_lab(path, by="ana", name="x")):
        found = refusal(action)
        assert "not a store" in found.message or "damaged" in found.message
        assert found.advice
    assert path.read_bytes() == content


def test_somebody_elses_database_is_left_as_it_was(tmp_path: Path):
    path = tmp_path / "other.db"
    with closing(sqlite3.connect(path)) as other:
        other.execute("CREATE TABLE entry (x)")
    content = path.read_bytes()
    for action in (
        lambda: open_lab(path),
        lambda: make_lab(path, by="ana", name="x"),
        lambda: make_lab(path, by="ana", name="x", upgrade=True),
    ):
        assert "not a Sameline store" in refusal(action).message
    assert path.read_bytes() == content


def test_somebody_elses_postgresql_database(postgresql: PostgreSQL):
    url = postgresql.new()
    postgresql.execute("CREATE TABLE samples (x int)", make_url(url).database)
    assert "not a Sameline store" in refusal(lambda: open_lab(url)).message
    assert "not a Sameline store" in refusal(lambda: make_lab(url, by="ana", name="x")).message


def test_an_empty_postgresql_database(postgresql: PostgreSQL):
    found = refusal(lambda: open_lab(postgresql.new()))
    assert "empty" in found.message
    assert "sameline init" in found.advice


def _claim_revision(store: str, revision: str | None) -> None:
    opened = Store.open(store)
    with opened.engine.begin() as connection:
        connection.exec_driver_sql("DELETE FROM alembic_version")
        if revision is not None:
            connection.exec_driver_sql(f"INSERT INTO alembic_version VALUES ('{revision}')")
    opened.close()


def test_a_store_of_a_newer_sameline(store: str):
    _claim_revision(store, "9999")
    for action in (
        lambda: open_lab(store),
        lambda: make_lab(store, by="ana", name="x"),
        lambda: make_lab(store, by="ana", name="x", upgrade=True),
    ):
        found = refusal(action)
        assert "newer Sameline" in found.message
        assert "9999" in found.message
        assert "nothing was changed" in found.advice


def test_a_store_of_an_older_sameline(store: str, monkeypatch: pytest.MonkeyPatch):
    monkeypatch.setattr(schema, "REVISIONS", (*schema.REVISIONS, "9999"))
    for action in (lambda: open_lab(store), lambda: make_lab(store, by="ana", name="x")):
        found = refusal(action)
        assert "older Sameline" in found.message
        assert "init --upgrade" in found.advice


def test_a_store_that_does_not_say_its_revision(store: str):
    _claim_revision(store, None)
    assert "does not say" in refusal(lambda: open_lab(store)).message


def test_a_store_that_is_there_already(store: str):
    found = refusal(lambda: make_lab(store, by="eve", name="another"))
    assert "already" in found.message
    with open_lab(store) as lab:
        assert lab.verify().findings == ()


def test_upgrading_a_store_that_needs_none_changes_nothing(store: str):
    with open_lab(store) as lab:
        before = lab.verify().ledger
    with make_lab(store, by="eve", name="another", upgrade=True) as lab:
        assert lab.verify().ledger == before


def test_making_that_was_cut_short_goes_on(new_place: Callable[[], str]):
    place = new_place()
    opened, new = Store.create(place)
    opened.close()
    assert new
    found = refusal(lambda: open_lab(place))
    assert "cut short" in found.message
    assert "init" in found.advice
    with laboratory.bare(place) as lab:
        assert lab.verify().findings == ()


def test_of_two_who_make_one_store_the_second_is_refused(new_place: Callable[[], str]):
    place = new_place()
    slow, new = Store.create(place)
    assert new
    with make_lab(place, by="ana", name="first") as lab:
        found = refusal(lambda: slow.act("init", by="eve", at=laboratory.moment(1), first=True).__enter__())
        assert "somebody else" in found.message
        assert [entry.person for entry in lab.trail()] == ["ana"]
    slow.close()


def test_a_damaged_store_is_refused_or_its_damage_found(sqlite_store: str):
    """Every page is overwritten in turn; what cannot be read is a finding or a refusal, never anything else."""
    good = Path(sqlite_store).read_bytes()
    page = int.from_bytes(good[16:18], "big")
    for number in range(len(good) // page):
        waste = (b"\0", b"\xff")[number % 2] * page
        Path(sqlite_store).write_bytes(good[: number * page] + waste + good[(number + 1) * page :])
        assert _problems(sqlite_store), number


def _problems(store: str) -> list[str]:
    from sameline.records.checks import check_ledger

    try:
        with Store.open(store) as opened, opened.reading() as reading:
            return [str(f) for f in check_ledger(reading.connection).findings]
    except StoreError as error:
        return [str(error)]


def test_a_store_that_was_cut_off(sqlite_store: str):
    good = Path(sqlite_store).read_bytes()
    for share in range(1, 20, 3):
        Path(sqlite_store).write_bytes(good[: len(good) * share // 20])
        assert _problems(sqlite_store), share


@pytest.mark.parametrize("url", ["mysql://host/lab", "postgresql+psycopg://[", "oracle://x", "://"])
def test_a_url_of_another_kind(url: str):
    assert refusal(lambda: open_lab(url)).advice


def test_a_postgresql_url_may_leave_out_its_driver():
    assert engines.store_url("postgresql://host/lab").drivername == "postgresql+psycopg"
    assert engines.store_url("postgres://host/lab").drivername == "postgresql+psycopg"


def test_no_message_shows_a_password(postgresql: PostgreSQL):
    secret = {"password": "open sesame"}
    there = make_url(postgresql.new()).set(username="nobody", **secret)
    nowhere = make_url("postgresql+psycopg://ana@127.0.0.1:1/lab?connect_timeout=2").set(**secret)
    for url in (there, nowhere):
        found = refusal(lambda url=url: open_lab(url.render_as_string(hide_password=False)))
        assert "sesame" not in str(found)
        assert "sesame" not in repr(found.__cause__)
        assert found.where


def test_tls_parameters_pass_through(postgresql: PostgreSQL):
    url = make_url(postgresql.new()).update_query_dict({"sslmode": "verify-full", "sslrootcert": "/none.pem"})
    opened = Store(engines.make_engine(engines.store_url(url.render_as_string()), must_exist=True))
    assert opened.engine.dialect.create_connect_args(opened.engine.url)[1]["sslmode"] == "verify-full"


def test_a_missing_driver_says_what_to_install(monkeypatch: pytest.MonkeyPatch):
    monkeypatch.setitem(sys.modules, "psycopg", None)
    found = refusal(lambda: open_lab("postgresql+psycopg://host/lab"))
    assert "sameline[postgresql]" in found.advice


def test_who_is_not_registered_cannot_act(store: str):
    with open_lab(store, by="eve") as lab, pytest.raises(CallError, match="no person is registered as 'eve'") as caught:
        lab.add("supplier", "X", name="x")
    assert "ana" in caught.value.advice


def test_nobody_cannot_act(store: str):
    with open_lab(store) as lab, pytest.raises(CallError, match="who is acting"):
        lab.add("supplier", "X", name="x")


# -- permissions: as somebody who has none ---------------------------------------------------------------------------


@contextmanager
def somebody_else() -> Iterator[None]:
    """As a user who is not root, where the tests are run by root: root may write anywhere."""
    if os.geteuid() != 0:
        yield
        return
    os.seteuid(65534)
    try:
        yield
    finally:
        os.seteuid(0)


@pytest.fixture
def locked(sqlite_template: Path):
    """A folder that others may enter but not write in, with a store in it that they may only read."""
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        (folder / "lab.db").write_bytes(sqlite_template.read_bytes())
        (folder / "lab.db").chmod(0o444)
        folder.chmod(0o555)
        yield folder
        folder.chmod(0o755)


def test_a_read_only_folder(locked: Path):
    with somebody_else():
        for action in (lambda: open_lab(locked / "lab.db"), lambda: make_lab(locked / "new.db", by="ana", name="x")):
            found = refusal(action)
            assert "cannot be" in found.message
            assert "permissions" in found.advice
            assert found.where


def test_a_read_only_file(locked: Path):
    locked.chmod(0o777)
    with somebody_else(), open_lab(locked / "lab.db", by="ana") as lab:
        assert lab.listing("supplier")
        found = refusal(lambda: lab.add("supplier", "X", name="x"))
    assert "cannot be written" in found.message
    assert "permissions" in found.advice


def test_a_store_that_nobody_may_read(locked: Path):
    (locked / "lab.db").chmod(0)
    with somebody_else():
        assert "permissions" in refusal(lambda: open_lab(locked / "lab.db")).advice


def test_a_full_disk_is_said_and_nothing_recorded(sqlite_store: str):
    """SQLite's own limit on a file's pages stands for a disk without room: it fails in the same way."""
    with open_lab(sqlite_store, by="ana") as lab:
        before = lab.verify().ledger
        with lab._store.engine.connect() as connection:
            raw = connection.connection.dbapi_connection
            raw.execute(f"PRAGMA max_page_count = {raw.execute('PRAGMA page_count').fetchone()[0]}")
        runs = [laboratory.run("B1", 40 + day, *["70.1"] * 20) for day in range(200)]
        found = refusal(lambda: lab.record(runs))
        assert "full" in found.message
        assert "nothing was recorded" in found.message
    with open_lab(sqlite_store) as lab:
        assert lab.verify().ledger == before


def test_a_writer_waits_and_then_says_so(store: str, monkeypatch: pytest.MonkeyPatch):
    monkeypatch.setattr(engines, "BUSY_SECONDS", 1)
    with open_lab(store, by="ana") as holder, open_lab(store, by="ben") as waiter:
        with holder._store.act("add supplier", by="ana", at=laboratory.moment(30)) as act:
            found = refusal(lambda: waiter.add("supplier", "X", name="x"))
            assert "another writer" in found.message
            assert "try again" in found.advice
            act.abandon()
        assert waiter.add("supplier", "X", name="x").entry


def test_a_text_with_a_nul_is_refused(store: str):
    with open_lab(store, by="ana") as lab:
        with pytest.raises(CallError, match="NUL"):
            lab.add("supplier", "X", name="x\0y")
        with pytest.raises(CallError, match="NUL"):
            lab.record([laboratory.run("B1", 9, "70.1", note="a\0b")])
        with pytest.raises(SamelineError, match="surrogate"):
            lab.add("supplier", "X", name="x\ud800y")
        assert lab.verify().findings == ()
