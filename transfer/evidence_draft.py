"""What an evidence file says, before units and files are looked at; CSV and TOML both end here."""

from __future__ import annotations

import csv
import io
import re
import tomllib
from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any

from isotherm.errors import UpstrokeError
from isotherm.sheet_value import Place, suggestion
from transfer.evidence_kinds import ELECTRODE, KINDS, POINT_KEYS

__all__ = ["Draft", "DraftPoint", "draft_from_csv", "draft_from_toml"]

_ELECTRODE_IN_SERIES = {"area": "electrode_area", "roughness": "roughness"}


@dataclass(frozen=True)
class DraftPoint:
    """One point as written."""

    given: dict[str, Any]
    where: str


@dataclass
class Draft:
    """One series as written; `places` says where each setting stands."""

    kind: str
    label: str
    where: str
    settings: dict[str, Any] = field(default_factory=dict)
    places: dict[str, Place] = field(default_factory=dict)
    points: list[DraftPoint] = field(default_factory=list)


def draft_from_toml(text: str, path: str) -> list[Draft]:
    """Read the TOML form: [electrode], and a table (or array of tables) per kind with its points.

    Raises
    ------
    UpstrokeError
        Not TOML, an unknown kind or key, or a kind without points.
    """
    try:
        document = tomllib.loads(text.replace("\r\n", "\n"))
    except (tomllib.TOMLDecodeError, ValueError, RecursionError) as error:
        found = re.search(r"\(at line (\d+), column (\d+)\)", str(error))
        at = f", line {found.group(1)}, column {found.group(2)}" if found else ""
        raise UpstrokeError(
            f"not TOML: {str(error).split(' (at ')[0][:100]}",
            where=f"{path}{at}",
            remedy='quantities go in double quotes, as in value = "5.0 ± 0.1 nm"',
        ) from None
    place = Place(path, text)
    electrode = document.pop("electrode", {})
    document.pop("title", None)
    if not isinstance(electrode, dict):
        raise UpstrokeError("[electrode] is not a table", where=place.of("electrode"),
                            remedy="head it with [electrode]")  # fmt: skip
    _known(electrode, tuple(k.name for k in ELECTRODE), "electrode", place)
    drafts: list[Draft] = []
    for kind, given in document.items():
        _kind(kind, place.of(kind))
        tables = given if isinstance(given, list) else [given]
        for number, table in enumerate(tables, 1):
            if not isinstance(table, dict):
                raise UpstrokeError(f"'{kind}' is not a table", where=place.of(kind),
                                    remedy=f"head it with [{kind}]")  # fmt: skip
            drafts.append(_table(kind, table, number, len(tables), electrode, place))
    return drafts


def _table(
    kind: str,
    table: dict[str, Any],
    number: int,
    many: int,
    electrode: dict[str, Any],
    place: Place,
) -> Draft:
    table = dict(table)
    points = table.pop("points", None)
    allowed = tuple(key.name for key in KINDS[kind].keys)
    _known(table, allowed, kind, place, "points")
    plain = KINDS[kind].words
    label = str(table.pop("label", plain if many == 1 else f"{plain} {number}"))
    if not isinstance(points, list) or not points:
        raise UpstrokeError(
            f"'{kind}' has no points",
            where=place.of(kind),
            remedy='add points = [{layers = 2, value = "..."}]',
        )
    draft = Draft(kind, label, place.of(kind))
    for name, value in electrode.items():
        key = _ELECTRODE_IN_SERIES[name]
        if key in allowed:
            draft.settings[key] = value
            draft.places[key] = place
    for name, value in table.items():
        draft.settings[name] = value
        draft.places[name] = place
    for count, point in enumerate(points, 1):
        where = _point_line(place, kind, number, count)
        if not isinstance(point, dict):
            raise UpstrokeError(f"point {count} of '{kind}' is not a table", where=where,
                                remedy='write it as {layers = 2, value = "..."}')  # fmt: skip
        for key in point:
            if key not in POINT_KEYS or key == "unit":
                raise UpstrokeError(f"unknown key '{key}' in a point of '{kind}'", where=where,
                                    remedy=suggestion(key, POINT_KEYS))  # fmt: skip
        draft.points.append(DraftPoint(dict(point), where))
    return draft


def _point_line(place: Place, kind: str, number: int, count: int) -> str:
    """Name the line of the `count`th point of the `number`th table of `kind`."""
    table = points = 0
    inside = False
    for line_number, line in enumerate(place.text.splitlines(), 1):
        start = line.strip()
        header = re.match(r"\[+\s*([\w.]+)\s*\]+", start)
        if header and "=" not in start.partition("]")[0]:
            name = header.group(1)
            if name == kind:
                table += 1
            inside = table == number and name in (kind, f"{kind}.points")
            if not name.endswith(".points") and name != kind:
                inside = False
        if inside:
            points += len(re.findall(r"\b(?:layers|stroke)\s*=", start.partition("#")[0]))
            if points >= count:
                return f"{place.where}, line {line_number}"
    return place.of(f"{kind}.points")


