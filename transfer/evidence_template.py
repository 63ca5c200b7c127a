"""A commented evidence file to fill in, made from the list of kinds."""

from __future__ import annotations

from typing import Final

from isotherm.sheet_schema import Key
from transfer.evidence_kinds import COMMON, ELECTRODE, KINDS, Kind

__all__ = ["evidence_template"]

_VALUES: Final = {
    "absorbance": "0.050 ± 0.001",
    "resonator_frequency": "-107 ± 1 Hz",
    "ellipsometric_thickness": "10.1 ± 0.2 nm",
    "xray_thickness": "10.05 ± 0.05 nm",
    "bragg_spacing": "5.02 ± 0.02 nm",
    "electroactive_coverage": "70 ± 1 µC",
    "interfacial_capacitance": "0.50 ± 0.01 µF",
    "blocking_test": "2.1 ± 0.1 µA",
}
_HEAD: Final = """\
# Evidence from the substrate. Take the # off the lines you need; every quantity carries its unit and,
# after ±, its standard uncertainty.
# layers counts the strokes that laid film; write stroke = 4 for the state after stroke 4 of the log;
# 0 is the bare substrate. Raw records: {layers = 4, files = ["a.csv", "b.csv"], scan_rates = [...]}.
# X-ray sources, strong light and cell chemicals: local rules and trained people first.
"""


def evidence_template() -> str:
    """Return the TOML text: every kind with its settings, commented out."""
    common = [f"#   {key.name} = {key.example}   # {key.meaning}" for key in COMMON]
    head = "\n".join([_HEAD.rstrip("\n"), "# Every kind also takes:", *common])
    parts = [head, _section("electrode", "shared by the electrochemical kinds", ELECTRODE)]
    for kind in KINDS.values():
        parts.append(_section(kind.name, kind.meaning, _own(kind)))
        first = _point(kind, 0) if kind.name != "bragg_spacing" else None
        rows = [row for row in (first, _point(kind, 4)) if row]
        parts.append("# points = [\n" + "".join(f"#   {row},\n" for row in rows) + "# ]\n")
    return "\n".join(part.rstrip("\n") for part in parts) + "\n"


def _own(kind: Kind) -> tuple[Key, ...]:
    """Settings of a kind less those that every kind has or [electrode] gives."""
    left_out = {key.name for key in COMMON} | {"electrode_area", "roughness"}
    return tuple(key for key in kind.keys if key.name not in left_out)


def _section(name: str, meaning: str, keys: tuple[Key, ...]) -> str:
    lines = [f"\n# [{name}]   # {meaning}"]
    for key in keys:
        lines.append(f"# {key.name} = {key.example}   # {key.meaning}")
    return "\n".join(lines)


def _point(kind: Kind, layers: int) -> str:
    value = _VALUES[kind.name]
    if layers == 0 and kind.name == "blocking_test":
        value = "100 ± 2 µA"
    elif layers == 0:
        value = {"interfacial_capacitance": "4.10 ± 0.05 µF"}.get(kind.name, "")
    return f'{{layers = {layers}, value = "{value}"}}' if value else ""
