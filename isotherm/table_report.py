"""What a reader of the table has to know: lines skipped, cells missing."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Final

import numpy as np
from numpy.typing import NDArray

from isotherm.errors import UpstrokeError
from isotherm.table_cell import parse_cell
from isotherm.table_header import Header, split_header
from isotherm.table_roles import Assigned, describe
from isotherm.text_find import TextRows
from isotherm.text_rows import Numbers

__all__ = ["gaps_report", "lines_report", "within_reach"]

# No reading is larger in the fixed units (mm, cm^2, mN/m ...): it is what stands for "missing" somewhere, or
# an overflow, and its square could not be added up. A time may count nanoseconds since 1970 (2e18).
LARGEST: Final = 1e9
LARGEST_TIME: Final = 1e19


def lines_report(
    numbers: Numbers, header: Header, text: TextRows, where: str, warnings: list[str]
) -> None:
    """Lines of text among the rows: the header again is fine, another header is not."""
    if not numbers.skipped_count:
        return
    names = [cell.text for cell in header.cells]
    above = {line.strip() for line in text.lines[: text.block.first]}
    other = []
    repeats = 0
    for skipped in numbers.skipped.values():
        if skipped.text in above:
            repeats += skipped.count
            continue
        cells = split_header(skipped.text, text.block.layout, text.block.columns)
        if cells is not None and cells != names:
            parsed = [parse_cell(cell) for cell in cells]
            if sum(bool(cell.roles) for cell in parsed) >= 2:
                raise UpstrokeError(
                    f"the columns change to '{skipped.text[:60]}'",
                    where=f"{where}, line {skipped.line}",
                    remedy="give each part its own file",
                )
        other.append(skipped)
    if repeats:
        lines = "1 line" if repeats == 1 else f"{repeats} lines"
        warnings.append(f"the header is repeated among the rows ({lines} skipped)")
    count = numbers.skipped_count - repeats
    if count and other:
        first = other[0]
        lines = "1 line" if count == 1 else f"{count} lines"
        warnings.append(
            f"{lines} among or below the rows are no rows and were skipped; first, line "
            f"{first.line}: '{first.text[:60]}'"
        )


def gaps_report(
    numbers: Numbers,
    taken: Sequence[Assigned],
    values: dict[str, NDArray[np.float64]],
    warnings: list[str],
) -> None:
    """Count missing, infinite and unreadable cells of each column."""
    for one in taken:
        if one.role not in values:
            continue
        column = numbers.columns.get(one.column)
        if column is None:
            column = values[one.role]
        if np.isfinite(column).all():
            continue
        nan, infinite = np.isnan(column), np.isinf(column)
        texts = numbers.unreadable.get(one.column)
        named = describe(one.column, one.cell)
        if texts is not None:
            warnings.append(
                f"column {named}: {texts.count} cells are text (first, line {texts.line}: '{texts.text}')"
            )
        missing = int(nan.sum()) - (texts.count if texts is not None else 0)
        for count, mask, word in (
            (missing, nan, "missing"),
            (int(infinite.sum()), infinite, "infinite"),
        ):
            if count:
                line = int(numbers.lines[int(np.argmax(mask))])
                cells = "1 cell is" if count == 1 else f"{count} cells are"
                warnings.append(f"column {named}: {cells} {word} (first, line {line})")


def within_reach(
    values: NDArray[np.float64], one: Assigned, lines: NDArray[np.int64], warnings: list[str]
) -> NDArray[np.float64]:
    """Return the column, (n,) in its fixed unit, with what no instrument reads taken as missing."""
    largest = LARGEST_TIME if one.role == "time" else LARGEST
    # a column without gaps, as most are, needs no array of answers
    if len(values) and -largest <= values.min() and values.max() <= largest:
        return values
    beyond = np.abs(values) > largest  # missing cells compare false
    beyond &= np.isfinite(values)
    count = int(np.count_nonzero(beyond))
    if not count:
        return values
    cells = "1 cell is" if count == 1 else f"{count} cells are"
    warnings.append(
        f"column {describe(one.column, one.cell)}: {cells} beyond anything an instrument reads (first, "
        f"line {int(lines[int(np.argmax(beyond))])}: {float(values[beyond][0]):.3g}) and taken as missing"
    )
    return np.asarray(np.where(beyond, np.nan, values), dtype=np.float64)
