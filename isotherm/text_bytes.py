"""From a file to text: read it once, tell text from binary, find the encoding."""

from __future__ import annotations

import codecs
import hashlib
import os
import stat
import threading
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path
from typing import Final

from isotherm.errors import UpstrokeError

__all__ = ["Decoded", "decode", "digest", "is_workbook", "read_bytes"]

_SAMPLE: Final = 65536  # bytes looked at to tell the encoding
_MARKS: Final = (
    (codecs.BOM_UTF8, "utf-8"),
    (codecs.BOM_UTF32_LE, "utf-32-le"),
    (codecs.BOM_UTF32_BE, "utf-32-be"),
    (codecs.BOM_UTF16_LE, "utf-16-le"),
    (codecs.BOM_UTF16_BE, "utf-16-be"),
)
# First bytes of files that are no text, and what to do with them.
_MAGIC: Final = (
    (b"\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1", "an old binary workbook", "save it as .xlsx or as text"),
    (b"%PDF-", "a PDF", "export the numbers as text"),
    (b"\x89PNG\r\n", "a picture", "export the numbers as text"),
    (b"\xff\xd8\xff", "a picture", "export the numbers as text"),
    (b"\x1f\x8b", "a compressed file", "unpack it first"),
    (b"BZh", "a compressed file", "unpack it first"),
    (b"\xfd7zXZ\x00", "a compressed file", "unpack it first"),
    (b"PK\x03\x04", "an archive", "unpack it first"),
)
# Control characters that text files do hold: tab, line feed, form feed, carriage return, end of file.
_TEXT_CONTROLS: Final = frozenset(b"\t\n\x0b\x0c\r\x1a\x1b")
_CONTROLS: Final = bytes(b for b in range(32) if b not in _TEXT_CONTROLS)


_LARGE: Final = 1_000_000  # bytes
_ASCII: Final = frozenset(map(chr, range(128)))


@dataclass(frozen=True)
class Decoded:
    """The text of a file and the encoding it was in."""

    text: str
    encoding: str


def read_bytes(path: str | Path) -> bytes:
    """Read a regular file whole.

    Raises
    ------
    UpstrokeError
        When it is missing, a directory, not a regular file, or may not be read.
    """
    where = str(path)
    try:
        # opened first and judged by its handle, so that nothing can change between the two;
        # O_NONBLOCK: a pipe without a writer would wait for ever
        handle = os.open(
            path, os.O_RDONLY | getattr(os, "O_BINARY", 0) | getattr(os, "O_NONBLOCK", 0)
        )
    except FileNotFoundError:
        raise UpstrokeError("no such file", where=where, remedy="check the path") from None
    except IsADirectoryError:
        raise UpstrokeError("a directory", where=where, remedy="name a file in it") from None
    except PermissionError:
        if os.path.isdir(path):
            raise UpstrokeError("a directory", where=where, remedy="name a file in it") from None
        raise UpstrokeError(
            "may not be read", where=where, remedy="ask for permission to read it"
        ) from None
    except (OSError, ValueError) as error:
        raise UpstrokeError(
            f"cannot be opened ({getattr(error, 'strerror', None) or error})", where=where[:200]
        ) from None
    try:
        with os.fdopen(handle, "rb", buffering=0) as file:
            mode = os.fstat(file.fileno()).st_mode
            if stat.S_ISDIR(mode):
                raise UpstrokeError("a directory", where=where, remedy="name a file in it")
            if not stat.S_ISREG(mode):
                raise UpstrokeError(
                    "not a regular file", where=where, remedy="save the export to a file first"
                )
            return file.readall()
    except OSError as error:
        raise UpstrokeError(f"cannot be read ({error.strerror})", where=where) from None
    except MemoryError:
        raise UpstrokeError("larger than the memory", where=where, remedy="split it") from None


def digest(data: bytes) -> Callable[[], str]:
    """Begin the SHA-256 of the bytes and return how to ask for it, in hexadecimal.

    Hashing a large file takes a tenth of the time of reading its numbers; it runs beside that (both let
    go of the interpreter's lock).
    """
    if len(data) < _LARGE:
        done = hashlib.sha256(data).hexdigest()
        return lambda: done
    found: list[str] = []
    worker = threading.Thread(target=lambda: found.append(hashlib.sha256(data).hexdigest()))
    worker.start()

    def wait() -> str:
        worker.join()
        return found[0]

    return wait


def is_workbook(data: bytes) -> bool:
    """Whether the bytes are an .xlsx workbook (a zip archive that holds one)."""
    return data.startswith(b"PK\x03\x04") and b"xl/" in data


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
