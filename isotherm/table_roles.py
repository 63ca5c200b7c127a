"""Which column plays which role: by the sheet's word, by header and unit, else it asks."""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final

from isotherm.errors import UpstrokeError
from isotherm.sheet import ColumnHint
from isotherm.sheet_schema import ROLES
from isotherm.table_cell import HeaderCell
from isotherm.table_words import ROLE_DIMENSION, is_derived, roles_of
from isotherm.units import dimension_fits, is_unit

__all__ = ["Assigned", "assign_roles", "columns_from_text", "describe", "wanted_roles"]

_MOST_SHOWN: Final = 12


@dataclass(frozen=True)
class Assigned:
    """One column (0-based) taken for one role. `unit` as typed, None where nothing tells it.

    hinted : the run sheet says so.
    """

    role: str
    column: int
    cell: HeaderCell
    unit: str | None
    hinted: bool = False


def describe(column: int, cell: HeaderCell) -> str:
    """Name a column for an error: its place from 1 and its header."""
    return f"{column + 1} '{cell.text[:60]}'" if cell.text else f"{column + 1} (no header)"


def _listing(cells: Sequence[HeaderCell], columns: Sequence[int]) -> str:
    shown = ", ".join(describe(c, cells[c]) for c in columns[:_MOST_SHOWN])
    return f"{shown} and {len(columns) - _MOST_SHOWN} more" if len(columns) > _MOST_SHOWN else shown


def _which(column: int, cells: Sequence[HeaderCell]) -> str:
    """How the run sheet names a column: by its header where no other has the same."""
    text = cells[column].text.replace("\\", "\\\\").replace('"', '\\"')
    alone = sum(other.text == cells[column].text for other in cells) == 1
    return f'header = "{text}"' if text and alone and len(text) <= 80 else f"index = {column + 1}"


def _line(role: str, column: int, cells: Sequence[HeaderCell]) -> str:
    """The lines to add to the run sheet."""
    return f'[[columns]] with role = "{role}", {_which(column, cells)}'


def _others(columns: Sequence[int], cells: Sequence[HeaderCell]) -> str:
    """The other columns that could have been meant."""
    return "".join(f" (or {_which(column, cells)})" for column in columns[:2])


def wanted_roles(needs: Sequence[str]) -> set[str]:
    """All roles named in `needs`, whose entries may be alternatives (`"pressure|tension"`)."""
    return {role for need in needs for role in need.split("|")}


def assign_roles(
    cells: Sequence[HeaderCell],
    kinds: Sequence[str],
    hints: Sequence[ColumnHint],
    needs: Sequence[str],
    where: str,
) -> tuple[list[Assigned], list[str]]:
    """Give every role at most one column (barrier positions: two), and say what had to be assumed.

    Raises
    ------
    UpstrokeError
        When two columns could play one role, or the sheet names a column that is not there.
    """
    taken = _hinted(cells, kinds, hints, where)
    warnings: list[str] = []
    wanted = wanted_roles(needs)
    used = {one.column for one in taken}
    fixed = {one.role for one in taken}
    candidates: dict[str, list[int]] = {role: [] for role in ROLES}
    unsure: dict[str, list[int]] = {}
    for column, cell in enumerate(cells):
        if column in used or kinds[column] == "T":
            continue
        roles = [r for r in cell.roles if kinds[column] != "C" or r == "time"]
        if len(roles) == 1:
            candidates[roles[0]].append(column)
        elif len(roles) > 1:
            for role in roles:
                unsure.setdefault(role, []).append(column)
    for columns in candidates.values():
        # a column without readings stands back behind one that has some
        filled = [c for c in columns if kinds[c] != "E"]
        columns[:] = filled or columns
    _prefer_numbers(candidates["time"], kinds, cells, warnings)
    for role, columns in candidates.items():
        if role in fixed or not columns:
            continue
        if len(columns) > (2 if role == "barrier_position" else 1):
            raise UpstrokeError(
                f"{len(columns)} columns could be the {role.replace('_', ' ')}: "
                f"{_listing(cells, columns)}",
                where=where,
                remedy=f"say which in the run sheet: {_line(role, columns[0], cells)}"
                f"{_others(columns[1:], cells)}",
            )
        taken += [Assigned(role, column, cells[column], cells[column].unit) for column in columns]
        fixed.add(role)
    taken += _settle_unsure(cells, unsure, fixed, wanted, needs, where, warnings)
    return taken, warnings


def _prefer_numbers(
    columns: list[int], kinds: Sequence[str], cells: Sequence[HeaderCell], warnings: list[str]
) -> None:
    """Elapsed time in numbers goes before a clock beside it; a date column beside a clock is dropped."""
    clocks = [c for c in columns if kinds[c] == "C"]
    if len(columns) - len(clocks) == 1:
        for column in clocks:
            columns.remove(column)
            warnings.append(
                f"column {describe(column, cells[column])} also gives time and is not used"
            )


