"""What is wanted of the rows of an export, and what was read of them."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from typing import Final

import numpy as np
from numpy.typing import NDArray

from isotherm.text_layout import Block

__all__ = ["Numbers", "SkippedLine", "Unreadable", "Wanted"]

_MOST_TEXTS: Final = 50


@dataclass(frozen=True)
class Wanted:
    """Columns (0-based) to read of the rows of `block`: numbers, and clock times left as text.

    read : these, and the first column where it holds numbers: a line of text then does not pass for a row.
    """

    block: Block
    numeric: tuple[int, ...]
    clocks: tuple[int, ...]
    encoding: str
    read: tuple[int, ...]

    @classmethod
    def of(
        cls, block: Block, numeric: Sequence[int], clocks: Sequence[int], encoding: str
    ) -> Wanted:
        """Add the guarding first column to what is wanted."""
        guard = (0,) if block.kinds[0] == "N" else ()
        read = tuple(sorted({*numeric, *clocks, *guard}))
        return cls(block, tuple(numeric), tuple(clocks), encoding, read)


@dataclass(frozen=True)
class SkippedLine:
    """Lines of one text among the rows that are no rows: number of the first (from 1), how many."""

    line: int
    text: str
    count: int = 1


@dataclass(frozen=True)
class Unreadable:
    """Cells of one column that are text: how many, line (from 1) and text of the first."""

    count: int
    line: int
    text: str

    def and_more(self, other: Unreadable) -> Unreadable:
        """These and the `other`, which come later in the file."""
        return Unreadable(self.count + other.count, self.line, self.text)


@dataclass
class Numbers:
    """What was read.

    columns : column (0-based) -> (n,) array, NaN where a cell is missing.
    clocks : column -> n cells of text, "" where missing.
    lines : (n,) line number in the file, from 1.
    skipped : text -> lines that are no rows (the first texts met), `skipped_count` lines in all.
    unreadable : column -> its cells that are text.
    """

    columns: dict[int, NDArray[np.float64]]
    clocks: dict[int, list[str]]
    lines: NDArray[np.int64]
    skipped: dict[str, SkippedLine] = field(default_factory=dict)
    skipped_count: int = 0
    unreadable: dict[int, Unreadable] = field(default_factory=dict)

    def skip(self, lines: SkippedLine) -> None:
        """Note lines that are no rows."""
        self.skipped_count += lines.count
        have = self.skipped.get(lines.text)
        if have is not None:
            self.skipped[lines.text] = SkippedLine(have.line, have.text, have.count + lines.count)
        elif len(self.skipped) < _MOST_TEXTS:
            self.skipped[lines.text] = lines
