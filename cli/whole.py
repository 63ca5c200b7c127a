"""Write a set of files whole or not at all, whatever happens on the way."""

from __future__ import annotations

import contextlib
import errno
import os
import shutil
import stat
from dataclasses import dataclass
from pathlib import Path
from types import TracebackType

from isotherm.errors import UpstrokeError

__all__ = ["StagedFiles"]

# Errors of a file system that has no unnamed files or no hard links.
NOT_OFFERED = {
    errno.EOPNOTSUPP,
    errno.EINVAL,
    errno.EISDIR,
    errno.ENOENT,
    errno.EPERM,
    errno.ENOSYS,
    errno.EXDEV,
    errno.EMLINK,
}


@dataclass
class _Staged:
    """One file, complete on disk but not yet under its name."""

    target: Path
    descriptor: int | None  # of an unnamed file: it vanishes with this process, even when killed
    temporary: Path | None  # its passing name, where the file system has no unnamed files


@dataclass
class _Done:
    """A file that has its name, and how to take that back."""

    target: Path
    backup: Path | None  # the replaced file; None where there was none


class StagedFiles:
    """Files written in full beside their targets, then named all together.

    Use as a context manager: `add` each file, then `commit`. Leaving without `commit`, for whatever
    reason, leaves the directories as they were.

    Parameters
    ----------
    replace : bool
        Whether a target that exists may be replaced.
    """

    def __init__(self, *, replace: bool) -> None:
        self._replace = replace
        self._staged: list[_Staged] = []

    def __enter__(self) -> StagedFiles:
        return self

    def __exit__(
        self,
        kind: type[BaseException] | None,
        error: BaseException | None,
        trace: TracebackType | None,
    ) -> None:
        for staged in self._staged:
            _abandon(staged)
        self._staged = []

    def add(self, target: Path, data: bytes) -> None:
        """Put `data` on disk in the directory of `target`, under no or a passing name.

        Raises
        ------
        UpstrokeError
            The directory cannot be written or the disk is full.
        """
        try:
            descriptor, temporary = _open_beside(target)
            staged = _Staged(target, descriptor, temporary)
            self._staged.append(staged)
            _keep_mode(descriptor, target)
            _write_all(descriptor, data)
            if temporary is not None:
                # some systems do not rename a file that is open
                staged.descriptor = None
                os.close(descriptor)
        except OSError as error:
            raise _cannot_write(target, error) from error

    def commit(self) -> None:
        """Give every file its name; on any failure take back those already given.

        Raises
        ------
        UpstrokeError
            A target appeared meanwhile, or the file system refuses.
        """
        done: list[_Done] = []
        current = Path()
        try:
            for staged in self._staged:
                current = staged.target
                done.append(self._name(staged))
        except BaseException as error:
            for one in reversed(done):
                _take_back(one)
            if isinstance(error, FileExistsError):
                raise UpstrokeError(
                    "appeared while this command ran",
                    where=str(current),
                    remedy="add --force to replace it or name another file",
                ) from error
            if isinstance(error, OSError):
                raise _cannot_write(current, error) from error
            raise
        for one in done:
            if one.backup is not None:
                one.backup.unlink(missing_ok=True)
        for folder in {one.target.parent for one in done}:
            _sync_folder(folder)

    def _name(self, staged: _Staged) -> _Done:
        target = staged.target
        if not (self._replace and target.exists()):
            _link(staged, target)
            return _Done(target, None)
        backup: Path | None = None
        if len(self._staged) > 1:  # a single replacement is atomic by itself
            backup = _back_up(target)
        try:
            passing = staged.temporary
            if passing is None:
                passing = _passing_name(target)
                _link(staged, passing)
                staged.temporary = passing
            os.replace(passing, target)
            staged.temporary = None
        except OSError:
            if backup is not None:
                backup.unlink(missing_ok=True)
            raise
        return _Done(target, backup)


def _passing_name(target: Path) -> Path:
    return target.with_name(f".upstroke-{os.urandom(8).hex()}.part")


