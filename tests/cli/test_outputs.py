"""Outputs go where they were asked to, whole or not at all, and never onto an input."""

from __future__ import annotations

import errno
import os
import shutil
import signal
import stat
import subprocess
import sys
import unicodedata
from pathlib import Path

import pytest
import typer

from cli.outputs import OutputChoice, Renderers, plan_outputs
from cli.whole import StagedFiles
from isotherm.errors import UpstrokeError

ROOT = Path(__file__).resolve().parents[2]


@pytest.fixture
def trace(tmp_path: Path) -> Path:
    path = tmp_path / "trace.txt"
    path.write_text("area,pressure\n1,2\n")
    return path


def names(folder: Path) -> set[str]:
    return {entry.name for entry in folder.iterdir()}


def refusal(choice: OutputChoice, *inputs: Path) -> str:
    with pytest.raises(UpstrokeError) as caught:
        plan_outputs(choice, inputs)
    text = str(caught.value)
    assert "\n" not in text
    return text


def renderers(data: bytes = b"{}\n") -> Renderers:
    return Renderers(
        text=lambda: "a table\n",
        json=lambda: data,
        csv=lambda: b"a,b\n",
        figure=lambda suffix: f"a {suffix}".encode(),
    )


# ---- where an output may go


def test_the_input_itself_is_refused_even_with_force(trace: Path) -> None:
    for force in (False, True):
        text = refusal(OutputChoice(csv=trace, force=force), trace)
        assert "input" in text
        assert "never written to" in text


def test_a_symbolic_link_to_the_input_is_refused(trace: Path) -> None:
    link = trace.with_name("out.json")
    link.symlink_to(trace)
    assert "input" in refusal(OutputChoice(json=str(link), force=True), trace)


def test_a_hard_link_to_the_input_is_refused(trace: Path) -> None:
    link = trace.with_name("out.json")
    link.hardlink_to(trace)
    assert "input" in refusal(OutputChoice(json=str(link), force=True), trace)


def test_the_input_by_another_road_is_refused(trace: Path, tmp_path: Path) -> None:
    other = tmp_path / "elsewhere"
    other.symlink_to(tmp_path, target_is_directory=True)
    assert "input" in refusal(OutputChoice(csv=other / "trace.txt", force=True), trace)


def test_a_case_twin_of_the_input_is_refused(trace: Path) -> None:
    twin = trace.with_name("TRACE.TXT")
    assert "input" in refusal(OutputChoice(csv=twin, force=True), trace)


def test_a_composition_twin_of_the_input_is_refused(tmp_path: Path) -> None:
    source = tmp_path / unicodedata.normalize("NFD", "säure.csv")
    source.write_text("1,2\n")
    twin = tmp_path / unicodedata.normalize("NFC", "säure.csv")
    assert "input" in refusal(OutputChoice(csv=twin, force=True), source)


def test_a_twin_name_in_another_directory_is_allowed(trace: Path, tmp_path: Path) -> None:
    folder = tmp_path / "results"
    folder.mkdir()
    plan = plan_outputs(OutputChoice(csv=folder / "trace.txt"), [trace])
    assert plan.csv == folder / "trace.txt"


def test_an_existing_file_needs_force(trace: Path, tmp_path: Path) -> None:
    old = tmp_path / "old.csv"
    old.write_text("old")
    assert "--force" in refusal(OutputChoice(csv=old), trace)
    plan_outputs(OutputChoice(csv=old, force=True), [trace]).deliver(renderers())
    assert old.read_text() == "a,b\n"


@pytest.mark.parametrize("force", [False, True])
def test_a_directory_is_refused(trace: Path, tmp_path: Path, force: bool) -> None:
    assert "is a directory" in refusal(OutputChoice(csv=tmp_path, force=force), trace)


def test_a_device_is_refused_even_with_force(trace: Path) -> None:
    assert "not a regular file" in refusal(OutputChoice(json=os.devnull, force=True), trace)


def test_a_missing_directory_is_refused(trace: Path, tmp_path: Path) -> None:
    assert "does not exist" in refusal(OutputChoice(csv=tmp_path / "no" / "out.csv"), trace)


