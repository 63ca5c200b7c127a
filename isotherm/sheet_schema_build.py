"""The keys of a run sheet that tell of a build: substrate, dipping, stack and the pressure wanted."""

from __future__ import annotations

from typing import Final

from isotherm.sheet_key import MOLAR_MASS, Key, Section, choice_key, positive_key, text_key

__all__ = ["BUILD_SECTIONS"]

_PERMITTIVITY: Final = positive_key(
    "permittivity", "fraction", "relative permittivity of the film", "2.6 ± 0.1", high=1e4
)
_ABSORPTIVITY: Final = positive_key(
    "absorptivity",
    "L/mol/cm",
    "molar, decadic, at the wavelength measured",
    "12000 L/(mol·cm)",
    high=1e9,
)

BUILD_SECTIONS: Final[tuple[Section, ...]] = (
    Section(
        "substrate",
        "What is dipped.",
        (
            choice_key(
                "shape",
                "plate, rod, or table (with substrate.profile)",
                ("plate", "rod", "table"),
            ),
            positive_key("width", "length", "plate", "20.0 ± 0.1 mm", high=1e5),
            positive_key("thickness", "length", "plate or table", "1.00 ± 0.02 mm", high=1e5),
            positive_key("diameter", "length", "rod", "3.00 ± 0.01 mm", high=1e5),
            positive_key("height", "length", "from the lower edge to the top", "40 mm", high=1e5),
            Key("wetting", "flag", "whether the bare substrate is wetted by the subphase", "true"),
            text_key("material", "", "silicon"),
            text_key("cleaning", "how it was cleaned", "water, then ethanol"),
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
            positive_key(
                "tolerance",
                "pressure",
                "of the pressure controller, standard uncertainty",
                "0.2 mN/m",
                high=50.0,
            ),
            positive_key(
                "overshoot",
                "pressure",
                "of the controller when a stroke begins",
                "0.5 mN/m",
                high=100.0,
            ),
            choice_key(
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
            positive_key(
                "modulus",
                "pressure",
                "of the film there; else an isotherm or the dwells tell",
                "180 mN/m",
                high=1e5,
            ),
            positive_key(
                "stroke_length",
                "length",
                "substrate length that crosses the surface",
                "25 mm",
                high=1e5,
            ),
            positive_key("speed", "speed", "of the substrate", "5 mm/min", high=1e4),
            positive_key(
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
            choice_key(
                "type",
                "X: down only; Z: up only; Y: both; XY: both, unequal",
                ("Y", "X", "Z", "XY"),
            ),
            choice_key("first_stroke", "the first that deposits", ("up", "down")),
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
            positive_key("layer_thickness", "thickness", "of one layer", "2.5 ± 0.05 nm", high=1e6),
            positive_key(
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
            positive_key(
                "area_in_film",
                "molecular_area",
                "per molecule on the substrate, where it differs from that on water",
                "0.182 nm^2",
                high=1e6,
            ),
            _PERMITTIVITY,
            _ABSORPTIVITY,
            positive_key(
                "crystal_frequency", "Hz", "of a quartz resonator coated along", "5 MHz", high=1e10
            ),
        ),
    ),
    Section(
        "stack.film",
        "Alternating films: one table for each.",
        (
            text_key("name", "", "octadecanoic acid", required=True),
            choice_key("strokes", "which strokes lay it down", ("both", "down", "up")),
            positive_key("layer_thickness", "thickness", "of one layer", "2.5 ± 0.05 nm", high=1e6),
            MOLAR_MASS,
            positive_key(
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
            text_key("phase", "phase to dip in", "liquid-condensed"),
            positive_key(
                "collapse_margin", "pressure", "to keep below collapse", "5 mN/m", high=200.0
            ),
            positive_key(
                "guard_band", "pressure", "to keep from any transition", "2 mN/m", high=200.0
            ),
            positive_key(
                "packing_error", "fraction", "largest error of area per molecule", "0.5 %", high=1.0
            ),
            positive_key(
                "loss", "fraction", "largest part of the film lost while dipping", "5 %", high=1.0
            ),
            Key("renewals", "integer", "how often the film may be renewed", "0", low=0, high=1e6),
        ),
    ),
)
