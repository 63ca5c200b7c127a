"""What a check before spreading found, as frozen data that writes and reads its JSON form."""

from __future__ import annotations

import math
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from isotherm.errors import UpstrokeError
from isotherm.json_file import read_json
from isotherm.quantity import Quantity
from isotherm.source import Source

__all__ = ["CheckCurve", "CheckItem", "CheckResult", "load_check", "verdict_of"]

FloatArray = NDArray[np.float64]

_SCHEMA = "upstroke.check/1"
_REMEDY = "give the file that `upstroke check --json` wrote"


def verdict_of(quantity: Quantity, limit: float) -> str:
    """Judge |value| against a limit with its expanded uncertainty U = 2 u.

    "pass" when |value| + U is within the limit, "fail" when |value| - U is beyond it, else "undecided"
    (guard bands as in JCGM 106:2012, sec. 8.3). Without u only the value counts, and "pass" is not given.
    """
    size = abs(quantity.value)
    if quantity.u is None:
        return "fail" if size > limit else "undecided"
    if size + 2.0 * quantity.u <= limit:
        return "pass"
    return "fail" if size - 2.0 * quantity.u > limit else "undecided"


@dataclass(frozen=True)
class CheckItem:
    """One thing checked.

    name : what.  value : found.  limit : largest |value| allowed, unit of the value; None: nothing to pass.
    limit_from : "run sheet" | "common practice" | "".  verdict : "pass" | "fail" | "undecided" | "".
    note : where or how, one sentence.  record : path of the record, or "run sheet".
    """

    name: str
    value: Quantity
    limit: float | None
    limit_from: str
    verdict: str
    note: str = ""
    record: str = ""

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form."""
        return {
            "name": self.name,
            "value": self.value.to_json(),
            "limit": self.limit,
            "limit_from": self.limit_from,
            "verdict": self.verdict,
            "note": self.note,
            "record": self.record,
        }


@dataclass(frozen=True)
class CheckCurve:
    """One record in compact form, for the figure.

    time : (m,) s from its start (row number where no time was recorded).  area : (m,) `area_unit`, or None.
    pressure, fitted : (m,) mN/m.  hinge : area at which the pressure starts to rise, or None.
    """

    record: str
    time: FloatArray
    area: FloatArray | None
    area_unit: str
    pressure: FloatArray
    fitted: FloatArray
    hinge: Quantity | None = None
    timed: bool = True


@dataclass(frozen=True)
class CheckResult:
    """Everything checked before spreading.

    zero_offset : pressure the clean surface reads, mN/m.  drift_rate : mN/m/h.  Both None where not found.
    path : file the result was loaded from, "" for a fresh one.
    """

    items: tuple[CheckItem, ...]
    zero_offset: Quantity | None = None
    drift_rate: Quantity | None = None
    sources: tuple[Source, ...] = ()
    curves: tuple[CheckCurve, ...] = ()
    title: str = ""
    warnings: tuple[str, ...] = field(default=())
    path: str = ""

    @property
    def verdict(self) -> str:
        """Worst verdict of all items: "fail", else "undecided", else "pass"."""
        found = {item.verdict for item in self.items}
        return next((v for v in ("fail", "undecided", "pass") if v in found), "undecided")

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form, schema upstroke.check/1."""
        return {
            "schema": _SCHEMA,
            "title": self.title,
            "sources": [source.to_json() for source in self.sources],
            "verdict": self.verdict,
            "items": [item.to_json() for item in self.items],
            "zero_offset": self.zero_offset.to_json() if self.zero_offset else None,
            "drift_rate": self.drift_rate.to_json() if self.drift_rate else None,
            "warnings": list(self.warnings),
        }


def _number(given: Any) -> float | None:
    """A finite number as float, else None."""
    good = isinstance(given, int | float) and not isinstance(given, bool) and math.isfinite(given)
    return float(given) if good else None


def _quantity(given: Any, key: str, unit: str | None, where: str) -> Quantity:
    """Quantity from its JSON form; `unit` None takes any."""
    fields = given if isinstance(given, dict) else {}
    value = _number(fields.get("value"))
    parts = {name: _number(fields.get(name)) for name in ("u", "u_random", "u_systematic")}
    told = {name for name in parts if fields.get(name) is not None}
    bad = any(parts[name] is None or (parts[name] or 0.0) < 0 for name in told)
    if value is None or bad or (unit is not None and fields.get("unit") != unit):
        expected = f" in {unit}" if unit is not None else ""
        raise UpstrokeError(
            f"'{key}' of the check is not a quantity{expected}", where=where, remedy=_REMEDY
        )
    return Quantity(
        value, parts["u"], str(fields.get("unit", "1")), parts["u_random"], parts["u_systematic"]
    )


def _item(given: Any, number: int, where: str) -> CheckItem:
    if not isinstance(given, dict):
        raise UpstrokeError(f"item {number} of the check is no item", where=where, remedy=_REMEDY)
    return CheckItem(
        name=str(given.get("name", "")),
        value=_quantity(given.get("value"), f"items[{number}].value", None, where),
        limit=_number(given.get("limit")),
        limit_from=str(given.get("limit_from", "")),
        verdict=str(given.get("verdict", "")),
        note=str(given.get("note", "")),
        record=str(given.get("record", "")),
    )


def load_check(path: str | Path) -> CheckResult:
    """Read the JSON that a check wrote.

    Parameters
    ----------
    path : str or Path
        File with schema upstroke.check/1.

    Returns
    -------
    CheckResult
        Items, zero and drift; the records' curves are not kept in the file.

    Raises
    ------
    UpstrokeError
        When the file cannot be read or is not such a result.
    """
    where = str(path)
    data, _ = read_json(path, remedy=_REMEDY)
    items = data.get("items", []) if isinstance(data, dict) else None
    if not isinstance(data, dict) or data.get("schema") != _SCHEMA or not isinstance(items, list):
        raise UpstrokeError("not the result of a check", where=where, remedy=_REMEDY)
    zero, drift, notes = (data.get(key) for key in ("zero_offset", "drift_rate", "warnings"))
    return CheckResult(
        items=tuple(_item(one, i, where) for i, one in enumerate(items, start=1)),
        zero_offset=None if zero is None else _quantity(zero, "zero_offset", "mN/m", where),
        drift_rate=None if drift is None else _quantity(drift, "drift_rate", "mN/m/h", where),
        title=str(data.get("title", "")),
        warnings=tuple(str(one) for one in notes) if isinstance(notes, list) else (),
        path=where,
    )
