"""The commented run sheet that `upstroke sheet` writes, made from the schema."""

from __future__ import annotations

import textwrap
from typing import Final

from isotherm.sheet_schema import SECTIONS, TITLE, Key, Section

__all__ = ["template"]

_WIDTH: Final = 100
_HEAD: Final = """\
# Run sheet. Take the # off the lines that apply, put in your values, delete the rest.
# A quantity is text: value, optionally ± its standard uncertainty, and a unit: "1.00 ± 0.01 mg/mL".
# Nothing left out is invented: what an analysis needs and does not find, it asks for.
"""


def _line(key: Key) -> str:
    setting = f"# {key.name} = {key.example}"
    meaning = key.meaning
    if key.choices and not meaning:
        meaning = " | ".join(key.choices)
    if not meaning:
        return setting
    line = f"{setting:<40}  # {meaning}"
    if len(line) <= _WIDTH:
        return line
    return "\n".join(
        [*textwrap.wrap(meaning, _WIDTH, initial_indent="#   ", subsequent_indent="#   "), setting]
    )


def _block(section: Section) -> str:
    heading = f"[[{section.path}]]" if section.many else f"[{section.path}]"
    lines = [f"## {section.meaning}"]
    lines += [f"##   {caution}" for caution in section.cautions]
    # only plain tables start switched on: an empty one says nothing, a child table would
    lines.append(f"# {heading}" if section.many or "." in section.path else heading)
    lines += [_line(key) for key in section.keys]
    return "\n".join(lines)


def template() -> str:
    """Return the commented sheet; it is valid TOML as it stands and with every setting switched on."""
    blocks = [_HEAD.rstrip(), _line(TITLE), *(_block(section) for section in SECTIONS)]
    return "\n\n".join(blocks) + "\n"
