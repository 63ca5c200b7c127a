"""The usual cautions that a run sheet calls for. They defer to local rules and trained practice.

What is said is general knowledge of the bench (hazard classes as on any safety data sheet), not advice for a
particular place; a substance not recognised is never called harmless.
"""

from __future__ import annotations

import re
from dataclasses import dataclass
from typing import Any, Final

from isotherm.sheet import RunSheet

__all__ = ["Caution", "cautions"]


@dataclass(frozen=True)
class Caution:
    """concerns : "solvent" | "subphase" | "cleaning" | "general". found : the sheet's own words."""

    concerns: str
    found: str
    text: str

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form."""
        return {"concerns": self.concerns, "found": self.found, "text": self.text}


@dataclass(frozen=True)
class _Hazard:
    pattern: re.Pattern[str]
    text: str


def _hazard(pattern: str, text: str, *, exact_case: bool = False) -> _Hazard:
    return _Hazard(re.compile(pattern, 0 if exact_case else re.IGNORECASE), text)


_SOLVENTS: Final = (
    _hazard(
        r"chloroform|chcl3|trichloromethane|dichloromethane|methylene chloride|ch2cl2|dichloroethane|"
        r"tetrachlor|\bdcm\b|perchloro",
        "chlorinated and volatile: harmful to breathe, suspected of causing cancer. Spread under extraction; "
        "thin nitrile gloves let it through in minutes, change them at once when wetted; collect as "
        "halogenated waste.",
    ),
    _hazard(
        r"\bbenzene\b|c6h6",
        "benzene causes cancer: use another solvent if any will do, else only in a hood under your "
        "site's rules.",
    ),
    _hazard(
        r"hexane|heptane|pentane|octane|petrol|toluene|xylene|\bbenzene\b|ether|acetone|ethanol|methanol|"
        r"propanol|(ethyl|butyl|methyl) acetate|tetrahydrofuran|\bthf\b|acetonitrile|dioxane",
        "flammable vapour: no flame, spark or hot plate near the trough; small amounts, good ventilation.",
    ),
    _hazard(
        r"methanol|hexane|toluene|acetonitrile|dioxane",
        "harmful to breathe: extraction, and the exposure limits of its safety data sheet.",
    ),
)
_HEAVY: Final = (
    r"cadmium|\bCd(?=Cl|Br|I|SO|\(|\d|\b|\s|NO|Ac)|lead\b|\bPb(?=Cl|Br|I|SO|\(|\d|\b|\s|NO|Ac)|"
    r"mercur|\bHg|thallium|\bTl(?=Cl|NO|\d|\b)|barium|\bBa(?=Cl|Br|\(|\d|\b|NO|Ac)|uran|\bUO2|"
    r"arsen|\bAs2O|chromium|chromate|\bCr(?=Cl|O|\d)|nickel|\bNi(?=Cl|SO|\(|\d|NO)|"
    r"cobalt|\bCo(?=Cl|SO|\(|NO)|copper|\bCu(?=Cl|SO|\(|\d|NO)|silver|\bAg(?=NO|Cl|\d)|"
    r"zinc|\bZn(?=Cl|SO|\(|\d|NO)|manganese|\bMn(?=Cl|SO|\(|\d|NO)|europium|\bEu(?=Cl|\d)|terbium|\bTbCl|"
    r"gadolin|\bGdCl|yttrium|\bYCl"
)
_ADDITIVES: Final = (
    _hazard(
        _HEAVY,
        "metal salt, poisonous or harmful even in dilute subphases: gloves, no skin contact, no food or open "
        "wounds near; nothing down the drain, collect subphase, rinses and wipes as metal waste; wipe the "
        "bench and the trough's outside.",
        exact_case=False,
    ),
    _hazard(
        r"azide|NaN3",
        "azide is very poisonous, gives off a poisonous gas with acid and forms explosive salts with copper "
        "and lead pipes: never acidify, never down the drain.",
    ),
    _hazard(
        r"permangan|peroxide|H2O2|persulf|perchlor|hypochlor|nitric|HNO3",
        "oxidiser: keep from solvents and paper.",
    ),
    _hazard(
        r"hydrochloric|\bHCl\b|sulfuric|sulphuric|H2SO4|nitric|HNO3|hydroxide|NaOH|KOH|ammonia|NH3|NH4OH|"
        r"acetic|perchloric",
        "acid or alkali: corrosive when concentrated; goggles and gloves when making the stock, acid into "
        "water.",
    ),
    _hazard(
        r"cyanide|KCN|NaCN",
        "cyanide kills: trained people only, never with acid.",
    ),
)
_CLEANING: Final = (
    _hazard(
        r"piranha|caro|peroxymono|(sulfuric|sulphuric|H2SO4).*(peroxide|H2O2)|(peroxide|H2O2).*(sulfuric|"
        r"sulphuric|H2SO4)",
        "acid with peroxide burns flesh and reacts violently, even explosively, with organic matter; it "
        "heats itself and gives off gas: trained people only, small fresh amounts, open vessel in a hood, "
        "full face shield, apron and heavy gloves, no solvent near, never a closed bottle, let it "
        "spend itself before disposal by your site's procedure.",
    ),
    _hazard(
        r"chromic|chromate|dichromate|chromosulfuric|chromosulphuric",
        "chromic acid is corrosive, oxidising and causes cancer: use another way of cleaning if any will do, "
        "else trained people only, in a hood; heavy-metal waste.",
    ),
    _hazard(
        r"RCA|ammoni\w*.*(peroxide|H2O2)|NH4OH.*(peroxide|H2O2)|(hydrochloric|HCl).*(peroxide|H2O2)",
        "hot peroxide bath: corrosive, gives off gas; hood, face shield, heavy gloves, open vessel, no "
        "solvents near.",
    ),
    _hazard(
        r"hydrofluoric|\bHF\b|fluoride|buffered oxide|\bBOE\b",
        "hydrofluoric acid and acid fluorides poison through the skin, often without pain at first: trained "
        "people only, never alone, antidote gel at hand.",
    ),
    _hazard(
        r"nitric|HNO3|aqua regia|perchloric|peroxide|H2O2|persulf|permangan|nochrom",
        "oxidising bath: burns, and reacts violently with solvents: hood, face shield, heavy gloves, rinse "
        "all solvent off first, open vessel.",
    ),
    _hazard(
        r"potassium hydroxide|sodium hydroxide|\bKOH\b|\bNaOH\b|base bath|caustic",
        "caustic bath: blinds and burns (with alcohol it also burns with a flame): goggles, heavy gloves.",
    ),
    _hazard(
        r"sulfuric|sulphuric|H2SO4|hydrochloric|\bHCl\b",
        "strong acid: goggles, gloves, acid into water.",
    ),
    _hazard(
        r"ozone|\bUV\b|ultraviolet",
        "ozone harms lungs and the lamp harms eyes: exhaust on, do not defeat the interlock, wait before "
        "opening.",
    ),
    _hazard(
        r"plasma",
        "plasma cleaner: vacuum, radio frequency and reactive gas; by its own instructions.",
    ),
)
_GENERAL: Final = Caution(
    "general",
    "",
    "These are the usual cautions, not a risk assessment: your local rules, the safety data sheets and "
    "people trained in the work go before anything said here.",
)


def cautions(sheet: RunSheet) -> tuple[Caution, ...]:
    """Collect the cautions that a sheet's solvent, subphase and cleaning call for.

    Parameters
    ----------
    sheet : RunSheet

    Returns
    -------
    tuple of Caution
        Always ends with the one that local rules and trained practice come first.
    """
    found = [*_solvent(sheet)]
    for additive in sheet.subphase.additives:
        found.extend(_matches("subphase", additive, _ADDITIVES))
    if sheet.subphase.liquid.strip().lower() not in ("", "water"):
        found.extend(_matches("subphase", sheet.subphase.liquid, (*_ADDITIVES, *_SOLVENTS)))
    if sheet.substrate is not None and sheet.substrate.cleaning:
        found.extend(_matches("cleaning", sheet.substrate.cleaning, _CLEANING))
    return (*found, _GENERAL)


def _solvent(sheet: RunSheet) -> list[Caution]:
    solvent = sheet.film.solvent
    if not solvent:
        if sheet.film.volume is None and sheet.film.concentration is None:
            return []
        text = (
            "spreading solvents are volatile, and many are toxic or flammable; the sheet does not name it: "
            "work under extraction by its safety data sheet."
        )
        return [Caution("solvent", "not named", text)]
    matches = _matches("solvent", solvent, _SOLVENTS)
    if matches:
        return matches
    text = "volatile spreading solvent: work under extraction, by its safety data sheet."
    return [Caution("solvent", solvent, text)]


def _matches(concerns: str, words: str, hazards: tuple[_Hazard, ...]) -> list[Caution]:
    return [Caution(concerns, words, h.text) for h in hazards if h.pattern.search(words)]
