"""``case(n, ...)`` says which numbered check cases a test covers; ``test_cases.py`` counts them."""

from __future__ import annotations

import pytest


def pytest_configure(config: pytest.Config) -> None:
    config.addinivalue_line("markers", "case(*numbers): numbered check cases this test covers")
