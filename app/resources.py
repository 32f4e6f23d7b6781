"""Find the folders that are shipped beside the code: migrations and demo data."""

from __future__ import annotations

from pathlib import Path
from typing import Literal

PACKAGE = Path(__file__).resolve().parent


def resource_dir(name: Literal["migrations", "data_demo"]) -> Path:
    """Return ``app/_NAME`` of an installed wheel, else the checkout's top-level folder ``NAME``.

    Raises ``FileNotFoundError`` when neither is there: the installation is incomplete.
    """
    for folder in (PACKAGE / f"_{name}", PACKAGE.parent / name):
        if folder.is_dir():
            return folder
    raise FileNotFoundError(f"the folder '{name}' is missing from this installation; install stonechat again")
