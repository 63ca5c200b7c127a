"""Files are written whole or not at all: killed, out of room, or raced by another."""

from __future__ import annotations

import errno
import os
import shutil
import signal
import subprocess
import sys
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

from cli.whole import StagedFiles
from isotherm.errors import UpstrokeError

ROOT = Path(__file__).resolve().parents[2]


def names(folder: Path) -> set[str]:
    return {entry.name for entry in folder.iterdir()}


@pytest.fixture(params=["unnamed", "passing"])
def way(request: pytest.FixtureRequest, monkeypatch: pytest.MonkeyPatch) -> str:
    """Both ways of staging: unnamed files, and passing names where a system lacks those."""
    if request.param == "passing":
        monkeypatch.delattr(os, "O_TMPFILE", raising=False)
    elif not hasattr(os, "O_TMPFILE"):
        pytest.skip("no unnamed files on this system")
    return str(request.param)


def stage(*files: tuple[Path, bytes], replace: bool, then=lambda: None) -> None:
    """Stage the files, do what may happen meanwhile, and give them their names."""
    with StagedFiles(replace=replace) as staged:
        for target, data in files:
            staged.add(target, data)
        then()
        staged.commit()


@pytest.mark.parametrize("fault", ["write", "fsync"])
def test_a_full_disk_leaves_nothing(
    way: str, fault: str, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    old = tmp_path / "old.csv"
    old.write_text("old")
    real = getattr(os, fault)
    calls = 0

    def failing(*args: object) -> object:
        nonlocal calls
        calls += 1
        if calls > 1:
            raise OSError(errno.ENOSPC, os.strerror(errno.ENOSPC))
        return real(*args)

    monkeypatch.setattr(os, fault, failing)
    with pytest.raises(UpstrokeError, match="No space left on device; free some space"):
        stage((tmp_path / "new.json", b"new"), (old, b"replaced"), replace=True)
    monkeypatch.undo()
    assert names(tmp_path) == {"old.csv"}
    assert old.read_text() == "old"


def test_a_short_write_is_continued(
    way: str, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    real = os.write
    with StagedFiles(replace=False) as staged:
        monkeypatch.setattr(os, "write", lambda fd, data: real(fd, bytes(data)[:3]))
        staged.add(tmp_path / "o.csv", b"0123456789")
        staged.commit()
    monkeypatch.undo()
    assert (tmp_path / "o.csv").read_bytes() == b"0123456789"
    assert names(tmp_path) == {"o.csv"}


def test_a_file_that_appeared_meanwhile_is_kept(way: str, tmp_path: Path) -> None:
    late = tmp_path / "second.csv"
    with pytest.raises(UpstrokeError, match="appeared while"):
        stage(
            (tmp_path / "first.json", b"1"),
            (late, b"2"),
            replace=False,
            then=lambda: late.write_text("mine"),
        )
    assert names(tmp_path) == {"second.csv"}
    assert late.read_text() == "mine"


def test_a_replacement_is_taken_back_when_a_later_file_fails(way: str, tmp_path: Path) -> None:
    old, late = tmp_path / "old.json", tmp_path / "late"
    old.write_text("old")
    with pytest.raises(UpstrokeError):
        stage((old, b"new"), (late, b"2"), replace=True, then=late.mkdir)
    assert names(tmp_path) == {"old.json", "late"}
    assert old.read_text() == "old"


def test_no_hard_links_is_no_obstacle(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def refuse(*args: object, **kwargs: object) -> None:
        raise OSError(errno.EPERM, "no links here")

    monkeypatch.setattr(os, "link", refuse)
    (tmp_path / "a.json").write_text("old")
    with StagedFiles(replace=True) as staged:
        staged.add(tmp_path / "a.json", b"new")
        staged.add(tmp_path / "b.csv", b"b")
        staged.commit()
    monkeypatch.undo()
    assert names(tmp_path) == {"a.json", "b.csv"}
    assert (tmp_path / "a.json").read_text() == "new"


def failing(number: int) -> Callable[..., None]:
    """A call to the system that fails."""

    def call(*args: object, **kwargs: object) -> None:
        raise OSError(number, os.strerror(number))

    return call


@pytest.mark.parametrize("call", ["link", "replace"])
@pytest.mark.parametrize("number", [errno.EIO, errno.EROFS, errno.EACCES])
def test_a_name_that_cannot_be_given_leaves_all_as_it_was(
    way: str, call: str, number: int, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    for name in ("a.json", "b.csv"):
        (tmp_path / name).write_text("old")
    monkeypatch.setattr(os, call, failing(number))
    with pytest.raises(UpstrokeError, match="cannot be written"):
        stage((tmp_path / "a.json", b"new"), (tmp_path / "b.csv", b"new"), replace=True)
    monkeypatch.undo()
    assert names(tmp_path) == {"a.json", "b.csv"}
    assert {(tmp_path / name).read_text() for name in ("a.json", "b.csv")} == {"old"}


def test_an_interruption_while_names_are_given_takes_them_back(
    way: str, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    real, calls = os.link, 0

    def interrupted(*args: Any, **kwargs: Any) -> None:
        nonlocal calls
        calls += 1
        if calls == 2:
            raise KeyboardInterrupt
        real(*args, **kwargs)

    monkeypatch.setattr(os, "link", interrupted)
    with pytest.raises(KeyboardInterrupt):
        stage((tmp_path / "a.json", b"1"), (tmp_path / "b.csv", b"2"), replace=False)
    monkeypatch.undo()
    assert names(tmp_path) == set()


@pytest.mark.skipif(not hasattr(os, "O_TMPFILE"), reason="no unnamed files on this system")
def test_a_file_system_without_unnamed_files_gets_passing_ones(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    real = os.open

    def without(path: Any, flags: int, *args: Any, **kwargs: Any) -> int:
        if flags & os.O_TMPFILE == os.O_TMPFILE:
            raise OSError(errno.EOPNOTSUPP, os.strerror(errno.EOPNOTSUPP))
        return real(path, flags, *args, **kwargs)

    monkeypatch.setattr(os, "open", without)
    stage((tmp_path / "a.json", b"1"), (tmp_path / "empty.csv", b""), replace=False)
    monkeypatch.undo()
    assert names(tmp_path) == {"a.json", "empty.csv"}
    assert (tmp_path / "a.json").read_bytes() == b"1"


@pytest.mark.skipif(not hasattr(os, "O_TMPFILE"), reason="no unnamed files on this system")
def test_a_directory_closed_meanwhile_is_told(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    with StagedFiles(replace=False) as staged:
        monkeypatch.setattr(os, "open", failing(errno.EACCES))
        with pytest.raises(UpstrokeError, match="a directory you may write to"):
            staged.add(tmp_path / "a.json", b"1")
        monkeypatch.undo()
    assert names(tmp_path) == set()


WRITER = """
import sys
from pathlib import Path
from cli.whole import StagedFiles
with StagedFiles(replace=True) as staged:
    staged.add(Path(sys.argv[1]), b"first" * 100)
    staged.add(Path(sys.argv[2]), b"x" * 5_000_000)
    print("staged", flush=True)
    sys.stdin.readline()
    staged.commit()
"""


def test_a_killed_writer_leaves_nothing(tmp_path: Path) -> None:
    if not hasattr(os, "O_TMPFILE"):
        pytest.skip("without unnamed files a killed writer leaves its passing file")
    old = tmp_path / "old.json"
    old.write_text("old")
    with subprocess.Popen(
        [sys.executable, "-c", WRITER, str(old), str(tmp_path / "new.bin")],
        cwd=ROOT,
        stdin=subprocess.PIPE,
        stdout=subprocess.PIPE,
        text=True,
    ) as writer:
        assert writer.stdout is not None
        assert writer.stdout.readline() == "staged\n"
        writer.send_signal(signal.SIGKILL)
        writer.wait(timeout=20)
    assert names(tmp_path) == {"old.json"}
    assert old.read_text() == "old"


KILLED = """
import os, signal, sys
from pathlib import Path
from cli.whole import StagedFiles

NEW = {name: bytes([n]) * 300_000 for n, name in enumerate(("one.json", "two.csv", "three.svg"))}
if sys.argv[2] == "passing":
    del os.O_TMPFILE
folder, calls = Path(sys.argv[1]), 0


def dying(real, last):
    def call(*args, **kwargs):
        global calls
        calls += 1
        if calls == last:
            os.kill(os.getpid(), signal.SIGKILL)
        done = real(*args, **kwargs)
        if calls == -last:
            os.kill(os.getpid(), signal.SIGKILL)
        return done
    return call


def write(last):
    for name in ("open", "write", "fsync", "link", "replace", "unlink", "close"):
        setattr(os, name, dying(getattr(os, name), last))
    with StagedFiles(replace=True) as staged:
        for name, data in NEW.items():
            staged.add(folder / name, data)
        staged.commit()


moments = 0
for sign in (1, -1):  # before and after the call
    for count in range(1, 200):
        for path in folder.iterdir():
            path.unlink()
        (folder / "one.json").write_bytes(b"old")
        child = os.fork()
        if child == 0:
            write(sign * count)
            os._exit(0)
        _, status = os.waitpid(child, 0)
        for name, data in NEW.items():
            path = folder / name
            found = path.read_bytes() if path.exists() else None
            assert found in (data, b"old" if name == "one.json" else None), (count, name)
        if not os.WIFSIGNALED(status):
            break
        moments += 1
print(moments)
"""


@pytest.mark.skipif(not hasattr(os, "fork"), reason="needs fork")
@pytest.mark.parametrize("way", ["unnamed", "passing"])
def test_a_writer_killed_at_any_moment_leaves_old_or_new(way: str, tmp_path: Path) -> None:
    """Killed before and after each call to the system: a name holds all of a file, or what it held."""
    if way == "unnamed" and not hasattr(os, "O_TMPFILE"):
        pytest.skip("no unnamed files on this system")
    done = subprocess.run(
        [sys.executable, "-c", KILLED, str(tmp_path), way],
        cwd=ROOT, capture_output=True, text=True, timeout=100,
    )  # fmt: skip
    assert done.returncode == 0, done.stderr
    assert int(done.stdout) > 30


SMALL_DISK = """
disk=$1 size=$2
shift 2
mount -t tmpfs -o size=$size none "$disk" || exit 99
"$@"
echo "status $?"
ls -A "$disk"
"""
BYTES = {"--json": "4k", "--csv": "8k", "--figure": "32k", "--report": "64k"}


@pytest.mark.skipif(shutil.which("unshare") is None, reason="needs a file system of its own")
@pytest.mark.parametrize("option", sorted(BYTES))
def test_a_disk_without_room_is_one_clear_line(option: str, tmp_path: Path) -> None:
    """A real file system too small for the output, mounted where only this process sees it."""
    suffix = {"--json": ".json", "--csv": ".csv", "--figure": ".svg", "--report": ".html"}[option]
    disk = tmp_path / "disk"
    disk.mkdir()
    command = [
        sys.executable, "-m", "cli.main", "isotherm", "demo/spacer_isotherm.txt",
        "-s", "demo/spacer.toml", option, str(disk / f"out{suffix}"),
    ]  # fmt: skip
    done = subprocess.run(
        ["unshare", "-rm", "sh", "-c", SMALL_DISK, "sh", str(disk), BYTES[option], *command],
        cwd=ROOT, capture_output=True, text=True, timeout=100,
    )  # fmt: skip
    if "status" not in done.stdout:
        pytest.skip("may not mount a file system here")
    assert done.stdout.splitlines()[-1] == "status 1"  # and no file is listed after it
    assert "No space left on device; free some space" in done.stderr
    assert done.stderr.count("\n") == 1


def test_a_limit_on_file_size_is_one_clear_line(tmp_path: Path) -> None:
    """The system itself refuses to write on, as a full disk does."""
    limited = (
        "import resource, signal\n"
        "signal.signal(signal.SIGXFSZ, signal.SIG_IGN)\n"
        "resource.setrlimit(resource.RLIMIT_FSIZE, (2000, 2000))\n"
        "from cli.main import run\n"
        f"raise SystemExit(run(['sheet', {str(tmp_path / 'run.toml')!r}]))\n"
    )
    done = subprocess.run(
        [sys.executable, "-c", limited], cwd=ROOT, capture_output=True, text=True, timeout=60
    )
    assert done.returncode == 1
    assert done.stderr.startswith("upstroke: ")
    assert "cannot be written: File too large" in done.stderr
    assert done.stderr.count("\n") == 1
    assert names(tmp_path) == set()
