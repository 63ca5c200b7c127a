"""One invented run in a random dress: any layout, encoding, header style and clutter an export may have."""

from __future__ import annotations

import random
from dataclasses import dataclass

from make_exports import InventedRun, invented_run

__all__ = ["Dressed", "dressed_export"]

_NAMES = {
    "time": ("Time", "t", "Elapsed time", "Zeit", "Temps", "Tiempo", "time"),
    "area": ("Area", "Trough area", "A", "Fläche", "Film area", "Surface", "trough_area"),
    "molecular_area": (
        "Area per molecule", "Mma", "Molecular area", "A", "Mean molecular area", "Molekülfläche",
    ),
    "pressure": (
        "Surface pressure", "Pressure", "Pi", "π", "Π", "Oberflächendruck", "Pression de surface", "SP",
    ),
    "temperature": ("Temperature", "T", "Temp", "Temperatur", "Subphase temperature"),
}  # fmt: skip
# unit as written, and how many of the fixed unit it is
_UNITS = {
    "time": (("s", 1.0), ("min", 60.0), ("sec", 1.0), ("h", 3600.0)),
    "area": (("cm^2", 1.0), ("cm²", 1.0), ("cm2", 1.0), ("mm^2", 0.01), ("mm²", 0.01), ("m2", 1e4)),
    "molecular_area": (
        ("Å²", 0.01), ("A^2", 0.01), ("nm²", 1.0), ("nm2", 1.0), ("Å^2/molecule", 0.01), ("A2/molec", 0.01),
    ),
    "pressure": (
        ("mN/m", 1.0), ("mN m-1", 1.0), ("mN·m⁻¹", 1.0), ("dyn/cm", 1.0), ("N/m", 1000.0), ("mN m^-1", 1.0),
    ),
    "temperature": (("°C", None), ("degC", None), ("K", None)),
}  # fmt: skip
_STYLES = (
    "{n} ({u})",
    "{n} [{u}]",
    "{n} / {u}",
    "{n}, {u}",
    "{n}({u})",
    "{n}/{u}",
    "{n} in {u}",
    "{n} {u}",
)
_PREAMBLES = (
    "Run of an invented film",
    "Date: 2031-05-06 10:11:12",
    "Barrier speed: 10 mm/min",
    "Operator: nobody, comment: none (12 of 13)",
    "Max area 243 cm2",
    "Subphase temperature (degC): 20.1",
    "Probe perimeter = 39.24 mm",
    "",
    "----------------------",
    "Steps: 1, 2, 3",
    "Film: 50 ul of 1 mg/ml",
)
_FOOTERS = ("End of run", "", "Mean 3 4 5", "checksum 0x3f", "Stopped by user at 10:31:00", "----")


@dataclass(frozen=True)
class Dressed:
    """The bytes, what was done, and how exactly each role was written (relative)."""

    data: bytes
    said: str
    roles: tuple[str, ...]
    run: InventedRun


def _number(rng: random.Random, value: float, decimal: str, style: str) -> str:
    text = f"{value:.9e}" if style == "exponent" else f"{value:.10g}"
    if style == "plain" and "e" in text:
        text = f"{value:.12f}"
    return text.replace(".", decimal)


def dressed_export(rng: random.Random) -> Dressed:
    """Write the invented run in a random dress."""
    run = invented_run()
    delimiter = rng.choice([",", ";", "\t", " ", "  ", "\t", ";", ", ", "; ", " \t"])
    bare = delimiter.strip(" ") or " "
    decimal = "." if bare == "," else rng.choice([".", ","])
    roles = ["pressure", rng.choice(["area", "molecular_area"])]
    if rng.random() < 0.7:
        roles.append("time")
    if rng.random() < 0.3:
        roles.append("temperature")
    rng.shuffle(roles)
    style = rng.choice(_STYLES)
    if bare == "," and style == "{n}, {u}":
        style = "{n} ({u})"
    lines_of_header = rng.choice([1, 1, 2])
    if bare == " " and lines_of_header == 1:
        style = rng.choice(["{n} ({u})", "{n} [{u}]"])
    names, units, columns = [], [], []
    number_style = rng.choice(["plain", "plain", "exponent"])
    for role in roles:
        name, (unit, factor) = rng.choice(_NAMES[role]), rng.choice(_UNITS[role])
        values = getattr(run, role).tolist()
        if factor is None:
            values = [v + (273.15 if unit == "K" else 0.0) for v in values]
        else:
            values = [v / factor for v in values]
        if bare == " " and lines_of_header == 2:
            name, unit = name.replace(" ", "_"), unit.replace(" ", ".")
        names.append(name)
        units.append(unit)
        columns.append([_number(rng, v, decimal, number_style) for v in values])
    rows = [list(row) for row in zip(*columns, strict=True)]
    trailing = bare if rng.random() < 0.15 and bare != " " else ""
    quote = rng.random() < 0.1 and bare in ",;\t"
    join = (lambda cells: delimiter.join(f'"{c}"' for c in cells)) if quote else delimiter.join
    body = [join(row) + trailing for row in rows]
    if lines_of_header == 1:
        header = [
            join([style.format(n=n, u=u) for n, u in zip(names, units, strict=True)]) + trailing
        ]
    else:
        bracket = rng.choice(["{}", "({})", "[{}]"])
        header = [join(names) + trailing, join([bracket.format(u) for u in units]) + trailing]
    comment = rng.random() < 0.15 and not quote
    if comment:
        header = [f"# {line}" for line in header]
    if rng.random() < 0.15:
        for at in (30, 20, 10):
            body[at:at] = header
    if rng.random() < 0.15:
        body = [line for row in body for line in (row, "")]
    preamble = [rng.choice(_PREAMBLES) for _ in range(rng.choice([0, 0, 1, 4, 12]))]
    footer = [rng.choice(_FOOTERS) for _ in range(rng.choice([0, 0, 1, 3]))]
    encoding = rng.choice(["utf-8", "utf-8-sig", "utf-16", "latin-1", "utf-16-le", "cp1252"])
    end = rng.choice(["\n", "\r\n", "\r"])
    text = end.join([*preamble, *header, *body, *footer]) + (end if rng.random() < 0.8 else "")
    try:
        data = text.encode(encoding)
    except UnicodeEncodeError:
        encoding = "utf-8"
        data = text.encode(encoding)
    said = (
        f"{delimiter!r} {decimal} {encoding} {end!r} {header} trailing={trailing!r} quote={quote}"
    )
    return Dressed(data, said, tuple(roles), run)