def test_a_file_for_a_directory_is_refused(trace: Path) -> None:
    refusal(OutputChoice(csv=trace / "out.csv"), trace)


def test_a_circle_of_links_is_refused(trace: Path, tmp_path: Path) -> None:
    (tmp_path / "a").symlink_to(tmp_path / "b")
    (tmp_path / "b").symlink_to(tmp_path / "a")
    refusal(OutputChoice(csv=tmp_path / "a"), trace)


def test_one_path_for_two_outputs_is_refused(trace: Path, tmp_path: Path) -> None:
    choice = OutputChoice(json=str(tmp_path / "out.svg"), figure=tmp_path / "OUT.svg")
    assert "same file as --json" in refusal(choice, trace)


@pytest.mark.skipif(os.geteuid() == 0, reason="the superuser may write anywhere")
def test_a_closed_directory_is_refused(trace: Path, tmp_path: Path) -> None:
    closed = tmp_path / "closed"
    closed.mkdir(mode=0o500)
    assert "closed to you" in refusal(OutputChoice(csv=closed / "out.csv"), trace)


def test_a_closed_directory_is_told_by_its_permissions(
    trace: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(os, "access", lambda *_: False)
    assert "closed to you" in refusal(OutputChoice(csv=tmp_path / "out.csv"), trace)


def test_an_unknown_figure_format_is_wrong_usage(trace: Path, tmp_path: Path) -> None:
    with pytest.raises(typer.BadParameter, match=r"\.svg, \.png, \.pdf"):
        plan_outputs(OutputChoice(figure=tmp_path / "out.bmp"), [trace])


def test_only_json_goes_to_standard_output(trace: Path) -> None:
    with pytest.raises(typer.BadParameter, match="only --json"):
        plan_outputs(OutputChoice(csv=Path("-")), [trace])


# ---- whole or not at all


def test_everything_is_written_and_the_table_printed(
    trace: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    choice = OutputChoice(
        json=str(tmp_path / "o.json"), csv=tmp_path / "o.csv", figure=tmp_path / "o.PNG"
    )
    plan_outputs(choice, [trace]).deliver(renderers())
    assert capsys.readouterr().out == "a table\n"
    assert names(tmp_path) == {"trace.txt", "o.json", "o.csv", "o.PNG"}
    assert (tmp_path / "o.PNG").read_bytes() == b"a png"
    assert trace.read_text() == "area,pressure\n1,2\n"


def test_json_on_standard_output_is_alone_there(
    trace: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    plan_outputs(OutputChoice(json="-"), [trace]).deliver(renderers(b'{"a": 1}\n'))
    assert capsys.readouterr().out == '{"a": 1}\n'


def test_new_files_have_the_usual_permissions(trace: Path, tmp_path: Path) -> None:
    usual = tmp_path / "usual"
    usual.touch()
    plan_outputs(OutputChoice(csv=tmp_path / "o.csv"), [trace]).deliver(renderers())
    assert stat.S_IMODE((tmp_path / "o.csv").stat().st_mode) == stat.S_IMODE(usual.stat().st_mode)


def test_a_replaced_file_keeps_its_permissions(trace: Path, tmp_path: Path) -> None:
    old = tmp_path / "o.csv"
    old.touch(mode=0o640)
    old.chmod(0o640)
    plan_outputs(OutputChoice(csv=old, force=True), [trace]).deliver(renderers())
    assert stat.S_IMODE(old.stat().st_mode) == 0o640


def test_a_renderer_that_fails_leaves_nothing(trace: Path, tmp_path: Path) -> None:
    def broken(suffix: str) -> bytes:
        raise UpstrokeError("cannot be drawn")

    work = Renderers(text=str, json=lambda: b"{}\n", csv=lambda: b"a\n", figure=broken)
    choice = OutputChoice(csv=tmp_path / "o.csv", figure=tmp_path / "o.svg")
    with pytest.raises(UpstrokeError, match="cannot be drawn"):
        plan_outputs(choice, [trace]).deliver(work)
    assert names(tmp_path) == {"trace.txt"}


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
