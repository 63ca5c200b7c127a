"""Units as people write them, turned into the project's fixed units."""

from __future__ import annotations

import re
import unicodedata
from dataclasses import dataclass
from functools import lru_cache
from typing import Final, TypeVar

import numpy as np
from numpy.typing import NDArray

from isotherm.constants import AVOGADRO, ZERO_CELSIUS
from isotherm.errors import UpstrokeError
from isotherm.unit_symbols import DIMENSIONS, PREFIXES, SYMBOLS, WHOLE, Dims, Symbol

__all__ = ["Conversion", "Unit", "conversion", "dimension_fits", "is_unit", "parse_unit"]

FloatOrArray = TypeVar("FloatOrArray", float, NDArray[np.float64])

_LONGEST: Final = 60  # characters; no unit of the bench is longer, and hostile headers stop here
_LARGEST_EXPONENT: Final = 30
_LARGEST_SIZE: Final = (
    120  # decimal places of a unit against the SI's; powers of powers have no end
)
_TOKEN: Final = re.compile(
    r"(?P<number>\d+(?:\.\d+)?(?:[eE][-+]?\d+)?)|(?P<symbol>[^\W\d_]+|[%‰])|(?P<power>\^)|"
    r"(?P<sign>[-+])|(?P<divide>/)|(?P<multiply>[·.])|(?P<open>\()|(?P<close>\))"
)


@dataclass(frozen=True)
class Unit:
    """A unit: `mantissa` × 10^`exponent` SI units of dimension `dims`; `celsius`: its zero is its own.

    per_molecule : divided by a count of molecules, as in Å^2/molecule.
    """

    mantissa: float
    exponent: int
    dims: Dims
    per_molecule: bool = False
    celsius: bool = False


@dataclass(frozen=True)
class Conversion:
    """From a unit as written (`text`) to a fixed `unit`: value × mantissa × 10^exponent + offset."""

    text: str
    unit: str
    mantissa: float
    exponent: int
    offset: float = 0.0

    def scale(self, value: FloatOrArray) -> FloatOrArray:
        """Convert a difference or an uncertainty (float or (n,) array), leaving the zero aside."""
        # Powers of ten divide rather than multiply when negative: 21.5 Å^2 is then exactly 0.215 nm^2.
        out = value * self.mantissa if self.mantissa != 1.0 else value
        if self.exponent > 0:
            return out * 10.0**self.exponent
        if self.exponent < 0:
            return out / 10.0**-self.exponent
        return out

    def __call__(self, value: FloatOrArray) -> FloatOrArray:
        """Convert a value (float or (n,) array) to `unit`."""
        out = self.scale(value)
        return out + self.offset if self.offset else out


def _normal(text: str) -> str:
    """Fold the many ways to type one unit into one: superscripts, dots, minus signs, micro, ångström."""
    text = unicodedata.normalize("NFKC", text).strip().strip("[]{}<>'\"` ").strip()
    for old, new in _FOLDS:
        text = text.replace(old, new)
    text = _SQUARE_BEFORE.sub(r"\1^2", text)
    text = _SQUARE_AFTER.sub("^2", text)
    text = re.sub(r"\bper\b|\bpro\b|\bpar\b|\bpor\b", "/", text)
    text = re.sub(r"°\s?C\b|\bdeg\.? ?C\b|\bo ?C\b|\bGrad C\b", "degC", text)
    return text.strip()


_SQUARE_BEFORE: Final = re.compile(r"\b(?:square|sq\.?) ?([^\W\d_]+)", re.IGNORECASE)
_SQUARE_AFTER: Final = re.compile(r" ?\b(?:squared|sq\.?)(?!\w)", re.IGNORECASE)
# (NFKC has already turned superscript digits into digits and the ångström and micro signs into letters.)
_FOLDS: Final = (
    ("\\AA", "Å"), ("−", "-"), ("–", "-"), ("—", "-"), ("⁄", "/"), ("∕", "/"), ("÷", "/"), ("**", "^"),
    ("⋅", "·"), ("•", "·"),
    ("∙", "·"), ("×", "·"), ("*", "·"), ("μ", "u"), ("µ", "u"), ("{", ""), ("}", ""), ("$", ""), ("\\", ""),
    ("º", "°"), ("˚", "°"),
)  # fmt: skip


def _readings(word: str) -> tuple[Symbol, ...]:
    """Every meaning of one symbol, prefixes included."""
    found = list(SYMBOLS.get(word, ()))
    if word not in ("min", "cc", "h", "d", "in") and len(word) > 1 and word[0] in PREFIXES:
        shift = PREFIXES[word[0]]
        found += [
            Symbol(s.mantissa, s.exponent + shift, s.dims)
            for s in SYMBOLS.get(word[1:], ())
            if s.prefixed
        ]
    return tuple(found)


