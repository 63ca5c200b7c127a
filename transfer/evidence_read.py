"""Read an evidence file: measurements on the deposited film, as CSV or TOML.

CSV, one row per value (or per raw file), with a header; columns may stand in any order:

    kind,layers,value,u,unit,crystal_frequency,faces
    ellipsometric_thickness,4,10.1,0.2,nm,,
    resonator_frequency,4,-410,3,Hz,5 MHz,2

`layers` counts the strokes that laid film, `stroke` the strokes of the log; 0 is the bare substrate.
u is a standard uncertainty. Settings (`crystal_frequency` …) are quantities with their unit; they may
be left blank after the first row of a series. Rows of one kind form one series unless `label` differs.
A raw record is named in `file` (relative to the evidence file), its scan rate in `scan_rate`.

TOML says the same in tables, and several points may share a raw file's settings:

    [electrode]
    area = "0.196 ± 0.004 cm^2"
    roughness = "1.15 ± 0.05"
    [interfacial_capacitance]
    permittivity = "2.6 ± 0.1"
    points = [
      {layers = 0, value = "4.10 ± 0.05 µF"},
      {layers = 4, files = ["l4_050.csv", "l4_100.csv"], scan_rates = ["50 mV/s", "100 mV/s"]},
    ]

Kinds and their settings are listed in `evidence_kinds.KINDS`.
"""

from __future__ import annotations

import hashlib
import re
from pathlib import Path
from typing import Any

from isotherm.errors import UpstrokeError
from isotherm.file_bytes import read_bytes
from isotherm.quantity import Quantity
from isotherm.quantity_text import parse_quantity
from isotherm.sheet_value import read_value
from isotherm.text_bytes import decode
from transfer.evidence_draft import Draft, DraftPoint, draft_from_csv, draft_from_toml
from transfer.evidence_kinds import KINDS, Kind
from transfer.evidence_raw import read_raw
from transfer.evidence_series import (
    EvidencePoint,
    EvidenceSeries,
    EvidenceSet,
    Impedance,
    RawRecord,
)

__all__ = ["read_evidence"]

_LARGEST = 20_000_000  # bytes; tables of values are far smaller
_MOST_LAYERS = 1_000_000
# No value of any kind comes near these in its fixed unit (Hz, nm, mol/cm^2, C, F, A, ohm).
_LARGEST_VALUE = 1e15
_SMALLEST_U = 1e-25
_SLOWEST, _FASTEST = 1e-7, 1e7  # V/s
# Absorbance is a pure number; these are ways to say so.
_ABSORBANCE_UNIT = re.compile(r"\s*(?:(?<=\d\s)1|AU|a\.u\.|abs)\s*$", re.IGNORECASE)


def read_evidence(path: str | Path) -> EvidenceSet:
    """Read the evidence file at `path` and the raw files it names.

    Raises
    ------
    UpstrokeError
        A file cannot be read, a kind, key or unit is unknown, a unit is missing, or a value impossible.
    """
    path = Path(path)
    data = read_bytes(path)
    if len(data) > _LARGEST:
        raise UpstrokeError(f"an evidence file of {len(data)} bytes", where=str(path),
                            remedy="is this a raw export? name it in an evidence file")  # fmt: skip
    text = decode(data, where=str(path)).text
    suffix = path.suffix.lower()
    if suffix == ".toml":
        drafts = draft_from_toml(text, str(path))
    elif suffix in (".csv", ".tsv", ".txt"):
        drafts = draft_from_csv(text, str(path))
    else:
        raise UpstrokeError(f"evidence is read from .csv or .toml, not '{suffix}'",
                            where=str(path), remedy="rename or convert the file")  # fmt: skip
    series = tuple(_series(draft, path.parent) for draft in drafts)
    if not series:
        raise UpstrokeError("no evidence in the file", where=str(path),
                            remedy="give one row per value")  # fmt: skip
    raw = tuple(dict.fromkeys(r.curve.path for s in series for p in s.points for r in p.records))
    return EvidenceSet(str(path), hashlib.sha256(data).hexdigest(), series, raw)


def _series(draft: Draft, folder: Path) -> EvidenceSeries:
    kind = KINDS[draft.kind]
    keys = {key.name: key for key in kind.keys}
    settings = {
        name: read_value(keys[name], given, f"{draft.kind}.{name}", draft.places[name])
        for name, given in draft.settings.items()
    }
    for name, setting in settings.items():
        if isinstance(setting, Quantity) and (setting.u or 0.0) >= abs(setting.value):
            raise UpstrokeError(f"the u of '{name}' is as large as its value",
                                where=draft.places[name].of(f"{draft.kind}.{name}"),
                                remedy="give the standard uncertainty, in the unit of the value")  # fmt: skip
    points: list[EvidencePoint] = []
    for raw in draft.points:
        point = _point(raw, kind, settings, folder)
        same = next(
            (
                n
                for n, p in enumerate(points)
                if p.records
                and point.records
                and (p.axis, p.position) == (point.axis, point.position)
            ),
            None,
        )
        if same is None:
            points.append(point)
        else:  # further records of one state of the film belong to one point
            old = points[same]
            points[same] = EvidencePoint(
                old.axis, old.position, None, (*old.records, *point.records), old.where
            )
    units = {p.value.unit: p for p in points if p.value is not None}
    if len(units) > 1:
        raise UpstrokeError(
            f"{draft.kind} mixes values in {' and '.join(units)}",
            where=list(units.values())[1].where,
            remedy="give them in one unit, or as series with different labels",
        )
    return EvidenceSeries(draft.kind, draft.label, tuple(points), settings, draft.where)


