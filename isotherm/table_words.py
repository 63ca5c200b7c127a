"""The words by which trough exports name their columns, in the languages of the trade."""

from __future__ import annotations

import re
import unicodedata
from functools import lru_cache
from typing import Final

from isotherm.units import dimension_fits, parse_unit

__all__ = ["ROLE_DIMENSION", "is_derived", "plain_words", "roles_of"]

ROLE_DIMENSION: Final[dict[str, str]] = {
    "time": "time",
    "area": "area",
    "molecular_area": "molecular_area",
    "barrier_position": "length",
    "pressure": "pressure",
    "tension": "pressure",
    "temperature": "temperature",
    "dipper_position": "length",
    "potential": "potential",
}

# Whole phrases, as `plain_words` folds them. Order matters: the first role with a phrase in the name
# takes it, so that "surface pressure" is not taken for a surface, nor "area per molecule" for an area.
_PHRASES: Final[tuple[tuple[str, tuple[str, ...]], ...]] = (
    ("molecular_area", (
        "area per molecule", "area molecule", "molecular area", "mean molecular area", "mma",
        "apl", "apm", "area per lipid", "area lipid", "area per residue", "area per monomer",
        "area per amphiphile", "specific area", "molekulflache", "molekuelflaeche",
        "molekularflache", "flache pro molekul", "flaeche pro molekuel", "flache je molekul",
        "flache molekul", "platzbedarf", "aire moleculaire", "aire par molecule", "aire molecule",
        "surface par molecule", "surface moleculaire", "area molecular", "area por molecula",
        "area molecula", "area molecolare", "area per molecola", "molar area",
    )),
    ("pressure", (
        "surface pressure", "film pressure", "lateral pressure", "spreading pressure", "pressure",
        "press", "pres", "surfpress", "surf press", "surf pres", "surfpres", "oberflachendruck",
        "oberflaechendruck", "filmdruck", "lateraldruck", "spreitungsdruck", "druck", "pression",
        "presion", "pressione", "pressao", "pi",
    )),
    ("tension", (
        "surface tension", "interfacial tension", "tension", "surf tens", "oberflachenspannung",
        "oberflaechenspannung", "grenzflachenspannung", "tension superficielle",
        "tension superficial", "tensione", "tensao", "gamma",
    )),
    ("potential", (
        "surface potential", "volta potential", "contact potential", "potential",
        "oberflachenpotential", "oberflachenpotenzial", "potenzial", "potentiel", "potencial",
        "potenziale", "delta v", "deltav", "dv", "d v",
    )),
    ("temperature", (
        "temperature", "temp", "temperatur", "temperatura", "subphase temperature",
        "wassertemperatur",
    )),
    ("dipper_position", (
        "dipper position", "dipper", "dipper depth", "dip position", "dipping position",
        "substrate position", "sample position", "immersion depth", "immersion", "dip depth",
        "substrate", "eintauchtiefe", "tauchtiefe", "tauchposition", "substratposition",
        "hubposition", "depth", "tiefe", "profondeur", "profundidad", "profondita", "substrat",
        "lift position", "elevator position", "elevator",
    )),
    ("barrier_position", (
        "barrier position", "barrier", "barriers", "barrier pos", "barrier separation",
        "barrier distance", "barriere", "barrierenposition", "barriereposition", "schranke",
        "schrankenposition", "barrera", "barreras", "barriera", "barrieres",
    )),
    ("area", (
        "trough area", "film area", "surface area", "total area", "area", "flache", "flaeche",
        "filmflache", "trogflache", "gesamtflache", "aire", "surface", "superficie", "areas",
    )),
    ("time", (
        "time", "elapsed time", "elapsed", "zeit", "messzeit", "laufzeit", "temps", "tiempo",
        "tempo", "timestamp", "time stamp", "datetime", "date time", "uhrzeit", "heure", "hora",
        "clock", "duration", "dauer",
    )),
)  # fmt: skip

