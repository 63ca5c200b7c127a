"""Read a run sheet: TOML in, checked dataclasses in fixed units out."""

from __future__ import annotations

import itertools
import re
import tomllib
from collections.abc import Mapping
from pathlib import Path
from typing import Any, Final

from isotherm.errors import UpstrokeError
from isotherm.file_bytes import read_bytes
from isotherm.quantity import Quantity
from isotherm.sheet import (
    Check,
    ColumnHint,
    Component,
    Dipping,
    Film,
    ProfilePoint,
    RunSheet,
    Stack,
    StackFilm,
    Subphase,
    Substrate,
    Target,
    Trough,
)
from isotherm.sheet_schema import SECTIONS, TITLE, Section
from isotherm.sheet_value import Place, read_value, suggestion
from isotherm.text_bytes import decode

__all__ = ["parse_sheet", "read_sheet"]

_LARGEST: Final = 1_000_000  # bytes; a run sheet is a page of text
# Weighed fractions rarely add up better than this; more than it is a slip.
_FRACTION_SUM_TOLERANCE: Final = 1e-3
_SECTIONS: Final[dict[str, Section]] = {section.path: section for section in SECTIONS}


def read_sheet(path: str | Path) -> RunSheet:
    """Read the run sheet in the file `path`.

    Raises
    ------
    UpstrokeError
        When the file cannot be read, is not TOML, or a key is unknown or its value impossible.
    """
    data = read_bytes(path)
    if len(data) > _LARGEST:
        raise UpstrokeError(
            f"a run sheet of {len(data)} bytes",
            where=str(path),
            remedy="is this the export itself?",
        )
    if not data.strip():
        raise UpstrokeError(
            "the run sheet is empty",
            where=str(path),
            remedy="`upstroke sheet` writes one to fill in",
        )
    return parse_sheet(decode(data, where=str(path)).text, path=str(path))


def parse_sheet(text: str, path: str = "") -> RunSheet:
    """Read a run sheet from its text; `path` is named in errors and kept in the result.

    Raises
    ------
    UpstrokeError
        When the text is not TOML, or a key is unknown or its value impossible.
    """
    where = path or "run sheet"
    try:
        document = tomllib.loads(text.replace("\r\n", "\n"))
    except tomllib.TOMLDecodeError as error:
        raise _not_toml(error, text, where) from None
    except (ValueError, RecursionError, OverflowError) as error:
        raise UpstrokeError(
            f"not a run sheet: {str(error)[:100]}", where=where, remedy="simplify that value"
        ) from None
    place = Place(where, text)
    top = {k: v for k, v in document.items() if k != TITLE.name}
    _check_names(top, tuple(s.path for s in SECTIONS if "." not in s.path), "", place, TITLE.name)
    title = read_value(TITLE, document["title"], "title", place) if "title" in document else ""
    values = {name: _section(_SECTIONS[name], value, name, place) for name, value in top.items()}
    return RunSheet(
        title=title,
        film=_film(values.get("film", {}), place),
        subphase=Subphase(**values.get("subphase", {})),
        trough=_trough(values.get("trough", {}), place),
        substrate=_substrate(values["substrate"], place) if values.get("substrate") else None,
        dipping=Dipping(**values.get("dipping", {})),
        stack=_stack(values.get("stack", {})),
        target=Target(**values.get("target", {})),
        columns=_columns(values.get("columns", ()), place),
        path=path,
        check=Check(**values.get("check", {})),
    )


def _not_toml(error: tomllib.TOMLDecodeError, text: str, where: str) -> UpstrokeError:
    found = re.search(r"\(at line (\d+), column (\d+)\)", str(error))
    reason = str(error).split(" (at ")[0]
    remedy = 'quantities and text go in double quotes, as in volume = "50 µL"'
    if found is None:
        return UpstrokeError(
            f"not TOML: {reason[:100]}",
            where=f"{where}, line {max(1, len(text.splitlines()))} (the last)",
            remedy=remedy,
        )
    line, column = int(found.group(1)), int(found.group(2))
    lines = text.splitlines()
    shown = lines[line - 1].strip()[:60] if 0 < line <= len(lines) else ""
    return UpstrokeError(
        f"not TOML: {reason[:100]} in `{shown}`",
        where=f"{where}, line {line}, column {column}",
        remedy=remedy,
    )


def _check_names(
    given: Mapping[str, Any], allowed: tuple[str, ...], path: str, place: Place, *more: str
) -> None:
    known = (*allowed, *more)
    for name in given:
        if name not in known:
            full = f"{path}.{name}" if path else name
            elsewhere = [
                f"{section.path}.{key.name}"
                for section in SECTIONS
                for key in section.keys
                if key.name == name
            ]
            raise UpstrokeError(
                f"unknown key '{full[:60]}'",
                where=place.of(full),
                remedy=suggestion(name, known, elsewhere),
            )


