"""Words on the terminal: width, colour, and text that is safe to show there."""

from __future__ import annotations

import errno
import os
import shutil
import sys
from typing import TextIO

from isotherm.errors import UpstrokeError

__all__ = ["complain", "paint_heading", "printable", "say", "terminal_width"]

# A table is laid out for 80 columns; wider terminals gain nothing from longer lines.
WIDEST = 100
USUAL = 80
NARROWEST = 20

# What stands in for a sign that the terminal's encoding lacks.
PLAIN_SIGNS = {
    "±": "+/-",
    "²": "^2",
    "³": "^3",
    "µ": "u",
    "°": "deg ",
    "–": "-",
    "—": "-",
    "−": "-",
    "×": "x",
    "·": "-",
    "Π": "Pi",
    "γ": "gamma",
    "Δ": "Delta",
    "χ": "chi",
    "≤": "<=",
    "≥": ">=",
    "…": "...",
    "•": "-",
    "│": "|",
    "─": "-",
    "Å": "A",
    "⁻": "^-",
    "¹": "1",
    "₀": "0",
}


def printable(text: str) -> str:
    """Return `text` with control characters spelt out, so that no input can drive the terminal."""
    if text.isprintable():
        return text
    return "".join(c if c.isprintable() else c.encode("unicode_escape").decode() for c in text)


def terminal_width() -> int:
    """Columns to lay text out for: the terminal's own, 80 where output is piped."""
    if not sys.stdout.isatty() and "COLUMNS" not in os.environ:
        return USUAL
    return max(NARROWEST, min(WIDEST, shutil.get_terminal_size((USUAL, 24)).columns))


def _colour_wanted(stream: TextIO) -> bool:
    # https://no-color.org: any non-empty NO_COLOR switches colour off
    if os.environ.get("NO_COLOR") or os.environ.get("TERM", "") in ("", "dumb"):
        return False
    return stream.isatty()


def paint_heading(text: str) -> str:
    """Embolden a heading where the terminal takes it; elsewhere return it as it is."""
    return f"\x1b[1m{text}\x1b[0m" if _colour_wanted(sys.stdout) else text


def _fit_encoding(text: str, stream: TextIO) -> str:
    encoding = stream.encoding or "utf-8"
    try:
        text.encode(encoding)
    except UnicodeEncodeError:
        plain = "".join(PLAIN_SIGNS.get(c, c) for c in text)
        return plain.encode(encoding, "backslashreplace").decode(encoding)
    return text


def say(text: str) -> None:
    """Write `text` to standard output and make sure it got there.

    Raises
    ------
    BrokenPipeError
        The reader went away.
    UpstrokeError
        Standard output cannot be written (a full disk, a closed descriptor).
    """
    try:
        sys.stdout.write(_fit_encoding(text, sys.stdout))
        sys.stdout.flush()
    except BrokenPipeError:
        raise
    except OSError as error:
        if error.errno == errno.EPIPE:
            raise BrokenPipeError from error
        raise UpstrokeError(
            f"cannot write to standard output: {error.strerror}",
            remedy="free some space or send the output elsewhere",
        ) from error


def complain(text: str) -> None:
    """Write one line, `upstroke: text`, to standard error."""
    line = printable(" ".join(text.split()))
    sys.stderr.write(_fit_encoding(f"upstroke: {line}\n", sys.stderr))
    sys.stderr.flush()
