"""Which revisions a run's results call for. No database."""

from __future__ import annotations

import math
from typing import Any

from app.core.sky.times import parse_utc
from app.store.drafts import NO_LONGER, Draft, Head, drafts, withdrawals
from tests.samples import AS_OF_UNIX_S, body

END_S = parse_utc(body("a")["end"])
ONSET_S = parse_utc(body("a")["onset"])
ID = "PER-2026.a"


def head(number: int = 3, status: str = "current", **more: Any) -> dict[str, Head]:
    stored = {**body("a", **more), "revision": number, "changes": [{"what": "new", "text": "..."}]}
    return {ID: Head(number, status, stored)}


def one(found: list[Draft]) -> Draft:
    assert len(found) == 1
    return found[0]


def test_what_is_new_is_revision_one_and_says_so() -> None:
    draft = one(drafts({}, [body("a")], AS_OF_UNIX_S))
    assert (draft.advisory_id, draft.revision, draft.status) == (ID, 1, "current")
    assert draft.body["revision"] == 1
    assert draft.body["changes"][0]["what"] == "new"


def test_what_has_not_moved_gets_no_revision() -> None:
    assert drafts(head(), [body("a", issued_at="2026-08-10T06:00:00Z")], AS_OF_UNIX_S) == []


def test_what_has_moved_gets_the_next_revision_with_its_changes() -> None:
    draft = one(drafts(head(), [body("a", level="shelter")], AS_OF_UNIX_S))
    assert (draft.revision, draft.status) == (4, "current")
    assert [change["what"] for change in draft.body["changes"]] == ["level"]


def test_what_is_no_longer_found_is_withdrawn() -> None:
    draft = one(drafts(head(), [], AS_OF_UNIX_S))
    assert (draft.revision, draft.status) == (4, "withdrawn")
    assert draft.body["changes"] == [{"what": "withdrawn", "text": NO_LONGER}]
    assert draft.body["revision"] == 4


def test_what_has_ended_is_left_alone() -> None:
    assert drafts(head(), [], END_S) == []
    assert drafts(head(), [], END_S - 1.0) != []


def test_what_was_withdrawn_is_not_withdrawn_again() -> None:
    assert drafts(head(status="withdrawn"), [], AS_OF_UNIX_S) == []


def test_what_comes_back_gets_a_revision_even_if_nothing_moved() -> None:
    draft = one(drafts(head(status="withdrawn"), [body("a")], AS_OF_UNIX_S))
    assert (draft.revision, draft.status) == (4, "current")
    assert "finds it again" in draft.body["changes"][0]["text"]


def test_a_run_says_nothing_about_what_begins_after_it_stopped_looking() -> None:
    assert drafts(head(), [], AS_OF_UNIX_S, ONSET_S) == []
    assert one(drafts(head(), [], AS_OF_UNIX_S, ONSET_S + 1.0)).status == "withdrawn"
    assert one(drafts(head(), [], AS_OF_UNIX_S, math.inf)).status == "withdrawn"


def test_each_passage_is_judged_by_itself() -> None:
    gemini = {"GEM-2026.a": Head(1, "current", body("a", "GEM-2026"))}
    produced = [body("a", level="shelter"), body("a", "LEO-2026")]
    found = drafts(head() | gemini, produced, AS_OF_UNIX_S)
    assert [(draft.advisory_id, draft.revision, draft.status) for draft in found] == [
        (ID, 4, "current"),
        ("LEO-2026.a", 1, "current"),
        ("GEM-2026.a", 2, "withdrawn"),
    ]


def test_the_status_is_kept_beside_the_body_never_in_it() -> None:
    given = {**body("a", level="shelter"), "status": "current"}
    assert "status" not in one(drafts(head(status="current"), [given], AS_OF_UNIX_S)).body
    assert given["status"] == "current"


def test_withdrawing_gives_the_reason() -> None:
    draft = one(withdrawals(list(head().values()), AS_OF_UNIX_S, "The satellite was sold."))
    assert draft.body["changes"] == [{"what": "withdrawn", "text": "The satellite was sold."}]
