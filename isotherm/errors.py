"""Errors a user can act on."""

from __future__ import annotations

__all__ = ["UpstrokeError"]


class UpstrokeError(Exception):
    """The input or the analysis cannot go on; the message is one line for the user.

    Parameters
    ----------
    what : str
        What is wrong, in the user's terms.
    where : str
        File, line, column, sheet key or stroke it concerns; may be empty.
    remedy : str
        What to do about it; may be empty.
    """

    def __init__(self, what: str, *, where: str = "", remedy: str = "") -> None:
        self.what = what
        self.where = where
        self.remedy = remedy
        text = f"{where}: {what}" if where else what
        if remedy:
            text = f"{text}; {remedy}"
        super().__init__(" ".join(text.split()))
