"""The run sheet as typed data: what the user says about film, trough, substrate and design."""

from __future__ import annotations

from dataclasses import dataclass, field

from isotherm.quantity import Quantity

__all__ = [
    "Check",
    "ColumnHint",
    "Component",
    "Dipping",
    "Film",
    "ProfilePoint",
    "RunSheet",
    "Stack",
    "StackFilm",
    "Subphase",
    "Substrate",
    "Target",
    "Trough",
]


@dataclass(frozen=True)
class Component:
    """One amphiphile of the film: molar mass in g/mol, mole fraction (1 for a pure film)."""

    name: str
    molar_mass: Quantity | None
    mole_fraction: Quantity


@dataclass(frozen=True)
class Film:
    """What was spread. concentration in mg/mL or mmol/L (its unit says which), volume in µL."""

    name: str = ""
    components: tuple[Component, ...] = ()
    concentration: Quantity | None = None
    volume: Quantity | None = None
    purity: Quantity | None = None
    solvent: str = ""


@dataclass(frozen=True)
class Subphase:
    """Liquid under the film. temperature in degC, tension (clean subphase, measured) in mN/m."""

    liquid: str = "water"
    temperature: Quantity | None = None
    tension: Quantity | None = None
    additives: tuple[str, ...] = ()
    ph: Quantity | None = None


@dataclass(frozen=True)
class Trough:
    """The trough. Areas in cm^2, width in mm, pressure_uncertainty (standard) in mN/m."""

    smallest_area: Quantity | None = None
    largest_area: Quantity | None = None
    area_uncertainty: Quantity | None = None
    pressure_uncertainty: Quantity | None = None
    width: Quantity | None = None


@dataclass(frozen=True)
class ProfilePoint:
    """Width (mm) of a substrate of free shape at a height (mm) above its lower edge."""

    height: float
    width: float


@dataclass(frozen=True)
class Substrate:
    """What is dipped: plate (width, thickness), rod (diameter) or table (profile + thickness), mm."""

    shape: str = "plate"
    width: Quantity | None = None
    thickness: Quantity | None = None
    diameter: Quantity | None = None
    height: Quantity | None = None
    profile: tuple[ProfilePoint, ...] = ()
    wetting: bool | None = None
    material: str = ""
    cleaning: str = ""


@dataclass(frozen=True)
class Dipping:
    """How it is dipped. Pressures mN/m, lengths mm, speed mm/s, dwell times s."""

    pressure: Quantity | None = None
    tolerance: Quantity | None = None
    overshoot: Quantity | None = None
    position_reads: str | None = None  # "depth" | "height"
    surface_at: Quantity | None = None
    modulus: Quantity | None = None
    stroke_length: Quantity | None = None
    speed: Quantity | None = None
    speed_tolerance: Quantity | None = None
    dwell_top: Quantity | None = None
    dwell_bottom: Quantity | None = None


@dataclass(frozen=True)
class StackFilm:
    """One of several alternating films: which strokes lay it down, and its own layer numbers."""

    name: str
    strokes: str = "both"  # "down" | "up" | "both"
    layer_thickness: Quantity | None = None  # nm
    molar_mass: Quantity | None = None  # g/mol
    molecular_area: Quantity | None = None  # nm^2, at the dipping pressure
    permittivity: Quantity | None = None  # 1, relative
    absorptivity: Quantity | None = None  # L/mol/cm, decadic


@dataclass(frozen=True)
class Stack:
    """The design of the multilayer."""

    layers: int | None = None
    type: str | None = None  # "X" | "Y" | "Z" | "XY"
    first_stroke: str | None = None  # "down" | "up"
    accept: tuple[float, float] = (0.95, 1.05)  # common practice per stroke, no single source
    accept_given: bool = False
    accept_mean: tuple[float, float] | None = None
    layer_thickness: Quantity | None = None  # nm
    thickness_tolerance: Quantity | None = None  # nm, of the whole stack
    drift_limit: float | None = None  # largest |slope| of TR per stroke
    renewals: int | None = None  # largest number allowed
    films: tuple[StackFilm, ...] = ()
    area_in_film: Quantity | None = None  # nm^2 per molecule on the substrate
    permittivity: Quantity | None = None  # 1, relative
    absorptivity: Quantity | None = None  # L/mol/cm, decadic
    crystal_frequency: Quantity | None = None  # Hz


@dataclass(frozen=True)
class Target:
    """What is wanted of the dipping pressure. Nothing here is assumed when absent."""

    phase: str | None = None
    collapse_margin: Quantity | None = None  # mN/m
    guard_band: Quantity | None = None  # mN/m, around coexistences and kinks
    packing_error: Quantity | None = None  # 1, largest dA/A from the pressure tolerance
    loss: Quantity | None = None  # 1, largest part of the film lost over the dipping time
    renewals: int | None = None  # largest number allowed


@dataclass(frozen=True)
class Check:
    """What is known and allowed before spreading. None: common practice, or the check is left out.

    pressure_rise, drift_per_hour, zero, tension_tolerance : largest allowed, mN/m. force : pull on the
    plate, mN; perimeter : wetted, mm; contact_angle : degrees. low_*, high_* : probe's reading and the
    known value at two calibration points, mN/m. gain_tolerance, linearity_tolerance : largest allowed, 1.
    """

    pressure_rise: Quantity | None = None
    zero: Quantity | None = None
    drift_per_hour: Quantity | None = None
    tension_tolerance: Quantity | None = None
    force: Quantity | None = None
    perimeter: Quantity | None = None
    contact_angle: Quantity | None = None
    low_reading: Quantity | None = None
    low_true: Quantity | None = None
    high_reading: Quantity | None = None
    high_true: Quantity | None = None
    gain_tolerance: Quantity | None = None
    linearity_tolerance: Quantity | None = None


@dataclass(frozen=True)
class ColumnHint:
    """The user's word on one column of the export: by header or by index (first column is 1)."""

    role: str
    header: str | None = None
    index: int | None = None
    unit: str | None = None


@dataclass(frozen=True)
class RunSheet:
    """A whole run sheet. `path` names the file it came from ("" for the built-in empty sheet)."""

    title: str = ""
    film: Film = field(default_factory=Film)
    subphase: Subphase = field(default_factory=Subphase)
    trough: Trough = field(default_factory=Trough)
    substrate: Substrate | None = None
    dipping: Dipping = field(default_factory=Dipping)
    stack: Stack = field(default_factory=Stack)
    target: Target = field(default_factory=Target)
    columns: tuple[ColumnHint, ...] = ()
    path: str = ""
    check: Check = field(default_factory=Check)