def _times(a: Unit, b: Unit, power: int) -> Unit:
    dims = tuple(x + power * y for x, y in zip(a.dims, b.dims, strict=True))
    try:
        mantissa = a.mantissa * b.mantissa**power
    except OverflowError:
        raise _Bad from None
    exponent = a.exponent + power * b.exponent
    if not 10.0**-_LARGEST_SIZE < mantissa < 10.0**_LARGEST_SIZE or abs(exponent) > _LARGEST_SIZE:
        raise _Bad
    return Unit(
        mantissa,
        exponent,
        dims,  # type: ignore[arg-type]
        a.per_molecule or b.per_molecule,
        False,
    )


_ONE: Final = Unit(1.0, 0, (0, 0, 0, 0, 0, 0))


class _Bad(Exception):
    """The text is no unit."""


class _Parser:
    """Recursive descent over one unit; keeps every reading of an ambiguous symbol."""

    def __init__(self, text: str) -> None:
        self.tokens: list[tuple[str, str]] = []
        at = 0
        for match in _TOKEN.finditer(text):
            if text[at : match.start()].strip():
                raise _Bad
            if at < match.start():
                self.tokens.append(("blank", " "))
            self.tokens.append((str(match.lastgroup), match.group()))
            at = match.end()
        if text[at:].strip() or not self.tokens:
            raise _Bad
        self.at = 0

    def peek(self) -> str:
        return self.tokens[self.at][0] if self.at < len(self.tokens) else "end"

    def skip(self, kind: str) -> bool:
        if self.peek() == kind:
            self.at += 1
            return True
        return False

    def product(self, depth: int) -> list[Unit]:
        units = [_ONE]
        sign = 1
        first = True
        while True:
            while self.skip("blank"):
                pass
            kind = self.peek()
            if kind in ("end", "close"):
                if sign < 0:
                    raise _Bad
                return units
            if kind == "divide":
                if sign < 0 or first:
                    raise _Bad
                self.at += 1
                sign = -1
                continue
            if kind == "multiply":
                self.at += 1
                continue
            factors, power = self.factor(depth)
            if sign < 0:
                factors = [
                    Unit(f.mantissa, f.exponent, f.dims, f.per_molecule or counts)
                    for f, counts in zip(factors, self.counts, strict=True)
                ]
            units = [_times(u, f, sign * power) for u in units for f in factors]
            if len(units) > 16:
                raise _Bad
            sign, first = 1, False

    def factor(self, depth: int) -> tuple[list[Unit], int]:
        kind, word = self.tokens[self.at]
        self.at += 1
        if kind == "open":
            if depth > 3:
                raise _Bad
            units = self.product(depth + 1)
            if not self.skip("close"):
                raise _Bad
            self.counts = [False] * len(units)
        elif kind == "symbol":
            readings = _readings(word)
            if not readings:
                raise _Bad
            units = [Unit(s.mantissa, s.exponent, s.dims) for s in readings]
            self.counts = [s.counts for s in readings]
        elif kind == "number":
            value = float(word)
            if not 0 < value < 1e30:
                raise _Bad
            units = [Unit(1.0, 1, _ONE.dims) if value == 10 else Unit(value, 0, _ONE.dims)]
            self.counts = [False]
        else:
            raise _Bad
        power = self.power()
        if power < 0:  # molecule^-1
            units = [
                Unit(u.mantissa, u.exponent, u.dims, u.per_molecule or counts)
                for u, counts in zip(units, self.counts, strict=True)
            ]
        return units, power

    def power(self) -> int:
        marked = self.skip("power")
        bracket = marked and self.skip("open")
        sign = 1
        if self.peek() == "sign":
            sign = -1 if self.tokens[self.at][1] == "-" else 1
            self.at += 1
            marked = True
        if self.peek() == "number":
            word = self.tokens[self.at][1]
            self.at += 1
            if not word.isdecimal() or int(word[:4]) > _LARGEST_EXPONENT:
                raise _Bad
            if bracket and not self.skip("close"):
                raise _Bad
            return sign * int(word)
        if marked:
            raise _Bad
        return 1


@lru_cache(maxsize=512)
def parse_unit(text: str) -> tuple[Unit, ...]:
    """Read a unit as typed; every reading of an ambiguous one, and none when it is no unit.

    Parameters
    ----------
    text : str
        For example `Å²`, `A^2/molecule`, `mN·m⁻¹`, `mN m-1`, `dyn/cm`, `°C`, `10^-3 N/m`.
    """
    if len(text) > _LONGEST:
        return ()
    normal = _normal(text)
    if normal in ("1", "-"):
        return (_ONE,) if normal == "1" else ()
    found = _parsed(normal)
    folded = WHOLE.get(normal.casefold().replace(" ", ""))
    if folded is not None:
        found += tuple(u for u in _parsed(folded) if u not in found)
    if not found and any(mark in text for mark in "ÂÃÅ"):
        found = _unscrambled(text)
    return found


