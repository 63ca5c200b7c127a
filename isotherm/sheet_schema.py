"""Every key a run sheet may hold, in one table: kind, allowed range, what it means, an example.

The reader of sheets, its errors and the commented sheet that `upstroke sheet` writes are all made from it.
A key's `name` is the field of the dataclass in `isotherm.sheet` it fills.
"""

from __future__ import annotations

from typing import Final

from isotherm.sheet_key import (
    MOLAR_MASS,
    Key,
    Section,
    allowed_key,
    positive_key,
    reading_key,
    text_key,
)
from isotherm.sheet_schema_build import BUILD_SECTIONS

__all__ = ["ROLES", "SECTIONS", "TITLE", "Key", "Section"]

# Column roles, as the interface contract names them.
ROLES: Final = (
    "time", "area", "molecular_area", "barrier_position", "pressure", "tension", "temperature",
    "dipper_position", "potential",
)  # fmt: skip

TITLE: Final = text_key("title", "what this run is; printed on tables and figures", "Film A, run 3")

# Bounds are physical (nothing below zero, no fraction above one) or so wide that only a slip crosses
# them; they are not advice.
SECTIONS: Final[tuple[Section, ...]] = (
    Section(
        "film",
        "What was spread. Needed where the export gives trough area, not area per molecule.",
        (
            text_key("name", "the amphiphile", "octadecanoic acid"),
            MOLAR_MASS,
            positive_key(
                "concentration",
                "concentration",
                "of the spreading solution; mass or amount per volume",
                "1.00 ± 0.01 mg/mL",
            ),
            positive_key("volume", "volume", "spread on the surface", "50 ± 0.5 µL"),
            positive_key(
                "purity",
                "fraction",
                "part of the weighed solid that is amphiphile",
                "99 ± 0.5 %",
                high=1.0,
            ),
            text_key("solvent", "the spreading solvent", "chloroform"),
        ),
        cautions=(
            "Spreading solvents are volatile, and many are toxic or flammable. Work under extraction with",
            "suitable gloves, by the safety data sheet and your site's rules.",
        ),
    ),
    Section(
        "film.component",
        "A mixture: one table for each amphiphile, in place of film.name and film.molar_mass.",
        (
            text_key("name", "the amphiphile", "octadecanoic acid", required=True),
            positive_key("molar_mass", "molar_mass", "molar mass", "284.48 g/mol", high=1e8),
            Key(
                "mole_fraction",
                "quantity",
                "all of them add up to 1",
                "0.50",
                "fraction",
                0.0,
                1.0,
                above=True,
                required=True,
            ),
        ),
        many=True,
    ),
    Section(
        "subphase",
        "The liquid below the film.",
        (
            text_key("liquid", "water, or what else it is", "water"),
            Key(
                "temperature",
                "quantity",
                "of the subphase",
                '"20.0 ± 0.2 degC"',
                "temperature",
                -50.0,
                150.0,
            ),
            Key(
                "tension",
                "quantity",
                "clean, as measured; else that of pure water",
                '"72.7 ± 0.1 mN/m"',
                "pressure",
                1.0,
                1000.0,
            ),
            Key("additives", "texts", "salts, buffers", '["0.2 mmol/L CdCl2"]'),
            Key("ph", "quantity", "pH", "5.6", "fraction", -2.0, 16.0),
        ),
        cautions=(
            "Cadmium, lead and other heavy-metal salts are poisonous: gloves, no skin contact, nothing down",
            "the drain; collect the subphase as hazardous waste under your local rules.",
        ),
    ),
    Section(
        "trough",
        "The instrument.",
        (
            positive_key("smallest_area", "area", "with the barriers closed", "60 cm^2", high=1e6),
            positive_key("largest_area", "area", "with the barriers open", "240 cm^2", high=1e6),
            positive_key(
                "area_uncertainty",
                "area",
                "standard uncertainty of the trough area",
                "0.3 cm^2",
                high=1e4,
            ),
            positive_key(
                "pressure_uncertainty",
                "pressure",
                "standard uncertainty of the pressure scale",
                "0.1 mN/m",
                high=100.0,
            ),
            positive_key(
                "width",
                "length",
                "between side walls; only for barrier positions",
                "75 mm",
                high=1e5,
            ),
        ),
    ),
    *BUILD_SECTIONS,
    Section(
        "check",
        "Before a film is spread: what is allowed, and what was read on plate and probe.",
        (
            allowed_key("pressure_rise", "of the bare surface as it is closed", "0.2 mN/m"),
            allowed_key("zero", "reading of the clean surface", "1 mN/m"),
            allowed_key("drift_per_hour", "of the probe in one hour", "0.5 mN/m"),
            allowed_key("tension_tolerance", "clean subphase against pure water", "0.5 mN/m"),
            positive_key(
                "force", "mN", "pull of the clean subphase on the plate", "2.93 ± 0.01 mN"
            ),
            positive_key("perimeter", "length", "wetted, of the plate", "40.2 ± 0.1 mm", high=1e5),
            Key("contact_angle", "quantity", "degrees", '"0 ± 3"', "fraction", 0.0, 89.9),
            reading_key("low_reading", "probe at a first known point", "0.02 mN/m"),
            reading_key("low_true", "what it should read there", "0 mN/m"),
            reading_key("high_reading", "probe at a second known point", "72.4 ± 0.1 mN/m"),
            reading_key("high_true", "what it should read there", "72.7 ± 0.1 mN/m"),
            positive_key("gain_tolerance", "fraction", "of the probe's scale", "1 %", high=1.0),
            positive_key(
                "linearity_tolerance",
                "fraction",
                "area against barriers, of its range",
                "0.5 %",
                high=1.0,
            ),
        ),
    ),
    Section(
        "columns",
        "What a column of the export is, where the reader cannot tell or to overrule it.",
        (
            Key("role", "choice", "", '"pressure"', choices=ROLES, required=True),
            text_key("header", "its header as the export has it, or instead:", "Pi 2 (mN/m)"),
            Key("index", "integer", "its place, the first column is 1", "3", low=1, high=1e5),
            text_key("unit", "needed where the header does not tell it", "mN/m"),
        ),
        many=True,
    ),
)