def _open_beside(target: Path) -> tuple[int, Path | None]:
    """Open a file in the target's directory: unnamed where that is offered, else a passing one."""
    unnamed = getattr(os, "O_TMPFILE", None)
    if unnamed is not None and os.path.isdir("/proc/self/fd"):
        try:
            return os.open(target.parent, unnamed | os.O_RDWR, 0o666), None
        except OSError as error:
            if error.errno not in NOT_OFFERED:
                raise
    temporary = _passing_name(target)
    return _open_new(temporary), temporary


def _open_new(path: Path) -> int:
    return os.open(path, os.O_WRONLY | os.O_CREAT | os.O_EXCL | getattr(os, "O_BINARY", 0), 0o666)


def _write_all(descriptor: int, data: bytes) -> None:
    view = memoryview(data)
    while view:
        view = view[os.write(descriptor, view) :]
    os.fsync(descriptor)


def _keep_mode(descriptor: int, target: Path) -> None:
    """Give a file that will replace another the other's permissions."""
    if os.chmod in os.supports_fd:
        with contextlib.suppress(OSError):
            os.chmod(descriptor, stat.S_IMODE(os.stat(target).st_mode))


def _back_up(target: Path) -> Path:
    """Keep what `target` holds under a passing name."""
    backup = _passing_name(target)
    try:
        os.link(target, backup)
    except OSError as error:
        if error.errno not in NOT_OFFERED:
            raise
        shutil.copy2(target, backup)
    return backup


def _link(staged: _Staged, name: Path) -> None:
    """Give a staged file a name that must not exist yet."""
    if staged.temporary is None:
        if _link_unnamed(staged, name):
            return
        staged.temporary = _copy_unnamed(staged)
    try:
        os.link(staged.temporary, name)
        staged.temporary.unlink(missing_ok=True)
    except OSError as error:
        if error.errno not in NOT_OFFERED:
            raise
        # no hard links here: claim the name first, so that nothing is overwritten
        os.close(_open_new(name))
        os.replace(staged.temporary, name)
    staged.temporary = None


def _link_unnamed(staged: _Staged, name: Path) -> bool:
    """Name an unnamed file; False where the file system has unnamed files but will not name them."""
    folder = os.open(name.parent, os.O_RDONLY)
    try:
        # with a directory descriptor Python calls linkat and follows /proc's link to the file
        os.link(f"/proc/self/fd/{staged.descriptor}", name.name, dst_dir_fd=folder)
    except FileExistsError:
        raise
    except OSError as error:
        if error.errno not in NOT_OFFERED:
            raise
        return False
    finally:
        os.close(folder)
    return True


def _copy_unnamed(staged: _Staged) -> Path:
    temporary = _passing_name(staged.target)
    descriptor = _open_new(temporary)
    try:
        _write_all(descriptor, Path(f"/proc/self/fd/{staged.descriptor}").read_bytes())
    except OSError:
        temporary.unlink(missing_ok=True)
        raise
    finally:
        os.close(descriptor)
    return temporary


def _abandon(staged: _Staged) -> None:
    if staged.descriptor is not None:
        with contextlib.suppress(OSError):
            os.close(staged.descriptor)
    if staged.temporary is not None:
        with contextlib.suppress(OSError):
            staged.temporary.unlink(missing_ok=True)


def _take_back(done: _Done) -> None:
    with contextlib.suppress(OSError):
        if done.backup is None:
            done.target.unlink(missing_ok=True)
        else:
            os.replace(done.backup, done.target)


def _sync_folder(folder: Path) -> None:
    """Ask that the new names reach the disk; not every file system offers it."""
    with contextlib.suppress(OSError):
        descriptor = os.open(folder, os.O_RDONLY)
        try:
            os.fsync(descriptor)
        finally:
            os.close(descriptor)


def _cannot_write(target: Path, error: OSError) -> UpstrokeError:
    remedies = {
        errno.ENOSPC: "free some space or name a file on another disk",
        errno.EDQUOT: "free some of your quota or name a file elsewhere",
        errno.EFBIG: "raise the limit on file sizes or name a file elsewhere",
        errno.EACCES: "name a file in a directory you may write to",
        errno.EROFS: "name a file on a disk that can be written",
        errno.ENAMETOOLONG: "give it a shorter name",
    }
    return UpstrokeError(
        f"cannot be written: {error.strerror or error}",
        where=str(target),
        remedy=remedies.get(error.errno or 0, "name another file"),
    )