def _unscrambled(text: str) -> tuple[Unit, ...]:
    """Read a unit whose UTF-8 bytes were once taken for a one-byte alphabet (`cmÂ²`)."""
    for codec in ("cp1252", "latin-1"):
        try:
            plain = text.encode(codec).decode("utf-8")
        except UnicodeError:
            continue
        return parse_unit(plain)
    return ()


def _parsed(normal: str) -> tuple[Unit, ...]:
    if len(normal) > 1 and normal.endswith("."):
        normal = normal[:-1]
    if normal == "degC":
        return (Unit(1.0, 0, (0, 0, 0, 1, 0, 0), celsius=True),)
    if normal == "C":  # degrees or coulombs: the dimension asked for decides
        return (
            Unit(1.0, 0, (0, 0, 1, 0, 0, 1)),
            Unit(1.0, 0, (0, 0, 0, 1, 0, 0), celsius=True),
        )
    try:
        parser = _Parser(normal)
        units = parser.product(0)
        if parser.peek() != "end":
            return ()
    except _Bad:
        return ()
    return tuple(dict.fromkeys(units))


def is_unit(text: str) -> bool:
    """Whether `text` reads as a unit of the bench (a bare count or number does not)."""
    return any(any(u.dims) or u.mantissa != 1.0 or u.exponent for u in parse_unit(text))


def _fits(unit: Unit, target: Unit, *, molecular: bool) -> bool:
    if unit.dims == target.dims:
        return True
    # an area or a mass per mole is one per molecule times Avogadro's number
    return molecular and unit.dims == (*target.dims[:4], -1, 0)


def dimension_fits(text: str, dimension: str) -> bool:
    """Whether the unit `text` can express a quantity of kind `dimension` (a key of DIMENSIONS)."""
    molecular = dimension == "molecular_area"
    return any(
        _fits(unit, parse_unit(label)[0], molecular=molecular)
        for unit in parse_unit(text)
        for label in DIMENSIONS[dimension]
    )


def _between(text: str, unit: Unit, label: str, target: Unit) -> Conversion:
    mantissa = unit.mantissa / target.mantissa
    exponent = unit.exponent - target.exponent
    if unit.dims != target.dims:  # per mole to per molecule
        mantissa /= AVOGADRO
    offset = 0.0
    if target.celsius and not unit.celsius:
        offset = -ZERO_CELSIUS
    elif unit.celsius and not target.celsius:
        offset = ZERO_CELSIUS
    return Conversion(text, label, mantissa, exponent, offset)


def conversion(text: str, dimension: str, *, where: str = "") -> Conversion:
    """Find the way from a unit as typed to a fixed unit.

    Parameters
    ----------
    text : str
        The unit as typed.
    dimension : str
        A kind of quantity (key of `unit_symbols.DIMENSIONS`), or any unit to convert to (`"kHz"`).
    where : str
        Named in the error.

    Raises
    ------
    UpstrokeError
        When `text` is no unit, or the unit of something else.
    """
    labels = DIMENSIONS.get(dimension, (dimension,))
    readings = parse_unit(text)
    if not readings:
        raise UpstrokeError(
            f"unknown unit '{text[:_LONGEST]}'", where=where, remedy=_suggestion(text, labels)
        )
    for unit in readings:
        for label in labels:
            for target in parse_unit(label):
                if _fits(unit, target, molecular=dimension == "molecular_area"):
                    return _between(text, unit, label, target)
    if dimension == "molar_mass" and any(u.dims == (0, 1, 0, 0, 0, 0) for u in readings):
        return conversion(f"({text})/mol", dimension, where=where)
    kind = dimension.replace("_", " ") if dimension in DIMENSIONS else labels[0]
    raise UpstrokeError(
        f"'{text}' is not a unit of {kind}", where=where, remedy=f"use {_examples(labels)}"
    )


_EXAMPLES: Final[dict[str, str]] = {
    "mm": "mm, cm, m or µm", "nm": "nm or Å", "cm^2": "cm^2, mm^2 or m^2",
    "nm^2": "nm^2, Å^2 or Å^2/molecule", "mN/m": "mN/m, N/m or dyn/cm", "s": "s, min or h",
    "degC": "degC or K",
    "mV": "mV or V", "µL": "µL or mL", "mg/mL": "mg/mL, g/L, mmol/L or µmol/mL", "g/mol": "g/mol or kDa",
    "1": "%, or no unit", "mm/s": "mm/s or mm/min", "1/s": "1/s or 1/h",
}  # fmt: skip


def _examples(labels: tuple[str, ...]) -> str:
    return _EXAMPLES.get(labels[0], labels[0])


def _suggestion(text: str, labels: tuple[str, ...]) -> str:
    from difflib import get_close_matches

    wanted = _examples(labels)
    known = re.split(r", | or ", wanted)
    close = get_close_matches(_normal(text[:_LONGEST]), known, n=1, cutoff=0.5)
    return f"did you mean {close[0]}? (allowed: {wanted})" if close else f"use {wanted}"
