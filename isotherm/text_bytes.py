"""From bytes to text: tell text from binary, find the encoding."""

from __future__ import annotations

import codecs
from dataclasses import dataclass
from typing import Final

from isotherm.errors import UpstrokeError

__all__ = ["WORKBOOK", "Decoded", "decode", "is_workbook"]

_SAMPLE: Final = 65536  # bytes looked at to tell the encoding
_MARKS: Final = (
    (codecs.BOM_UTF8, "utf-8"),
    (codecs.BOM_UTF32_LE, "utf-32-le"),
    (codecs.BOM_UTF32_BE, "utf-32-be"),
    (codecs.BOM_UTF16_LE, "utf-16-le"),
    (codecs.BOM_UTF16_BE, "utf-16-be"),
)
WORKBOOK: Final = b"PK\x03\x04"  # first bytes of an .xlsx workbook, as of any zip archive
# First bytes of files that are no text, and what to do with them.
_MAGIC: Final = (
    (b"\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1", "an old binary workbook", "save it as .xlsx or as text"),
    (b"%PDF-", "a PDF", "export the numbers as text"),
    (b"\x89PNG\r\n", "a picture", "export the numbers as text"),
    (b"\xff\xd8\xff", "a picture", "export the numbers as text"),
    (b"\x1f\x8b", "a compressed file", "unpack it first"),
    (b"BZh", "a compressed file", "unpack it first"),
    (b"\xfd7zXZ\x00", "a compressed file", "unpack it first"),
    (WORKBOOK, "an archive", "unpack it first"),
)
# Control characters that text files do hold: tab, line feed, form feed, carriage return, end of file.
_TEXT_CONTROLS: Final = frozenset(b"\t\n\x0b\x0c\r\x1a\x1b")
_CONTROLS: Final = bytes(b for b in range(32) if b not in _TEXT_CONTROLS)
_ASCII: Final = frozenset(map(chr, range(128)))


@dataclass(frozen=True)
class Decoded:
    """The text of a file and the encoding it was in."""

    text: str
    encoding: str


def is_workbook(data: bytes) -> bool:
    """Whether the bytes are an .xlsx workbook (a zip archive that holds one)."""
    return data.startswith(WORKBOOK) and b"xl/" in data


def decode(data: bytes, *, where: str, whole: bool = True) -> Decoded:
    """Decode text: by its byte-order mark, as UTF-8, as UTF-16 without mark, else as Latin-1.

    Parameters
    ----------
    data : bytes
        A file, or its beginning when `whole` is false (a character may then be cut at the end).
    where : str
        Named in the error.

    Raises
    ------
    UpstrokeError
        When the bytes are not text.
    """
    for mark, encoding in _MARKS:
        if data.startswith(mark):
            return Decoded(_as(data[len(mark) :], encoding), encoding)
    for magic, what, remedy in _MAGIC:
        if data.startswith(magic):
            raise UpstrokeError(f"{what}, not text", where=where, remedy=remedy)
    sample = data[:_SAMPLE]
    if b"\0" in sample:
        encoding = _unmarked_utf16(sample)
        if not encoding:
            raise UpstrokeError(
                "a binary file, not text", where=where, remedy="export the numbers as text"
            )
        return Decoded(_as(data, encoding), encoding)
    if _has_controls(sample):
        raise UpstrokeError(
            "a binary file, not text", where=where, remedy="export the numbers as text"
        )
    try:
        text = codecs.getincrementaldecoder("utf-8")("strict").decode(data, final=whole)
        # the two bytes of Å² in Latin-1 happen to make one letter of Lithuanian in UTF-8
        if not ("\u0172" in text and set(text) - _ASCII == {"\u0172"}):
            return Decoded(text, "utf-8")
    except UnicodeDecodeError:
        pass
    # Windows exports in western alphabets; the few bytes it leaves open are kept as in Latin-1
    try:
        return Decoded(data.decode("cp1252"), "cp1252")
    except UnicodeDecodeError:
        return Decoded(data.decode("latin-1"), "latin-1")


def _as(data: bytes, encoding: str) -> str:
    return data.decode(encoding, errors="replace")


def _unmarked_utf16(sample: bytes) -> str:
    """UTF-16 without a mark: in western text one byte of nearly every pair is zero."""
    even, odd = sample[0::2], sample[1::2]
    if not odd:
        return ""
    low, high = even.count(0) / len(even), odd.count(0) / len(odd)
    if high > 0.7 and low < 0.02 and not _has_controls(even):
        return "utf-16-le"
    if low > 0.7 and high < 0.02 and not _has_controls(odd):
        return "utf-16-be"
    return ""


def _has_controls(sample: bytes) -> bool:
    """Whether there are more control characters than text has: a stray one in a thousand may pass."""
    return len(sample) - len(sample.translate(None, _CONTROLS)) > 2 + len(sample) // 1000
