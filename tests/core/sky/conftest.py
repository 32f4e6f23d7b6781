"""The astronomy libraries, told to download nothing."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import ExitStack

import pytest


@pytest.fixture(scope="session", autouse=True)
def offline_astropy() -> Iterator[None]:
    """Bundled Earth orientation only; dates beyond it lose accuracy that cancels in these checks."""
    from astropy.utils import iers
    from astropy.utils.data import conf

    with ExitStack() as stack:
        stack.enter_context(iers.conf.set_temp("auto_download", False))
        stack.enter_context(iers.conf.set_temp("auto_max_age", None))
        stack.enter_context(iers.conf.set_temp("iers_degraded_accuracy", "ignore"))
        stack.enter_context(conf.set_temp("allow_internet", False))
        yield
