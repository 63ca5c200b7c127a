"""Decode an export and find where its rows begin and how they are laid out."""

from __future__ import annotations

import codecs
import re
from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import Final

from isotherm.errors import UpstrokeError
from isotherm.file_bytes import FileBytes
from isotherm.table_header import whole_block
from isotherm.text_bytes import decode
from isotherm.text_cells import cell_kind
from isotherm.text_layout import Block, find_block

__all__ = ["TextRows", "find_rows"]

_HEAD: Final = 1 << 14  # bytes looked at first to find the rows; more when they begin later
_SAMPLE: Final = 1 << 18  # bytes looked at to tell the encoding
_COMMA: Final = re.compile(rb"\d,\d")
_POINT: Final = re.compile(rb"\d\.\d")


@dataclass(frozen=True)
class TextRows:
    """The export in an encoding that keeps ASCII, with the lines up to its rows."""

    data: FileBytes
    encoding: str
    lines: tuple[str, ...]
    block: Block
    start: int


def find_rows(data: FileBytes, where: str) -> TextRows:
    """Decode, and find where the rows begin and how they are laid out."""
    sample = data.part(0, _SAMPLE)
    encoding = decode(sample, where=where, whole=len(data) <= len(sample)).encoding
    if encoding.startswith(("utf-16", "utf-32")):
        text = decode(data.whole(), where=where).text
        data, encoding = FileBytes(text.encode("utf-8", "replace")), "utf-8"
    elif sample.startswith(codecs.BOM_UTF8):
        data = FileBytes(data.whole()[len(codecs.BOM_UTF8) :])
    size = _HEAD
    while True:
        complete = size >= len(data)
        raw = data.part(0, size).splitlines(keepends=True)
        if not complete and raw and not raw[-1].endswith((b"\n", b"\r")):
            raw.pop()
        lines = tuple(line.decode(encoding, "replace").rstrip("\r\n") for line in raw)
        block = find_block(lines, complete=complete)
        if block is not None:
            block = whole_block(lines, block)
            start = sum(len(line) for line in raw[: block.first])
            block = _with_decimal(lines, data, start, block)
            return TextRows(data, encoding, lines, block, start)
        if complete:
            raise _no_rows(lines, where)
        size *= 8


def _with_decimal(lines: Sequence[str], data: FileBytes, start: int, block: Block) -> Block:
    """Where the first rows hold whole numbers only, the decimal mark is the first met further down."""
    layout = block.layout
    sample = lines[block.first : block.first + block.rows]
    if layout.delimiter == "," or any("." in line or "," in line for line in sample):
        return block
    whole = data.whole()
    if whole.find(b",", start) < 0:
        return block
    comma, point = _COMMA.search(whole, start), _POINT.search(whole, start)
    if comma is None or (point is not None and point.start() < comma.start()):
        return block
    return replace(block, layout=replace(layout, decimal=","))


def _no_rows(lines: Sequence[str], where: str) -> UpstrokeError:

    filled = [line.strip(" \t;,|") for line in lines[:2000] if line.strip()]
    single = sum(cell_kind(line, mark) == "N" for line in filled for mark in ".,") > 0
    if single and sum(
        cell_kind(line, ".") == "N" or cell_kind(line, ",") == "N" for line in filled
    ) >= max(1, len(filled) // 2):
        return UpstrokeError(
            "one column of numbers only",
            where=where,
            remedy="an export needs at least two, such as area and pressure",
        )
    return UpstrokeError(
        f"no rows of numbers in its {len(lines)} lines",
        where=where,
        remedy="export the readings as text, one row per reading",
    )
