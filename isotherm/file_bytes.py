"""The bytes of an input file: its ends at once, the whole when something asks for it."""

from __future__ import annotations

import hashlib
import os
import stat
import threading
from collections.abc import Callable
from pathlib import Path
from types import TracebackType
from typing import Final

from isotherm.errors import UpstrokeError

__all__ = ["FileBytes", "read_bytes"]

_LARGE: Final = 1_000_000  # bytes; below, one reading of the whole costs less than any care
_HEAD: Final = 1 << 18  # bytes at hand of a large file: where its rows begin is nearly always there
_TAIL: Final = 1 << 13  # and its last lines
_CHUNK: Final = 1 << 20  # bytes hashed at a time


class FileBytes:
    """A regular file, opened once for reading, or bytes made of one.

    A large file is not held in memory: the parser of numbers opens it itself, and its digest is taken
    from the disk beside the analysis. That it is still the file that was opened is checked after both.
    """

    def __init__(self, data: bytes) -> None:
        self._whole: bytes | None = data
        self._handle = -1
        self._where = ""
        self._size = len(data)
        self._seen: tuple[int, ...] = ()
        self._head = self._tail = b""

    @classmethod
    def open(cls, path: str | Path) -> FileBytes:
        """Open a regular file.

        Raises
        ------
        UpstrokeError
            When it is missing, a directory, not a regular file, or may not be read.
        """
        where = str(path)
        handle = _open(path, where)
        try:
            about = os.fstat(handle)
            if stat.S_ISDIR(about.st_mode):
                raise _directory(where)
            if not stat.S_ISREG(about.st_mode):
                raise UpstrokeError(
                    "not a regular file", where=where, remedy="save the export to a file first"
                )
            if about.st_size < _LARGE:
                content = cls(_whole(handle, where))
                os.close(handle)
                return content
            content = cls(b"")
            content._head = _part(handle, 0, _HEAD, where)
            content._tail = _part(handle, about.st_size - _TAIL, about.st_size, where)
        except BaseException:
            os.close(handle)
            raise
        content._whole, content._handle, content._where = None, handle, where
        content._size, content._seen = about.st_size, _state(handle)
        return content

    def __enter__(self) -> FileBytes:
        return self

    def __exit__(
        self,
        kind: type[BaseException] | None,
        error: BaseException | None,
        trace: TracebackType | None,
    ) -> None:
        if self._handle >= 0:
            os.close(self._handle)
            self._handle = -1

    def __len__(self) -> int:
        return self._size

    @property
    def in_memory(self) -> bool:
        """Whether the whole has been read."""
        return self._whole is not None

    def part(self, start: int, stop: int) -> bytes:
        """Bytes `start` to `stop`, as a slice takes them (neither is negative)."""
        if self._whole is not None:
            return self._whole[start:stop]
        size, stop = len(self), min(stop, len(self))
        if stop <= len(self._head):
            return self._head[start:stop]
        if start >= size - len(self._tail):
            return self._tail[start - size + len(self._tail) : stop - size + len(self._tail)]
        return self.whole()[start:stop]

    def whole(self) -> bytes:
        """All bytes; they stay in memory from then on."""
        if self._whole is None:
            self._whole = _whole(self._handle, self._where)
            if _state(self._handle) != self._seen:
                raise _changed(self._where)
        return self._whole

    def digest(self) -> str | Callable[[], str]:
        """SHA-256 in hexadecimal, or for a large file how to wait for it while it is found beside.

        Ask last: the file is checked to be the one that was opened, so that what was read in between
        through its path is what is hashed.

        Raises
        ------
        UpstrokeError
            At once, or from what is returned, when the file was written to meanwhile.
        """
        if self._handle < 0:
            return hashlib.sha256(self._whole or b"").hexdigest()
        own = self._again()
        found: list[str | Exception] = []

        def work() -> None:
            try:
                found.append(self._hash(own))
            except Exception as error:  # raised where the digest is waited for
                found.append(error)
            finally:
                os.close(own)

        worker = threading.Thread(target=work)
        worker.start()

        def wait() -> str:
            worker.join()
            if isinstance(found[0], Exception):
                raise found[0]
            return found[0]

        return wait

    def _hash(self, handle: int) -> str:
        digest = hashlib.sha256()
        room = bytearray(_CHUNK)
        try:
            with os.fdopen(handle, "rb", buffering=0, closefd=False) as file:
                while count := file.readinto(room):
                    digest.update(memoryview(room)[:count])
            if _state(handle) != self._seen:
                raise _changed(self._where)
        except OSError as error:
            raise _unreadable(error, self._where) from None
        return digest.hexdigest()

    def _again(self) -> int:
        """Open once more what stands at the path, which must be the file as it was opened first."""
        handle = _open(self._where, self._where)
        if _state(handle) != self._seen:
            os.close(handle)
            raise _changed(self._where)
        return handle


def read_bytes(path: str | Path) -> bytes:
    """Read a regular file whole.

    Raises
    ------
    UpstrokeError
        When it is missing, a directory, not a regular file, or may not be read.
    """
    with FileBytes.open(path) as content:
        return content.whole()


def _open(path: str | Path, where: str) -> int:
    try:
        # opened first and judged by its handle, so that nothing can change between the two;
        # O_NONBLOCK: a pipe without a writer would wait for ever
        return os.open(
            path, os.O_RDONLY | getattr(os, "O_BINARY", 0) | getattr(os, "O_NONBLOCK", 0)
        )
    except FileNotFoundError:
        raise UpstrokeError("no such file", where=where, remedy="check the path") from None
    except IsADirectoryError:
        raise _directory(where) from None
    except PermissionError:
        if os.path.isdir(path):
            raise _directory(where) from None
        raise UpstrokeError(
            "may not be read", where=where, remedy="ask for permission to read it"
        ) from None
    except (OSError, ValueError) as error:
        raise UpstrokeError(
            f"cannot be opened ({getattr(error, 'strerror', None) or error})", where=where[:200]
        ) from None


def _state(handle: int) -> tuple[int, ...]:
    """What tells whether a handle's file is another, or was written to."""
    about = os.fstat(handle)
    return (about.st_dev, about.st_ino, about.st_size, about.st_mtime_ns)


def _whole(handle: int, where: str) -> bytes:
    try:
        os.lseek(handle, 0, os.SEEK_SET)
        with os.fdopen(handle, "rb", buffering=0, closefd=False) as file:
            return file.readall()
    except OSError as error:
        raise _unreadable(error, where) from None
    except MemoryError:
        raise UpstrokeError("larger than the memory", where=where, remedy="split it") from None


def _part(handle: int, start: int, stop: int, where: str) -> bytes:
    try:
        os.lseek(handle, start, os.SEEK_SET)
        out = b""
        while len(out) < stop - start and (more := os.read(handle, stop - start - len(out))):
            out += more
    except OSError as error:
        raise _unreadable(error, where) from None
    if len(out) < stop - start:
        raise _changed(where)
    return out


def _directory(where: str) -> UpstrokeError:
    return UpstrokeError("a directory", where=where, remedy="name a file in it")


def _unreadable(error: OSError, where: str) -> UpstrokeError:
    return UpstrokeError(f"cannot be read ({error.strerror})", where=where)


def _changed(where: str) -> UpstrokeError:
    return UpstrokeError(
        "was written to while it was read",
        where=where,
        remedy="run again when the export is finished",
    )
