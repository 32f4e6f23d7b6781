"""``stonechat compute``."""

from __future__ import annotations

import argparse
import sys
import time
from typing import Any

from tqdm import tqdm

from app.errors import StonechatError
from app.jobs.run import Progress, run_once
from app.settings import load_settings
from app.store.runs import RunRecord, run_satellites
from app.store.session import Store, open_store


def run(options: argparse.Namespace) -> int:
    """Compute and publish; say what became of it."""
    settings = load_settings(dir=options.dir)
    as_of_unix_s = time.time() if options.as_of is None else options.as_of
    with open_store(settings, create=False) as store:
        store.require_head()
        with progress_bar() as bar:
            record = run_once(store, settings, as_of_unix_s, options.satellite, shown_on(bar))
        report(store, record)
    if record.failed and not record.computed:
        raise StonechatError(
            "no satellite could be computed (listed above); what was published before still stands"
        )
    return 0


def progress_bar() -> tqdm[Any]:
    """A bar on a terminal, nothing elsewhere."""
    return tqdm(unit="satellite", leave=False, disable=not sys.stderr.isatty(), dynamic_ncols=True)


def shown_on(bar: tqdm[Any]) -> Progress:
    """Show a run's progress on a bar."""

    def show(done: int, total: int) -> None:
        bar.total = total
        bar.update(done - bar.n)

    return show


def report(store: Store, record: RunRecord) -> None:
    """Print the outcome of a run, and why any satellite could not be computed."""
    print(
        f"run {record.id} published: {counted(record.computed, 'satellite')} computed, {record.failed} failed, "
        f"{counted(record.revisions_new, 'new advisory revision')}"
    )
    if record.satellites_total == 0:
        print("no satellite is registered; give some with `stonechat load`")
    with store.read() as session:
        for each in run_satellites(session, record.id, limit=max(record.failed, 1), state="failed"):
            print(f"  {each.satellite_id}: {each.reason}")
        computed = run_satellites(session, record.id, limit=max(record.computed, 1), state="computed")
    lacking = [each for each in computed if each.reason]
    if lacking:
        print(f"{counted(len(lacking), 'satellite')} without a plan:")
    for each in lacking:
        print(f"  {each.satellite_id}: {each.reason}")


def counted(count: int, noun: str) -> str:
    """``1 satellite``, ``2 satellites``."""
    return f"{count} {noun}" if count == 1 else f"{count} {noun}s"
