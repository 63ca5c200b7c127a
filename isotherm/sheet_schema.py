"""Every key a run sheet may hold, in one table: kind, allowed range, what it means, an example.

The reader of sheets, its errors and the commented sheet that `upstroke sheet` writes are all made from it.
A key's `name` is the field of the dataclass in `isotherm.sheet` it fills.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Final, Literal

__all__ = ["ROLES", "SECTIONS", "TITLE", "Key", "Section"]

Kind = Literal["quantity", "text", "texts", "number", "integer", "choice", "range", "flag"]

# Column roles, as the interface contract names them.
ROLES: Final = (
    "time", "area", "molecular_area", "barrier_position", "pressure", "tension", "temperature",
    "dipper_position", "potential",
)  # fmt: skip


@dataclass(frozen=True)
class Key:
    """One key. `low` and `high` bound the value in the fixed unit; `above` excludes `low` itself."""

    name: str
    kind: Kind
    meaning: str
    example: str
    dimension: str = ""
    low: float = -math.inf
    high: float = math.inf
    above: bool = False
    choices: tuple[str, ...] = ()
    required: bool = False
    shown: bool = True


@dataclass(frozen=True)
class Section:
    """One table of the sheet; `many` for an array of tables. `path` is dotted, as TOML has it."""

    path: str
    meaning: str
    keys: tuple[Key, ...]
    many: bool = False
    cautions: tuple[str, ...] = ()


def _positive(
    name: str,
    dimension: str,
    meaning: str,
    example: str,
    *,
    high: float = math.inf,
    required: bool = False,
) -> Key:
    return Key(
        name,
        "quantity",
        meaning,
        f'"{example}"',
        dimension,
        0.0,
        high,
        above=True,
        required=required,
    )


def _allowed(name: str, meaning: str, example: str) -> Key:
    return _positive(name, "pressure", f"largest allowed, {meaning}", example, high=100.0)


def _reading(name: str, meaning: str, example: str) -> Key:
    return Key(name, "quantity", meaning, f'"{example}"', "pressure", -1000.0, 1000.0)


def _text(name: str, meaning: str, example: str, *, required: bool = False) -> Key:
    return Key(name, "text", meaning, f'"{example}"', required=required)


def _choice(name: str, meaning: str, choices: tuple[str, ...]) -> Key:
    return Key(name, "choice", meaning, f'"{choices[0]}"', choices=choices)


TITLE: Final = _text("title", "what this run is; printed on tables and figures", "Film A, run 3")

# Bounds are physical (nothing below zero, no fraction above one) or so wide that only a slip crosses
# them; they are not advice.
_MOLAR_MASS: Final = _positive("molar_mass", "molar_mass", "molar mass", "284.48 g/mol", high=1e8)
_PERMITTIVITY: Final = _positive(
    "permittivity", "fraction", "relative permittivity of the film", "2.6 ± 0.1", high=1e4
)
_ABSORPTIVITY: Final = _positive(
    "absorptivity",
    "L/mol/cm",
    "molar, decadic, at the wavelength measured",
    "12000 L/(mol·cm)",
    high=1e9,
)

SECTIONS: Final[tuple[Section, ...]] = (
    Section(
        "film",
        "What was spread. Needed where the export gives trough area, not area per molecule.",
        (
            _text("name", "the amphiphile", "octadecanoic acid"),
            _MOLAR_MASS,
            _positive(
                "concentration",
                "concentration",
                "of the spreading solution; mass or amount per volume",
                "1.00 ± 0.01 mg/mL",
            ),
            _positive("volume", "volume", "spread on the surface", "50 ± 0.5 µL"),
            _positive(
                "purity",
                "fraction",
                "part of the weighed solid that is amphiphile",
                "99 ± 0.5 %",
                high=1.0,
            ),
            _text("solvent", "the spreading solvent", "chloroform"),
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
            _text("name", "the amphiphile", "octadecanoic acid", required=True),
            _positive("molar_mass", "molar_mass", "molar mass", "284.48 g/mol", high=1e8),
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
            _text("liquid", "water, or what else it is", "water"),
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
            _positive("smallest_area", "area", "with the barriers closed", "60 cm^2", high=1e6),
            _positive("largest_area", "area", "with the barriers open", "240 cm^2", high=1e6),
            _positive(
                "area_uncertainty",
                "area",
                "standard uncertainty of the trough area",
                "0.3 cm^2",
                high=1e4,
            ),
            _positive(
                "pressure_uncertainty",
                "pressure",
                "standard uncertainty of the pressure scale",
                "0.1 mN/m",
                high=100.0,
            ),
            _positive(
                "width",
                "length",
                "between side walls; only for barrier positions",
                "75 mm",
                high=1e5,
            ),
        ),
    ),
    Section(
        "substrate",
        "What is dipped.",
        (
            _choice(
                "shape",
                "plate, rod, or table (with substrate.profile)",
                ("plate", "rod", "table"),
            ),
            _positive("width", "length", "plate", "20.0 ± 0.1 mm", high=1e5),
            _positive("thickness", "length", "plate or table", "1.00 ± 0.02 mm", high=1e5),
            _positive("diameter", "length", "rod", "3.00 ± 0.01 mm", high=1e5),
            _positive("height", "length", "from the lower edge to the top", "40 mm", high=1e5),
            Key("wetting", "flag", "whether the bare substrate is wetted by the subphase", "true"),
            _text("material", "", "silicon"),
            _text("cleaning", "how it was cleaned", "water, then ethanol"),
        ),
        cautions=(
            "Oxidising baths (acid with peroxide, chromic acid) burn, and may explode with organics: trained",
            "people only, small volumes, in a hood, with shield and gloves, by your site's procedure.",
        ),
    ),
    Section(
        "substrate.profile",
        "A substrate of free shape: its width at some heights above the lower edge, straight between them.",
        (
            Key(
                "height",
                "quantity",
                "above the lower edge",
                '"0 mm"',
                "length",
                0.0,
                1e5,
                required=True,
            ),
            Key("width", "quantity", "there", '"18 mm"', "length", 0.0, 1e5, required=True),
        ),
        many=True,
    ),
    Section(
        "dipping",
        "How it is dipped.",
        (
            Key(
                "pressure",
                "quantity",
                "held while dipping",
                '"30 mN/m"',
                "pressure",
                0.0,
                200.0,
                above=True,
            ),
            _positive(
                "tolerance",
                "pressure",
                "of the pressure controller, standard uncertainty",
                "0.2 mN/m",
                high=50.0,
            ),
            _positive(
                "overshoot",
                "pressure",
                "of the controller when a stroke begins",
                "0.5 mN/m",
                high=100.0,
            ),
            _choice(
                "position_reads",
                "depth: grows going down; height: grows going up",
                ("depth", "height"),
            ),
            Key(
                "surface_at",
                "quantity",
                "reading at which the lower edge touches the surface",
                '"12.40 ± 0.05 mm"',
                "length",
                -1e5,
                1e5,
            ),
            _positive(
                "modulus",
                "pressure",
                "of the film there; else an isotherm or the dwells tell",
                "180 mN/m",
                high=1e5,
            ),
            _positive(
                "stroke_length",
                "length",
                "substrate length that crosses the surface",
                "25 mm",
                high=1e5,
            ),
            _positive("speed", "speed", "of the substrate", "5 mm/min", high=1e4),
            _positive(
                "speed_tolerance", "speed", "allowed departure from it", "0.2 mm/min", high=1e4
            ),
            Key("dwell_top", "quantity", "wait above the surface", '"60 s"', "time", 0.0, 1e9),
            Key("dwell_bottom", "quantity", "wait below the surface", '"10 s"', "time", 0.0, 1e9),
        ),
    ),
    Section(
        "stack",
        "The multilayer as designed.",
        (
            Key("layers", "integer", "how many", "20", low=1, high=1e6),
            _choice(
                "type",
                "X: down only; Z: up only; Y: both; XY: both, unequal",
                ("Y", "X", "Z", "XY"),
            ),
            _choice("first_stroke", "the first that deposits", ("up", "down")),
            Key(
                "accept",
                "range",
                "transfer ratio allowed for a stroke",
                "[0.95, 1.05]",
                low=-10.0,
                high=10.0,
            ),
            Key(
                "accept_mean",
                "range",
                "transfer ratio allowed on average",
                "[0.97, 1.03]",
                low=-10.0,
                high=10.0,
            ),
            _positive("layer_thickness", "thickness", "of one layer", "2.5 ± 0.05 nm", high=1e6),
            _positive(
                "thickness_tolerance",
                "thickness",
                "allowed error of the whole stack",
                "2 nm",
                high=1e9,
            ),
            Key(
                "drift_limit",
                "number",
                "largest slope of the transfer ratio per stroke",
                "0.002",
                low=0.0,
                high=10.0,
                above=True,
            ),
            Key("renewals", "integer", "how often the film may be renewed", "1", low=0, high=1e6),
            _positive(
                "area_in_film",
                "molecular_area",
                "per molecule on the substrate, where it differs from that on water",
                "0.182 nm^2",
                high=1e6,
            ),
            _PERMITTIVITY,
            _ABSORPTIVITY,
            _positive(
                "crystal_frequency", "Hz", "of a quartz resonator coated along", "5 MHz", high=1e10
            ),
        ),
    ),
    Section(
        "stack.film",
        "Alternating films: one table for each.",
        (
            _text("name", "", "octadecanoic acid", required=True),
            _choice("strokes", "which strokes lay it down", ("both", "down", "up")),
            _positive("layer_thickness", "thickness", "of one layer", "2.5 ± 0.05 nm", high=1e6),
            _MOLAR_MASS,
            _positive(
                "molecular_area", "molecular_area", "at the dipping pressure", "0.20 nm^2", high=1e6
            ),
            _PERMITTIVITY,
            _ABSORPTIVITY,
        ),
        many=True,
    ),
    Section(
        "target",
        "What is wanted of the dipping pressure.",
        (
            _text("phase", "phase to dip in", "liquid-condensed"),
            _positive(
                "collapse_margin", "pressure", "to keep below collapse", "5 mN/m", high=200.0
            ),
            _positive(
                "guard_band", "pressure", "to keep from any transition", "2 mN/m", high=200.0
            ),
            _positive(
                "packing_error", "fraction", "largest error of area per molecule", "0.5 %", high=1.0
            ),
            _positive(
                "loss", "fraction", "largest part of the film lost while dipping", "5 %", high=1.0
            ),
            Key("renewals", "integer", "how often the film may be renewed", "0", low=0, high=1e6),
        ),
    ),
    Section(
        "check",
        "Before a film is spread: what is allowed, and what was read on plate and probe.",
        (
            _allowed("pressure_rise", "of the bare surface as it is closed", "0.2 mN/m"),
            _allowed("zero", "reading of the clean surface", "1 mN/m"),
            _allowed("drift_per_hour", "of the probe in one hour", "0.5 mN/m"),
            _allowed("tension_tolerance", "clean subphase against pure water", "0.5 mN/m"),
            _positive("force", "mN", "pull of the clean subphase on the plate", "2.93 ± 0.01 mN"),
            _positive("perimeter", "length", "wetted, of the plate", "40.2 ± 0.1 mm", high=1e5),
            Key("contact_angle", "quantity", "degrees", '"0 ± 3"', "fraction", 0.0, 89.9),
            _reading("low_reading", "probe at a first known point", "0.02 mN/m"),
            _reading("low_true", "what it should read there", "0 mN/m"),
            _reading("high_reading", "probe at a second known point", "72.4 ± 0.1 mN/m"),
            _reading("high_true", "what it should read there", "72.7 ± 0.1 mN/m"),
            _positive("gain_tolerance", "fraction", "of the probe's scale", "1 %", high=1.0),
            _positive(
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
            _text("header", "its header as the export has it, or instead:", "Pi 2 (mN/m)"),
            Key("index", "integer", "its place, the first column is 1", "3", low=1, high=1e5),
            _text("unit", "needed where the header does not tell it", "mN/m"),
        ),
        many=True,
    ),
)