# Words that make a column something derived from or about the quantity, not its reading.
_EXCLUDING_WORDS: Final = (
    "speed rate velocity velocidad vitesse geschwindigkeit target setpoint set point soll "
    "sollwert consigne consigna std sd stdev stddev deviation error err uncertainty unc noise "
    "change modulus compressibility elasticity derivative slope ratio relative difference "
    "diff air room ambient raumtemperatur lufttemperatur humidity alarm limit max min maximum "
    "minimum maximal minimal count cycle cycles status state mode flag percent remaining "
    "tolerance gain offset wanted desired reference ref step "
)
_EXCLUDING: Final = frozenset(_EXCLUDING_WORDS.split())
# Symbols alone, told apart by unit (and capital for T): they need a unit that fits.
_SYMBOLS: Final[dict[str, tuple[str, ...]]] = {
    "a": ("molecular_area", "area"),
    "am": ("molecular_area",),
    "p": ("pressure",),
    "sp": ("pressure",),
    "st": ("tension",),
    "ift": ("tension",),
    "sigma": ("tension",),
    "t": ("time", "temperature"),
    "v": ("potential",),
    "u": ("potential",),
    "x": ("barrier_position",),
}
_POSITION: Final = frozenset(
    {"position", "pos", "posicion", "posizione", "height", "hohe", "hoehe", "stage", "z"}
)
_GREEK: Final = {
    "π": " pi ",
    "γ": " gamma ",
    "δ": " delta ",
    "σ": " sigma ",
    "θ": " theta ",
    "∆": " delta ",
}


@lru_cache(maxsize=512)
def plain_words(name: str) -> str:
    """Fold a name to plain lower-case words: accents off, Greek spelled, camel case and signs split."""
    name = re.sub(r"(?<=[a-zäöüé])(?=[A-Z])", " ", name[:120])
    name = unicodedata.normalize("NFKD", name).casefold()
    name = "".join(c for c in name if not unicodedata.combining(c))
    for sign, word in _GREEK.items():
        name = name.replace(sign, word)
    return " ".join(re.findall(r"[^\W\d_]+", name))


def is_derived(name: str) -> bool:
    """Whether a name is of something about a quantity (its target, rate, scatter), not of its readings."""
    return not _EXCLUDING.isdisjoint(plain_words(name).split())


def roles_of(name: str, unit: str | None) -> tuple[str, ...]:
    """Roles a column of this name may play; only those its unit can express when it has one that is known.

    Parameters
    ----------
    name : str
        The header without its unit.
    unit : str or None
        The unit as typed.
    """
    roles = _by_name(name)
    if unit is None or not parse_unit(unit):
        # a symbol alone tells nothing without a unit
        return () if plain_words(name) in _SYMBOLS else roles
    if not roles and not plain_words(name):
        roles = _by_unit(unit)
    fitting = tuple(role for role in roles if dimension_fits(unit, ROLE_DIMENSION[role]))
    if "area" in fitting or "molecular_area" in fitting:
        return _area_kind(fitting, name, unit)
    return fitting


def _by_name(name: str) -> tuple[str, ...]:
    words = plain_words(name)
    if words in _SYMBOLS:
        return _SYMBOLS[words]
    tokens = words.split()
    if not tokens or is_derived(name):
        return ()
    if "delta" in tokens and tokens[-1:] != ["v"]:
        return ()  # a change of something, of which only the potential is recorded as one
    padded = f" {words} "
    for role, phrases in _PHRASES:
        if any(f" {phrase} " in padded for phrase in phrases):
            if role == "tension" and "tension" in tokens and "potential" not in tokens:
                return ("tension", "potential")  # French for voltage: the unit decides
            return (role,)
    if _POSITION.intersection(tokens):
        return ("barrier_position", "dipper_position")
    return ()


def _by_unit(unit: str) -> tuple[str, ...]:
    """A header that is nothing but a unit."""
    if unit.strip() in ("A", "C", "m", "K", "V"):
        return ()
    for role in ("time", "temperature", "molecular_area", "potential"):
        if dimension_fits(unit, ROLE_DIMENSION[role]):
            return (role,)
    if dimension_fits(unit, "pressure"):
        return ("pressure", "tension")
    if dimension_fits(unit, "length"):
        return ("barrier_position", "dipper_position")
    return ()


def _area_kind(roles: tuple[str, ...], name: str, unit: str) -> tuple[str, ...]:
    """Trough area or area per molecule: by name, else by the size of the unit."""
    if roles == ("molecular_area",) and plain_words(name) not in ("", "a"):
        return roles
    units = [u for u in parse_unit(unit) if u.dims[:4] == (2, 0, 0, 0)]
    # units below a square micrometre measure molecules, all others troughs
    molecular = any(u.per_molecule or u.dims[4] or u.exponent < -12 for u in units)
    return ("molecular_area",) if molecular else ("area",)
