"""The outputs of every command that reads files, on runs whose names and words would do harm."""

from __future__ import annotations

import csv
import errno
import io
import json
import os
import sys
from collections.abc import Callable, Iterator
from dataclasses import fields, replace
from functools import cache
from pathlib import Path
from typing import Any
from xml.etree import ElementTree

import pytest
from every_command import Invocation, every_command
from page_outline import outline

from cli.main import COMMANDS, run
from cli.outputs import OutputPlan, Renderers
from cli.serialise import FORMULA_STARTS
from isotherm.errors import UpstrokeError

OUTPUTS = {"--json": "out.json", "--csv": "out.csv", "--figure": "out.svg", "--report": "out.html"}
WITHOUT = {"batch": {"--figure"}, "report": {"--figure"}}
READERS = sorted(set(COMMANDS) - {"sheet"})


@pytest.fixture(scope="module")
def calls(tmp_path_factory: pytest.TempPathFactory) -> dict[str, Invocation]:
    found = every_command(tmp_path_factory.mktemp("every"))
    assert sorted(found) == READERS
    return found


@pytest.fixture(params=READERS)
def call(request: pytest.FixtureRequest, calls: dict[str, Invocation]) -> Invocation:
    return calls[request.param]


def options(call: Invocation) -> dict[str, str]:
    return {k: v for k, v in OUTPUTS.items() if k not in WITHOUT.get(call.command, set())}


def held(call: Invocation) -> dict[Path, tuple[bytes, int]]:
    """The inputs' bytes and when they were last written."""
    return {p: (p.read_bytes(), p.stat().st_mtime_ns) for p in (*call.files, *call.late)}


def refused(argv: list[str], capsys: pytest.CaptureFixture[str]) -> str:
    assert run(argv) == 1, argv
    captured = capsys.readouterr()
    assert captured.out == ""
    assert captured.err.startswith("upstroke: ")
    assert captured.err.count("\n") == 1
    return captured.err


# ---- inputs


def twins(target: Path, place: Path) -> Iterator[Path]:
    """Other ways to name a file: links to it, and its name in the other case."""
    yield target
    for number, link in enumerate((place / "soft.out", place / "hard.out")):
        link.unlink(missing_ok=True)
        link.symlink_to(target) if number == 0 else link.hardlink_to(target)
        yield link
    yield target.with_name(target.name.swapcase())


