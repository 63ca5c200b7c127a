"""An input file is read as it was opened, or refused; its digest is that of its bytes."""

from __future__ import annotations

import hashlib
import os
import pickle
from pathlib import Path

import pytest

from isotherm.errors import UpstrokeError
from isotherm.file_bytes import FileBytes, read_bytes
from isotherm.source import Source
from isotherm.table import read_table

_LARGE = 1_500_000  # bytes; no longer held in memory whole


@pytest.fixture
def large(tmp_path: Path) -> Path:
    path = tmp_path / "large"
    path.write_bytes(os.urandom(_LARGE))
    return path


def _digest(content: FileBytes) -> str:
    digest = content.digest()
    return digest if isinstance(digest, str) else digest()


@pytest.mark.parametrize("size", [0, 1000, 999_999, 1_000_000, 3_000_000])
def test_the_digest_is_that_of_the_bytes(size: int, tmp_path: Path) -> None:
    path = tmp_path / "file"
    path.write_bytes(os.urandom(size))
    with FileBytes.open(path) as content:
        assert _digest(content) == hashlib.sha256(path.read_bytes()).hexdigest()


@pytest.mark.parametrize(
    ("start", "stop"),
    [(0, 10), (0, 1 << 18), ((1 << 18) - 5, (1 << 18) + 5), (_LARGE - 8192, _LARGE), (700_000, 700_009),
     (_LARGE - 3, _LARGE + 50), (0, _LARGE + 1)],
)  # fmt: skip
def test_any_part_of_a_large_file(start: int, stop: int, large: Path) -> None:
    data = large.read_bytes()
    with FileBytes.open(large) as content:
        assert not content.in_memory
        assert len(content) == _LARGE
        assert content.part(start, stop) == data[start:stop]
        assert content.whole() == data
        assert content.in_memory


def test_a_large_file_written_to_while_it_is_read_is_refused(large: Path) -> None:
    with FileBytes.open(large) as content:
        with large.open("ab") as file:
            file.write(b"more")
        with pytest.raises(UpstrokeError, match="written to while it was read"):
            content.whole()
        with pytest.raises(UpstrokeError, match="written to while it was read"):
            content.digest()


def test_a_large_file_replaced_while_it_is_read_is_refused(large: Path, tmp_path: Path) -> None:
    with FileBytes.open(large) as content:
        other = tmp_path / "other"
        other.write_bytes(large.read_bytes())
        other.replace(large)
        with pytest.raises(UpstrokeError, match="written to while it was read"):
            content.digest()


def test_a_large_file_written_to_while_it_is_hashed_is_refused(
    large: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    new = hashlib.sha256

    def late() -> object:  # begins to hash only after the file has grown
        with large.open("ab") as file:
            file.write(b"more")
        return new()

    monkeypatch.setattr(hashlib, "sha256", late)
    with FileBytes.open(large) as content, pytest.raises(UpstrokeError, match="written to"):
        _digest(content)


def test_an_export_still_being_written_is_refused_not_half_read(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    path = tmp_path / "run.csv"
    rows = "".join(f"{240 - i / 1000:.3f},{i / 2000:.3f}\n" for i in range(100_000))
    path.write_text("Area (cm^2),Pressure (mN/m)\n" + rows, encoding="utf-8")
    import pandas as pd

    read = pd.read_csv

    def read_and_grow(*args: object, **options: object) -> object:
        out = read(*args, **options)  # type: ignore[call-overload]
        with path.open("a", encoding="utf-8") as file:
            file.write("1,2\n")
        return out

    monkeypatch.setattr(pd, "read_csv", read_and_grow)
    with pytest.raises(UpstrokeError, match="written to while it was read"):
        read_table(path)


def test_a_source_can_go_to_another_process(large: Path) -> None:
    with FileBytes.open(large) as content:
        source = Source("large", content.digest(), 1)
    there = pickle.loads(pickle.dumps(source))
    assert there.sha256 == source.sha256 == hashlib.sha256(large.read_bytes()).hexdigest()
    assert there == source


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


def test_a_disk_that_fails_while_it_is_read(large: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def fail(*_: object) -> bytes:
        raise OSError(5, "Input/output error")

    monkeypatch.setattr(os, "read", fail)
    with pytest.raises(UpstrokeError, match=r"cannot be read .Input/output error"):
        FileBytes.open(large)
