"""Where the numbers came from, as every result reports it."""

from __future__ import annotations

from dataclasses import dataclass, field
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
    """An input file: path as given, SHA-256 of its bytes, rows of numbers read, role -> column."""

    path: str
    sha256: str
    rows: int
    columns: dict[str, ColumnSource] = field(default_factory=dict)

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form."""
        return {
            "path": self.path,
            "sha256": self.sha256,
            "rows": self.rows,
            "columns": {role: column.to_json() for role, column in self.columns.items()},
        }
