"""Where the numbers came from, as every result reports it."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field
from functools import cached_property
from typing import Any

__all__ = ["ColumnSource", "Source"]


@dataclass(frozen=True)
class ColumnSource:
    """What one column was taken for: its header text, its unit as written, its position (from 1)."""

    header: str
    unit: str
    index: int

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form."""
        return {"header": self.header, "unit": self.unit, "index": self.index}


@dataclass(frozen=True)
class Source:
    """An input file: path as given, SHA-256 of its bytes, rows of numbers read, role -> column.

    digest : the SHA-256 in hexadecimal, or how to ask for it: a large file is hashed beside the analysis.
    """

    path: str
    digest: str | Callable[[], str] = field(compare=False, repr=False)
    rows: int
    columns: dict[str, ColumnSource] = field(default_factory=dict)

    @cached_property
    def sha256(self) -> str:
        """SHA-256 of the file's bytes, in hexadecimal; waits for it where it is not done yet."""
        return self.digest if isinstance(self.digest, str) else self.digest()

    def __getstate__(self) -> dict[str, Any]:
        # another process can be told the digest, not how to wait for it
        return {**self.__dict__, "digest": self.sha256, "sha256": self.sha256}

    def __setstate__(self, state: dict[str, Any]) -> None:
        self.__dict__.update(state)

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form."""
        return {
            "path": self.path,
            "sha256": self.sha256,
            "rows": self.rows,
            "columns": {role: column.to_json() for role, column in self.columns.items()},
        }
