"""Bytes become text, or are told from it."""

from __future__ import annotations

import pytest

from isotherm.errors import UpstrokeError
from isotherm.text_bytes import decode

_TEXT = "Fläche (Å²);Druck (mN/m)\r\n" + "1,5;2,5\r\n" * 40


@pytest.mark.parametrize(
    "encoding",
    ["utf-8", "utf-8-sig", "utf-16", "utf-16-le", "utf-16-be", "utf-32", "latin-1", "cp1252"],
)
def test_every_encoding_gives_the_text(encoding: str) -> None:
    assert decode(_TEXT.encode(encoding), where="f").text == _TEXT


def test_bytes_that_cp1252_leaves_open_are_kept_as_in_latin_1() -> None:
    assert decode(b"a\x81b\xe9", where="f").text == "a\x81bé"


def test_a_character_cut_at_the_end_of_a_head() -> None:
    data = "Å".encode() * 10
    assert decode(data[:-1], where="f", whole=False).text == "Å" * 9


@pytest.mark.parametrize(
    ("data", "says"),
    [
        (bytes(100), "binary"),
        (b"\x00\x01" * 100, "binary"),
        (b"ab\x00" * 50, "binary"),
        (bytes(range(1, 32)) * 20, "binary"),
        (b"%PDF-1.7 ...", "PDF"),
        (b"BZh91AY", "compressed"),
        (b"\xfd7zXZ\x00", "compressed"),
    ],
)
def test_what_is_no_text(data: bytes, says: str) -> None:
    with pytest.raises(UpstrokeError, match=says):
        decode(data, where="f")
