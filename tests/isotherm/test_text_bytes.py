"""Bytes become text, or are told from it."""

from __future__ import annotations

import hashlib
import os
from pathlib import Path

import pytest

from isotherm.errors import UpstrokeError
from isotherm.text_bytes import decode, digest, read_bytes

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


@pytest.mark.parametrize("size", [0, 1000, 3_000_000])
def test_digest(size: int) -> None:
    data = os.urandom(size)
    assert digest(data)() == hashlib.sha256(data).hexdigest()


@pytest.mark.parametrize(
    ("error", "says"),
    [
        (PermissionError(13, "denied"), "may not be read"),
        (IsADirectoryError(21, "directory"), "a directory"),
        (OSError(5, "Input/output error"), "cannot be opened .Input/output error"),
    ],
)
def test_files_that_cannot_be_opened(
    error: OSError, says: str, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    def refuse(*_: object) -> int:
        raise error

    monkeypatch.setattr(os, "open", refuse)
    with pytest.raises(UpstrokeError, match=says):
        read_bytes(tmp_path / "file")


def test_a_directory_where_opening_one_is_not_permitted(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    def refuse(*_: object) -> int:
        raise PermissionError(13, "denied")

    monkeypatch.setattr(os, "open", refuse)
    with pytest.raises(UpstrokeError, match="a directory"):
        read_bytes(tmp_path)
