"""What the terminal is given: plain signs where it has no others, colour where it wants some, progress."""

from __future__ import annotations

import errno
import io
import json
import sys
from pathlib import Path

import numpy as np
import pytest

from cli.main import run
from cli.serialise import csv_bytes, input_stamp, json_bytes
from cli.several import run_each
from cli.terminal import NARROWEST, WIDEST, paint_heading, say, terminal_width
from isotherm.errors import UpstrokeError


class Screen(io.TextIOWrapper):
    """A stream that a person watches."""

    def isatty(self) -> bool:
        return True


def watched(monkeypatch: pytest.MonkeyPatch) -> Screen:
    """Make standard output and error such a stream."""
    stream = Screen(io.BytesIO(), encoding="ascii", newline="\n")
    monkeypatch.setattr(sys, "stdout", stream)
    monkeypatch.setattr(sys, "stderr", stream)
    monkeypatch.setenv("TERM", "xterm")
    monkeypatch.delenv("NO_COLOR", raising=False)
    monkeypatch.delenv("COLUMNS", raising=False)
    return stream


def shown(stream: Screen) -> str:
    stream.flush()
    buffer = stream.buffer
    assert isinstance(buffer, io.BytesIO)
    return buffer.getvalue().decode("ascii")


def test_signs_a_terminal_lacks_become_plain_ones(monkeypatch: pytest.MonkeyPatch) -> None:
    screen = watched(monkeypatch)
    say("0.20 ± 0.01 nm², 日\n")
    assert shown(screen) == "0.20 +/- 0.01 nm^2, \\u65e5\n"


def test_headings_are_bold_only_where_colour_is_wanted(
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    watched(monkeypatch)
    assert paint_heading("Title") == "\x1b[1mTitle\x1b[0m"
    monkeypatch.setenv("NO_COLOR", "1")
    assert paint_heading("Title") == "Title"
    monkeypatch.delenv("NO_COLOR")
    monkeypatch.setenv("TERM", "dumb")
    assert paint_heading("Title") == "Title"


def test_the_width_is_the_terminals_within_reason(
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    watched(monkeypatch)
    for columns, width in (("50", 50), ("5", NARROWEST), ("100000", WIDEST)):
        monkeypatch.setenv("COLUMNS", columns)
        assert terminal_width() == width


@pytest.mark.parametrize(
    ("number", "error"), [(errno.ENOSPC, UpstrokeError), (errno.EPIPE, BrokenPipeError)]
)
def test_output_that_cannot_be_written_is_told(
    number: int, error: type[Exception], monkeypatch: pytest.MonkeyPatch
) -> None:
    class Broken(io.StringIO):
        def flush(self) -> None:
            raise OSError(number, "no")

    monkeypatch.setattr(sys, "stdout", Broken())
    with pytest.raises(error):
        say("text")


def test_many_files_show_a_bar_to_who_watches(monkeypatch: pytest.MonkeyPatch) -> None:
    screen = watched(monkeypatch)
    done = run_each(range(6), lambda n: n * n, keep_going=False)
    assert done.results == [0, 1, 4, 9, 16, 25]
    said = shown(screen)
    assert "runs" in said
    run_each(range(2), lambda n: n, keep_going=False)  # too few for a bar
    assert shown(screen) == said


def halved(number: int) -> int:
    if number % 2:
        raise UpstrokeError("is odd", where=str(number))
    return number // 2


def test_bad_items_end_the_work_or_are_named_and_left_out(
    capsys: pytest.CaptureFixture[str],
) -> None:
    found = run_each([2, 3, 4], halved, keep_going=True)
    assert (found.done, found.results, found.failed) == ([2, 4], [1, 2], 1)
    assert capsys.readouterr().err == "upstroke: 3: is odd\n"
    with pytest.raises(UpstrokeError, match="is odd"):
        run_each([2, 3, 4], halved, keep_going=False)
    with pytest.raises(UpstrokeError, match="none of the files"):
        run_each([1, 3], halved, keep_going=True)


def test_json_takes_what_results_hold_and_nothing_else() -> None:
    value = {"a": (1.5, float("nan")), "p": Path("x"), "n": np.float64(2.0), "v": np.arange(2)}
    assert json.loads(json_bytes(value)) == {"a": [1.5, None], "p": "x", "n": 2.0, "v": [0, 1]}
    with pytest.raises(TypeError, match="JSON has no form"):
        json_bytes({"a": object()})


def test_csv_cells() -> None:
    rows = [[None, True, 3, 1.23456789, float("inf"), "=1", "a\n"]]
    assert csv_bytes(["+x"] * 7, rows).decode().splitlines() == [
        ",".join(["'+x"] * 7), ",True,3,1.234568,,'=1,a\\n",
    ]  # fmt: skip


def test_an_input_that_is_gone_has_no_stamp(tmp_path: Path) -> None:
    with pytest.raises(UpstrokeError, match="cannot be read: No such file"):
        input_stamp(tmp_path / "gone")


def test_a_sheet_is_written_once_printed_and_replaced_only_by_force(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    path = tmp_path / "run.toml"
    assert run(["sheet"]) == 0
    printed = capsys.readouterr().out
    assert run(["sheet", str(path)]) == 0
    assert path.read_text("utf-8") == printed
    assert "fill it in" in capsys.readouterr().out
    path.write_text("mine")
    assert run(["sheet", str(path)]) == 1
    assert "--force" in capsys.readouterr().err
    assert path.read_text() == "mine"
    assert run(["sheet", str(path), "--force"]) == 0
    assert path.read_text("utf-8") == printed