def _settle_unsure(
    cells: Sequence[HeaderCell],
    unsure: dict[str, list[int]],
    fixed: set[str],
    wanted: set[str],
    needs: Sequence[str],
    where: str,
    warnings: list[str],
) -> list[Assigned]:
    """Columns that fit two roles: settled when only one of the roles is asked for and open, else asked."""
    out: list[Assigned] = []
    for need in needs:
        roles = need.split("|")
        if any(role in fixed for role in roles):
            continue
        for role in roles:
            columns = [c for c in unsure.get(role, ()) if c not in {o.column for o in out}]
            if not columns:
                continue
            others = [r for c in columns for r in cells[c].roles if r != role]
            open_others = [r for r in others if r in wanted and r not in fixed]
            if (
                len(columns) > 1
                or open_others
                or (role == "barrier_position" and "area" not in fixed)
            ):
                choices = " or ".join(f'"{r}"' for r in dict.fromkeys([role, *others]))
                raise UpstrokeError(
                    f"column {_listing(cells, columns)} could be {choices}",
                    where=where,
                    remedy=f"say which in the run sheet: {_line(role, columns[0], cells)}",
                )
            if role in ("pressure", "tension"):
                continue
            out.append(Assigned(role, columns[0], cells[columns[0]], cells[columns[0]].unit))
            fixed.add(role)
            warnings.append(
                f"column {describe(columns[0], cells[columns[0]])} is taken for the "
                f"{role.replace('_', ' ')}"
            )
            break
    return out


def _hinted(
    cells: Sequence[HeaderCell], kinds: Sequence[str], hints: Sequence[ColumnHint], where: str
) -> list[Assigned]:
    out: list[Assigned] = []
    for hint in hints:
        column = _find(cells, hint, where)
        if any(one.column == column for one in out):
            raise UpstrokeError(
                f"column {describe(column, cells[column])} is given two roles",
                where=where,
                remedy="keep one [[columns]] table for it in the run sheet",
            )
        if kinds[column] == "T" or (kinds[column] == "C" and hint.role != "time"):
            raise UpstrokeError(
                f"column {describe(column, cells[column])} holds no numbers, the run sheet calls it "
                f"the {hint.role.replace('_', ' ')}",
                where=where,
                remedy=f"columns: {_listing(cells, range(len(cells)))}",
            )
        cell = cells[column]
        unit = hint.unit or cell.unit
        if not hint.unit and unit and not dimension_fits(unit, ROLE_DIMENSION[hint.role]):
            raise UpstrokeError(
                f"column {describe(column, cell)} is in {unit}, the run sheet calls it the "
                f"{hint.role.replace('_', ' ')}",
                where=where,
                remedy="correct the role, or add its unit to that [[columns]] table",
            )
        out.append(Assigned(hint.role, column, cell, unit, True))
    return out


def _fold(text: str) -> str:
    import unicodedata

    return " ".join(unicodedata.normalize("NFKC", text).casefold().split())


def _find(cells: Sequence[HeaderCell], hint: ColumnHint, where: str) -> int:
    if hint.index is not None:
        if hint.index > len(cells):
            raise UpstrokeError(
                f"the run sheet gives {hint.role} as column {hint.index}, the rows have {len(cells)}",
                where=where,
                remedy=f"columns: {_listing(cells, range(len(cells)))}",
            )
        return hint.index - 1
    wanted = _fold(hint.header or "")
    for texts in ([cell.text for cell in cells], [cell.name for cell in cells]):
        found = [i for i, text in enumerate(texts) if text and _fold(text) == wanted]
        if len(found) == 1:
            return found[0]
        if found:
            raise UpstrokeError(
                f"{len(found)} columns have the header '{hint.header}'",
                where=where,
                remedy=f"use index = {found[0] + 1} in that [[columns]] table instead",
            )
    raise UpstrokeError(
        f"no column has the header '{(hint.header or '')[:60]}'",
        where=where,
        remedy=f"columns: {_listing(cells, range(len(cells)))}",
    )


_MENTION: Final = re.compile(
    r"(?:(?<=\s)|^)in\s+(?P<a>[^\s,;()\[\]]{1,24}(?: [^\s,;()\[\]]{1,8}-1)?)|[(\[](?P<b>[^()\[\]]{1,24})[)\]]"
)


def columns_from_text(lines: Sequence[str], columns: int) -> list[HeaderCell]:
    """Names and units of headerless columns from free text such as `area in Å², pressure in mN/m`.

    Only when the text mentions exactly as many different roles with their units as there are columns; they
    are taken in the order mentioned.
    """
    found: list[HeaderCell] = []
    for line in lines:
        for match in _MENTION.finditer(line[:2000]):
            unit = (match.group("a") or match.group("b") or "").rstrip(".:").strip()
            if not is_unit(unit):
                continue
            words = re.split(r"[,;.]", line[: match.start()][-80:])[-1].split()
            if is_derived(" ".join(words[-4:])):
                continue
            for count in range(1, min(4, len(words)) + 1):
                name = " ".join(words[-count:]).lstrip("#%;*!> ")
                if len(roles_of(name, unit)) == 1:
                    found.append(HeaderCell(f"{name} in {unit}", name, unit))
                    break
    roles = [cell.roles[0] for cell in found]
    return found if len(found) == columns and len(set(roles)) == columns else []