def test_no_output_goes_to_an_input_or_its_twin(
    call: Invocation, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    before = held(call)
    listed = {path.parent: sorted(path.parent.iterdir()) for path in before}
    for option in options(call):
        if option == "--figure":
            continue  # its suffix keeps it off, and the next test
        for target in call.files:
            for twin in twins(target, tmp_path):
                argv = [*call.argv, option, str(twin), "--force"]
                assert "never written to" in refused(argv, capsys)
    assert held(call) == before
    assert {folder: sorted(folder.iterdir()) for folder in listed} == listed


def test_no_figure_goes_to_a_link_to_an_input(
    call: Invocation, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    if "--figure" not in options(call):
        pytest.skip("draws no figure")
    for number, target in enumerate(call.files):
        link = tmp_path / f"{number}.svg"
        link.symlink_to(target)
        text = refused([*call.argv, "--figure", str(link), "--force"], capsys)
        assert "never written to" in text


@pytest.mark.parametrize("command", ["audit", "report"])
def test_no_output_goes_to_a_file_that_an_input_names(
    command: str, calls: dict[str, Invocation], capsys: pytest.CaptureFixture[str]
) -> None:
    call = calls[command]
    before = held(call)
    assert call.late
    for target in call.late[:2]:
        argv = [*call.argv, "--csv", str(target), "--force"]
        assert "never written to" in refused(argv, capsys)
    assert held(call) == before


def test_what_exists_stays_without_force(
    call: Invocation, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    for option, name in options(call).items():
        old = tmp_path / name
        old.write_text("old")
        assert "--force" in refused([*call.argv, option, str(old)], capsys)
        assert old.read_text() == "old"


# ---- outputs

_opened: list[tuple[str, int]] = []
_watching = False


def _watch(event: str, arguments: tuple[Any, ...]) -> None:
    if _watching and event == "open" and not isinstance(arguments[0], int):
        _opened.append((os.fsdecode(arguments[0]), arguments[2]))


@cache  # a hook stays for the life of the process
def _hook() -> None:
    sys.addaudithook(_watch)


def remembered(renderers: Renderers) -> Renderers:
    """The same renderers, each asked once, so that what they made can be written again and again."""
    made = {f.name: getattr(renderers, f.name) for f in fields(renderers)}
    return replace(renderers, **{name: make and cache(make) for name, make in made.items()})


def spoiling_disk(monkeypatch: pytest.MonkeyPatch, files: int) -> None:
    """Let the disk be full once `files` files were written, in the middle of the next."""
    real, synced = os.fsync, 0

    def fsync(descriptor: int) -> None:
        nonlocal synced
        synced += 1
        real(descriptor)

    def write(descriptor: int, data: memoryview) -> int:
        if synced < files:
            return real_write(descriptor, data)
        if os.fstat(descriptor).st_size:
            raise OSError(errno.ENOSPC, os.strerror(errno.ENOSPC))
        return real_write(descriptor, data[: len(data) // 2])

    real_write: Callable[..., int] = os.write
    monkeypatch.setattr("cli.whole.os.fsync", fsync)
    monkeypatch.setattr("cli.whole.os.write", write)


def test_outputs_are_whole_or_absent_safe_and_leave_the_inputs_alone(
    call: Invocation,
    tmp_path: Path,
    monkeypatch: pytest.MonkeyPatch,
    capsys: pytest.CaptureFixture[str],
) -> None:
    global _watching
    deliver = OutputPlan.deliver
    wanted = options(call)

    def tried(plan: OutputPlan, renderers: Renderers) -> None:
        """Deliver to a disk that fills in the first, second, ... file, and only then to one with room."""
        kept = remembered(renderers)
        for full in range(len(wanted)):
            with monkeypatch.context() as patch:
                spoiling_disk(patch, full)
                with pytest.raises(UpstrokeError, match="No space left"):
                    deliver(plan, kept)
            assert list(tmp_path.iterdir()) == []
        deliver(plan, kept)

    monkeypatch.setattr(OutputPlan, "deliver", tried)
    before = held(call)
    paths = [word for option, name in wanted.items() for word in (option, str(tmp_path / name))]
    _hook()
    _opened.clear()
    _watching = True
    try:
        status = run([*call.argv, *paths])
    finally:
        _watching = False
    captured = capsys.readouterr()
    assert (status, captured.err) in ((0, ""), (3, ""))
    assert held(call) == before
    inputs = {str(path.resolve()) for path in before}
    for path, flags in _opened:
        if flags & (os.O_WRONLY | os.O_RDWR | os.O_TRUNC | os.O_APPEND):
            assert os.path.realpath(path) not in inputs, path
    assert {path.name for path in tmp_path.iterdir()} == set(wanted.values())
    for text in (captured.out, *(path.read_text("utf-8") for path in tmp_path.iterdir())):
        assert "\x1b" not in text
        assert "\u202e" not in text or text.startswith(("{", "["))  # JSON holds it as it is
    check_json(tmp_path / "out.json")
    check_csv(tmp_path / "out.csv")
    check_page(tmp_path / "out.html")
    if "--figure" in wanted:
        check_figure(tmp_path / "out.svg")


def check_json(path: Path) -> None:
    payload = json.loads(path.read_text("utf-8"), parse_constant=pytest.fail)
    assert payload["schema"].startswith("upstroke.")


def check_csv(path: Path) -> None:
    rows = list(csv.reader(io.StringIO(path.read_text("utf-8"))))
    assert len(rows) > 1
    for cell in (cell for row in rows for cell in row):
        if cell.startswith((*FORMULA_STARTS, "\t", "\r")):
            float(cell)  # a number with its sign is no formula


def check_page(path: Path) -> None:
    seen = outline(path.read_bytes())
    assert seen.handlers == []
    assert not seen.tags & {"img", "iframe", "object", "embed", "base", "form"}
    assert len([s for s in seen.scripts if s.get("type") != "application/json"]) == 1
    assert all(address.startswith(("#", "data:")) for address in seen.addresses)
    assert any("alert(" in text for text in seen.text)  # it is there, as text


def check_figure(path: Path) -> None:
    for element in ElementTree.parse(path).iter():
        assert not element.tag.endswith("script")
        for name, value in element.attrib.items():
            assert not name.rpartition("}")[2].startswith("on")
            assert "javascript:" not in value
