"""Which of the 52 numbered check cases are covered, and why one is not."""

from __future__ import annotations

import ast
from collections import defaultdict
from pathlib import Path

CASES = range(1, 53)
NOT_COVERED = {
    35: "near the axis, beyond the start of the focus, the density has to be averaged over the radiant's spread; "
    "the program caps that zone and flags it instead",
}


def covered() -> dict[int, list[str]]:
    """Case number -> tests that carry it, read from the marks in this folder's files."""
    found = defaultdict(list)
    for path in sorted(Path(__file__).parent.glob("test_*.py")):
        for node in ast.walk(ast.parse(path.read_text("utf-8"))):
            if isinstance(node, ast.FunctionDef):
                for number in numbers(node):
                    found[number].append(f"{path.name}::{node.name}")
    return dict(found)


def numbers(function: ast.FunctionDef) -> list[int]:
    calls = [d for d in function.decorator_list if isinstance(d, ast.Call)]
    marks = [c for c in calls if ast.unparse(c.func) == "pytest.mark.case"]
    return [ast.literal_eval(argument) for mark in marks for argument in mark.args]


def test_every_case_is_covered_or_says_why_not():
    assert set(covered()) | set(NOT_COVERED) == set(CASES)
    assert not set(covered()) & set(NOT_COVERED)


def test_most_cases_are_covered():
    assert len(covered()) >= 35
    assert all(len(reason) > 20 for reason in NOT_COVERED.values())
