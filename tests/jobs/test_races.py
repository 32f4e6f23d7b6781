"""Several processes on one database at the same time."""

from __future__ import annotations

import json
from itertools import pairwise
from pathlib import Path

from sqlalchemy.engine import URL

from app.settings import load_settings
from app.store.changes import current_change
from app.store.fleet import get_satellite, list_satellites, put_satellite
from app.store.runs import list_runs, start_run
from app.store.session import Store, open_store
from tests.databases import PostgresqlTemplate
from tests.nursery import Nursery
from tests.samples import AS_OF_UNIX_S, spacecraft
from tests.store.steps import register

PROCESSES, TRIES = 3, 8
WRITERS, THREADS, TIMES = 4, 2, 10


def text_of(url: URL) -> str:
    return url.render_as_string(hide_password=False)


def test_processes_that_compute_at_once_take_turns_or_are_refused(
    store: Store, database_url: URL, nursery: Nursery, tmp_path: Path
) -> None:
    register(store, "a", "b")
    told = [tmp_path / str(number) for number in range(PROCESSES)]
    each = [(text_of(database_url), TRIES, str(file)) for file in told]
    assert nursery.run_all("tests.jobs.victims:compete", each) == [0] * PROCESSES
    outcomes = [outcome for file in told for outcome in json.loads(file.read_text())]
    with store.read() as session:
        runs = list_runs(session)[::-1]
    assert len(outcomes) == PROCESSES * TRIES
    assert sorted(run.id for run in runs) == sorted(each for each in outcomes if each != "refused")
    assert {run.state.value for run in runs} == {"published"}
    for before, after in pairwise(runs):
        assert before.finished_at is not None
        assert after.started_at is not None
        assert before.finished_at <= after.started_at


def test_a_run_in_another_process_is_refused_while_one_is_under_way(
    store: Store, database_url: URL, nursery: Nursery, tmp_path: Path
) -> None:
    start_run(store, AS_OF_UNIX_S)
    assert nursery.run_all(
        "tests.jobs.victims:compete", [(text_of(database_url), 2, str(tmp_path / "told"))]
    ) == [0]
    assert json.loads((tmp_path / "told").read_text()) == ["refused", "refused"]


def test_eight_writers_in_four_processes_lose_no_update(
    store: Store, database_url: URL, nursery: Nursery
) -> None:
    with store.write() as session:
        put_satellite(session, spacecraft(name="0"))
    each = [(text_of(database_url), THREADS, TIMES)] * WRITERS
    assert nursery.run_all("tests.jobs.victims:add_ones", each) == [0] * WRITERS
    with store.read() as session:
        assert get_satellite(session, "kestrel-1").spacecraft.name == str(WRITERS * THREADS * TIMES)
        assert current_change(session) == 1 + WRITERS * THREADS * TIMES


def test_processes_that_open_a_new_sqlite_file_at_once_all_get_through(
    nursery: Nursery, tmp_path: Path
) -> None:
    url = URL.create("sqlite", database=str(tmp_path / "new.sqlite"))
    check_start_together(url, nursery)


def test_processes_that_open_a_new_postgresql_database_at_once_all_get_through(
    nursery: Nursery, postgresql_template: PostgresqlTemplate
) -> None:
    with postgresql_template.copy(template=False) as url:
        check_start_together(url, nursery)


def check_start_together(url: URL, nursery: Nursery) -> None:
    assert (
        nursery.run_all("tests.jobs.victims:migrate_and_write", [(text_of(url),)] * WRITERS) == [0] * WRITERS
    )
    with open_store(load_settings(database_url=text_of(url))) as store, store.read() as session:
        assert len(list_satellites(session)) == WRITERS
