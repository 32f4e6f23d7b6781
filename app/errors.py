"""Everything Stonechat refuses, as one tree. Each error carries the data needed to mend the input.

StonechatError
├── InputError            what was given cannot be used        -> 400 / exit 1
│   ├── FieldError        one field of a structured document   -> 422 / exit 1
│   ├── FileError         a line or keyword of a file          -> 422 / exit 1
│   └── CatalogueError    a row and column of the catalogue
├── OrbitError            an orbit that cannot be propagated or averaged
├── NotFoundError         no such object                       -> 404
├── ConflictError         the object changed, or is busy       -> 409
└── SettingsError         a STONECHAT_* variable is wrong      -> exit 1
"""

from __future__ import annotations


class StonechatError(Exception):
    """Stonechat refused this."""

    def __init__(self, detail: str | None = None) -> None:
        self.detail = detail or (type(self).__doc__ or "").strip()
        super().__init__(self.detail)


class InputError(StonechatError):
    """The input cannot be used as it is."""


class FieldError(InputError):
    """One field of a structured document is wrong; ``field`` is its dotted path."""

    def __init__(self, field: str, problem: str) -> None:
        self.field = field
        self.problem = problem
        super().__init__(f"{field}: {problem}")

    def __reduce__(self) -> tuple[type, tuple[str, str]]:
        return type(self), (self.field, self.problem)


class FileError(InputError):
    """A line or keyword of a file is wrong.

    ``source`` names the file, ``where`` the line ("line 3") or keyword ("ECCENTRICITY").
    """

    def __init__(self, source: str, where: str, problem: str) -> None:
        self.source = source
        self.where = where
        self.problem = problem
        super().__init__(f"{source}, {where}: {problem}")

    def __reduce__(self) -> tuple[type, tuple[str, str, str]]:
        return type(self), (self.source, self.where, self.problem)


class CatalogueError(InputError):
    """A value of the stream catalogue is wrong; names row and column."""

    def __init__(self, row: int, code: str, column: str, problem: str) -> None:
        self.row, self.code, self.column, self.problem = row, code, column, problem
        super().__init__(f"stream catalogue, row {row} ({code}), column {column}: {problem}")

    def __reduce__(self) -> tuple[type, tuple[int, str, str, str]]:
        return type(self), (self.row, self.code, self.column, self.problem)


class OrbitError(StonechatError):
    """The orbit cannot be propagated or averaged."""


class NotFoundError(StonechatError):
    """There is no such object."""


class ConflictError(StonechatError):
    """The object changed meanwhile, or is busy."""


class SettingsError(StonechatError):
    """A STONECHAT_* variable is wrong."""