def draft_from_csv(text: str, path: str) -> list[Draft]:
    """Read the CSV form: one row per value or raw file; see `evidence_read`.

    Raises
    ------
    UpstrokeError
        No header, an unknown kind or column, or settings that change within a series.
    """
    lines = [(n, line) for n, line in enumerate(text.splitlines(), 1)]
    lines = [(n, line) for n, line in lines if line.strip() and not line.lstrip().startswith("#")]
    if not lines:
        raise UpstrokeError("the evidence file is empty", where=path,
                            remedy="give a header line and one row per value")  # fmt: skip
    mark = max(";\t,", key=lines[0][1].count)
    rows = [
        (n, next(csv.reader(io.StringIO(line), delimiter=mark, skipinitialspace=True)))
        for n, line in lines
    ]
    head = [name.strip().lower().replace(" ", "_") for name in rows[0][1]]
    known = sorted(
        {"kind", "label", *POINT_KEYS, *(k.name for v in KINDS.values() for k in v.keys)}
    )
    where = f"{path}, line {rows[0][0]}"
    for name in head:
        if name and name not in known:
            raise UpstrokeError(
                f"unknown column '{name[:40]}'", where=where, remedy=suggestion(name, known)
            )
        if name and head.count(name) > 1:
            raise UpstrokeError(f"column '{name}' stands twice", where=where, remedy="keep one")
    if "kind" not in head:
        raise UpstrokeError("no column says the kind of evidence", where=where,
                            remedy="head the columns kind,layers,value,u,unit")  # fmt: skip
    drafts: dict[tuple[str, str], Draft] = {}
    for number, cells in rows[1:]:
        where = f"{path}, line {number}"
        if len(cells) > len(head) and any(c.strip() for c in cells[len(head) :]):
            raise UpstrokeError(f"{len(cells)} cells under {len(head)} headers", where=where,
                                remedy="put quotes round a cell that holds the separator")  # fmt: skip
        given = {h: c.strip() for h, c in zip(head, cells, strict=False) if h and c.strip()}
        _row(given, drafts, where, decimal_comma=mark != ",")
    return list(drafts.values())


def _row(
    given: dict[str, str], drafts: dict[tuple[str, str], Draft], where: str, *, decimal_comma: bool
) -> None:
    kind = given.pop("kind", "").lower().replace(" ", "_").replace("-", "_")
    _kind(kind, where)
    label = given.pop("label", KINDS[kind].words)
    draft = drafts.setdefault((kind, label), Draft(kind, label, where))
    keys = {key.name: key for key in KINDS[kind].keys}
    per_point = {k: v for k, v in given.items() if k in POINT_KEYS and k not in ("unit", "u")}
    for name, cell in given.items():
        if name in POINT_KEYS:
            continue
        if name not in keys:
            raise UpstrokeError(f"'{name}' is not a setting of {kind}", where=where,
                                remedy=suggestion(name, tuple(keys)))  # fmt: skip
        whole = keys[name].kind == "integer" and re.fullmatch(r"\d{1,6}", cell)
        value: Any = int(cell) if whole else cell
        if draft.settings.setdefault(name, value) != value:
            raise UpstrokeError(
                f"'{name}' is {cell} here and {draft.settings[name]} before, in one series",
                where=where,
                remedy="give the series different labels",
            )
        draft.places.setdefault(name, Place(where, ""))
    if "value" in given:
        number = given["value"].replace(",", ".") if decimal_comma else given["value"]
        u = f" ± {given['u']}" if "u" in given else ""
        unit = given.get("unit", "")
        per_point["value"] = f"{number}{u} {'' if unit == '1' else unit}".strip()
    draft.points.append(DraftPoint(dict(per_point), where))


def _kind(kind: str, where: str) -> None:
    if kind in KINDS:
        return
    raise UpstrokeError(
        f"unknown kind of evidence '{kind[:40]}'" if kind else "no kind of evidence given",
        where=where,
        remedy=suggestion(kind, tuple(KINDS)),
    )


def _known(
    given: Mapping[str, Any], allowed: tuple[str, ...], path: str, place: Place, *more: str
) -> None:
    for name in given:
        if name not in (*allowed, *more):
            raise UpstrokeError(
                f"unknown key '{path}.{name[:40]}'",
                where=place.of(f"{path}.{name}"),
                remedy=suggestion(name, (*allowed, *more)),
            )