def _section(section: Section, given: Any, path: str, place: Place) -> Any:
    """Check and read one table, or each of an array of tables."""
    if section.many:
        if not isinstance(given, list):
            raise UpstrokeError(
                f"'{path}' is one table", where=place.of(path), remedy=f"head each with [[{path}]]"
            )
        return tuple(
            _table(section, one, path, place, f"{path}[{number}]")
            for number, one in enumerate(given, 1)
        )
    return _table(section, given, path, place, path)


def _table(section: Section, given: Any, path: str, place: Place, shown: str) -> dict[str, Any]:
    if not isinstance(given, dict):
        raise UpstrokeError(
            f"'{shown}' is {_kind_of(given)}, not a table",
            where=place.of(path),
            remedy=f"head it with [{path}] and put its keys below",
        )
    children = {s.path.rpartition(".")[2]: s for s in SECTIONS if s.path.rpartition(".")[0] == path}
    _check_names(given, tuple(key.name for key in section.keys), path, place, *children)
    out: dict[str, Any] = {}
    for key in section.keys:
        if key.name in given:
            out[key.name] = read_value(key, given[key.name], f"{shown}.{key.name}", place)
        elif key.required:
            raise UpstrokeError(
                f"'{shown}' lacks '{key.name}'",
                where=place.of(path),
                remedy=f"add a line such as {key.name} = {key.example}",
            )
    for name, child in children.items():
        if name in given:
            out[name] = _section(child, given[name], f"{path}.{name}", place)
    return out


def _kind_of(value: Any) -> str:
    names = {list: "a list", str: "text", bool: "true or false", int: "a number", float: "a number"}
    return names.get(type(value), "a date or time")


def _film(values: dict[str, Any], place: Place) -> Film:
    given = values.pop("component", ())
    molar_mass = values.pop("molar_mass", None)
    if given:
        if molar_mass is not None:
            raise UpstrokeError(
                "'film.molar_mass' and [[film.component]] are both given",
                where=place.of("film.molar_mass"),
                remedy="give the molar mass of each component in its own table",
            )
        total = sum(one["mole_fraction"].value for one in given)
        if abs(total - 1.0) > _FRACTION_SUM_TOLERANCE:
            raise UpstrokeError(
                f"the mole fractions add up to {total:.6g}",
                where=place.of("film.component.mole_fraction"),
                remedy="all film.component.mole_fraction together must make 1",
            )
        components = tuple(
            Component(one["name"], one.get("molar_mass"), one["mole_fraction"]) for one in given
        )
    elif molar_mass is not None or values.get("name"):
        whole = Quantity(1.0, None, "1")
        components = (Component(values.get("name", ""), molar_mass, whole),)
    else:
        components = ()
    return Film(components=components, **values)


def _trough(values: dict[str, Any], place: Place) -> Trough:
    trough = Trough(**values)
    low, high = trough.smallest_area, trough.largest_area
    if low is not None and high is not None and low.value >= high.value:
        raise UpstrokeError(
            f"'trough.smallest_area' ({low.value:g} cm^2) is not below 'trough.largest_area' "
            f"({high.value:g} cm^2)",
            where=place.of("trough.smallest_area"),
            remedy="exchange or correct them",
        )
    return trough


def _substrate(values: dict[str, Any], place: Place) -> Substrate:
    points = tuple(
        ProfilePoint(one["height"].value, one["width"].value) for one in values.pop("profile", ())
    )
    substrate = Substrate(profile=points, **values)
    if points:
        heights = [point.height for point in points]
        if len(points) < 2 or any(b <= a for a, b in itertools.pairwise(heights)):
            raise UpstrokeError(
                "the heights in [[substrate.profile]] do not rise from table to table",
                where=place.of("substrate.profile"),
                remedy="give at least two points, lowest first",
            )
        if max(point.width for point in points) <= 0:
            raise UpstrokeError(
                "every width in [[substrate.profile]] is zero",
                where=place.of("substrate.profile"),
                remedy="give the width at each height",
            )
    return substrate


def _stack(values: dict[str, Any]) -> Stack:
    films = tuple(StackFilm(**one) for one in values.pop("film", ()))
    return Stack(films=films, accept_given="accept" in values, **values)


def _columns(given: tuple[dict[str, Any], ...], place: Place) -> tuple[ColumnHint, ...]:
    hints = tuple(ColumnHint(**one) for one in given)
    for number, hint in enumerate(hints, 1):
        if (hint.header is None) == (hint.index is None):
            both = "both" if hint.header is not None else "neither"
            raise UpstrokeError(
                f"columns[{number}] ({hint.role}) has {both} of 'header' and 'index'",
                where=place.of("columns"),
                remedy='give one: header = "..." or index = 3',
            )
        same = [h for h in hints if h.role == hint.role]
        if len(same) > (2 if hint.role == "barrier_position" else 1):
            raise UpstrokeError(
                f"the role '{hint.role}' is given to {len(same)} columns",
                where=place.of("columns"),
                remedy="keep one [[columns]] table for it",
            )
    return hints