def _point(raw: DraftPoint, kind: Kind, settings: dict[str, Any], folder: Path) -> EvidencePoint:
    given, where = raw.given, raw.where
    axes = [axis for axis in ("layers", "stroke") if axis in given]
    if len(axes) != 1:
        raise UpstrokeError(
            "both layers and stroke are given" if axes else "neither layers nor stroke is given",
            where=where,
            remedy="give the number of layers, or the stroke after which it was measured",
        )
    position = _whole(given[axes[0]], axes[0], where)
    files = given.get("files", given.get("file"))
    if files is not None and "value" in given:
        raise UpstrokeError("a point has both a value and a file", where=where,
                            remedy="give them as two points")  # fmt: skip
    if files is not None:
        records = _records(files, given, kind, settings, folder, where)
        return EvidencePoint(axes[0], position, None, records, where)
    if "value" not in given:
        more = ", or a file" if kind.files else ""
        raise UpstrokeError(f"no value given for {kind.name}", where=where,
                            remedy=f"give value, u and unit{more}")  # fmt: skip
    value = _value(given, kind, where)
    largest = max(abs(value.value), value.u or 0.0)
    if largest > _LARGEST_VALUE or (value.u is not None and value.u < _SMALLEST_U):
        raise UpstrokeError(f"impossible value of {kind.name}: {value.value:g} {value.unit}",
                            where=where, remedy="check number, u and unit")  # fmt: skip
    if value.value < kind.lowest:
        what = "negative charge" if value.unit in ("C", "C/cm^2") else f"negative {kind.name}"
        raise UpstrokeError(f"{what.replace('_', ' ')} ({value.value:g} {value.unit})", where=where,
                            remedy="give its size, without the sign of the current")  # fmt: skip
    return EvidencePoint(axes[0], position, value, (), where)


def _whole(given: Any, name: str, where: str) -> int:
    try:
        number = float(given)
    except (TypeError, ValueError):
        number = -1.0
    if not 0 <= number <= _MOST_LAYERS or number != int(number):
        raise UpstrokeError(f"'{name}' is {given!s:.30}", where=where,
                            remedy="give a whole number, 0 for the bare substrate")  # fmt: skip
    return int(number)


def _value(given: dict[str, Any], kind: Kind, where: str) -> Quantity:
    text = given["value"]
    if isinstance(text, int | float) and not isinstance(text, bool):
        text = f"{text!r}"
    if "u" in given and "±" not in str(text):
        number, _, unit = str(text).strip().partition(" ")
        text = f"{number} ± {given['u']} {unit}".strip()
    if kind.units == ("1",):
        text = _ABSORBANCE_UNIT.sub("", str(text))
    first: UpstrokeError | None = None
    for unit in kind.units:
        try:
            return parse_quantity(str(text), unit, where=where)
        except UpstrokeError as error:
            first = first or error
    what = first.what if first is not None else f"'{text}' is not a quantity"
    if what.endswith("has no unit") or "not a unit of" in what:
        allowed = " or ".join(kind.units)
        raise UpstrokeError(
            what.replace(f"not a unit of {kind.units[0]}", f"not a unit of {kind.name}"),
            where=where,
            remedy=f"give it in {allowed} (with any prefix)",
        )
    raise first or UpstrokeError(what, where=where)


def _records(
    files: Any,
    given: dict[str, Any],
    kind: Kind,
    settings: dict[str, Any],
    folder: Path,
    where: str,
) -> tuple[RawRecord, ...]:
    if not kind.files:
        raise UpstrokeError(f"{kind.name} is not read from raw files", where=where,
                            remedy="give value, u and unit")  # fmt: skip
    names = files if isinstance(files, list) else [files]
    rates = given.get("scan_rates", given.get("scan_rate"))
    rates = rates if isinstance(rates, list) else [rates] * len(names)
    if len(rates) != len(names):
        raise UpstrokeError(f"{len(names)} files and {len(rates)} scan rates", where=where,
                            remedy="give one scan rate for each file")  # fmt: skip
    records = []
    for name, rate in zip(names, rates, strict=True):
        raw = read_raw(folder / str(name), where)
        spectrum = isinstance(raw.curve, Impedance)
        if spectrum and kind.files == "voltammogram":
            raise UpstrokeError(f"'{name}' is an impedance record", where=where,
                                remedy=f"{kind.name} needs a voltammogram")  # fmt: skip
        scan: Quantity | None = None
        frequency: Quantity | None = None
        if spectrum:
            frequency = settings.get("frequency")
            if "frequency" in given:
                frequency = parse_quantity(str(given["frequency"]), "Hz", where=where)
            if frequency is None and len(set(raw.curve.frequency)) > 1:  # type: ignore[union-attr]
                raise UpstrokeError(f"'{name}' holds a spectrum and no frequency to read it at",
                                    where=where, remedy='add frequency = "100 Hz"')  # fmt: skip
        else:
            scan = settings.get("scan_rate")
            if rate is not None:
                scan = parse_quantity(str(rate), "V/s", where=where)
                if not _SLOWEST <= scan.value <= _FASTEST:
                    raise UpstrokeError(f"a scan rate of {scan.value:g} V/s", where=where,
                                        remedy="check its unit")  # fmt: skip
            elif scan is None and raw.scan_rate is not None:
                scan = Quantity(raw.scan_rate, None, "V/s")
            if scan is None or not scan.value > 0:
                raise UpstrokeError(f"no scan rate for '{name}'", where=where,
                                    remedy='add scan_rate = "50 mV/s", or a time column')  # fmt: skip
        records.append(RawRecord(raw.curve, scan, frequency))
    return tuple(records)
