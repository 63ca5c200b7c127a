"""The frame of the command: help, exit statuses, one line for whatever goes wrong, start-up cost."""

from __future__ import annotations

import os
import subprocess
import sys
import time
from pathlib import Path
from types import SimpleNamespace

import pytest
import typer

import cli.main as frame
from cli.main import COMMANDS, Entry, run
from isotherm.errors import UpstrokeError

ROOT = Path(__file__).resolve().parents[2]


def shell(*argv: str, **environment: str) -> subprocess.CompletedProcess[str]:
    return subprocess.run(
        [sys.executable, "-m", "cli.main", *argv],
        cwd=ROOT,
        capture_output=True,
        text=True,
        timeout=120,
        env={**os.environ, "COLUMNS": "80", **environment},
    )


@pytest.fixture
def command(monkeypatch: pytest.MonkeyPatch):
    """Register a command `probe` that does what the test says."""

    def install(work) -> None:
        app = typer.Typer(add_completion=False, rich_markup_mode=None)
        app.command()(work)
        monkeypatch.setitem(COMMANDS, "probe", Entry("Probe", "probe", "Probe."))
        monkeypatch.setattr(frame, "import_module", lambda name: SimpleNamespace(app=app))

    return install


def raising(error: BaseException):
    def probe() -> None:
        raise error

    return probe


def test_help_lists_every_command_under_its_section(capsys: pytest.CaptureFixture[str]) -> None:
    assert run(["--help"]) == 0
    text = capsys.readouterr().out
    for name, entry in COMMANDS.items():
        assert f"  {name} " in text
        assert f"{entry.section}:" in text


@pytest.mark.parametrize("name", sorted(COMMANDS))
def test_each_command_has_help_with_an_example_and_the_summary_of_the_list(
    name: str, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setenv("COLUMNS", "80")
    assert run([name, "--help"]) == 0
    text = capsys.readouterr().out
    assert f"upstroke {name}" in text.partition("Example")[2]
    assert COMMANDS[name].summary in " ".join(text.split())
    assert all(len(line) <= 100 for line in text.splitlines())


def test_version(capsys: pytest.CaptureFixture[str]) -> None:
    assert run(["--version"]) == 0
    assert capsys.readouterr().out.startswith("upstroke 0.")


@pytest.mark.parametrize(
    "argv",
    [["nonsense"], ["--nonsense"], ["sheet", "--nonsense"], ["sheet", "a", "b"], ["isotherm"]],
)
def test_wrong_usage_is_status_2(argv: list[str], capsys: pytest.CaptureFixture[str]) -> None:
    assert run(argv) == 2
    assert capsys.readouterr().out == ""


def test_a_misspelt_command_is_answered_with_the_right_one(
    capsys: pytest.CaptureFixture[str],
) -> None:
    assert run(["isothrem"]) == 2
    assert "did you mean isotherm?" in capsys.readouterr().err


def test_a_refusal_is_one_line_and_status_1(command, capsys: pytest.CaptureFixture[str]) -> None:
    command(raising(UpstrokeError("no numbers", where="a\nb.txt", remedy="look at it")))
    assert run(["probe"]) == 1
    captured = capsys.readouterr()
    assert captured.err == "upstroke: a b.txt: no numbers; look at it\n"
    assert captured.out == ""


def test_no_input_drives_the_terminal(command, capsys: pytest.CaptureFixture[str]) -> None:
    command(raising(UpstrokeError("column '\x1b[2Jname\x07'")))
    run(["probe"])
    assert capsys.readouterr().err == "upstroke: column '\\x1b[2Jname\\x07'\n"


@pytest.mark.parametrize("error", [ValueError("a\nb"), RecursionError("deep"), KeyError("k")])
def test_a_fault_is_one_line_without_a_traceback(
    error: Exception,
    command,
    capsys: pytest.CaptureFixture[str],
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    monkeypatch.delenv("UPSTROKE_DEBUG", raising=False)
    command(raising(error))
    assert run(["probe"]) == 1
    text = capsys.readouterr().err
    assert text.startswith(f"upstroke: stopped by an unexpected {type(error).__name__}")
    assert "not in your data" in text
    assert text.count("\n") == 1


def test_a_fault_is_shown_in_full_to_who_asks(command, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("UPSTROKE_DEBUG", "1")
    command(raising(ValueError("deep inside")))
    with pytest.raises(ValueError, match="deep inside"):
        run(["probe"])


def test_too_little_memory_is_said_plainly(command, capsys: pytest.CaptureFixture[str]) -> None:
    command(raising(MemoryError()))
    assert run(["probe"]) == 1
    assert "not enough memory" in capsys.readouterr().err


def test_interruption_is_one_line_and_status_130(
    command, capsys: pytest.CaptureFixture[str]
) -> None:
    command(raising(KeyboardInterrupt()))
    assert run(["probe"]) == 130
    assert capsys.readouterr().err == "upstroke: interrupted\n"


def test_a_command_chooses_its_own_status(command) -> None:
    command(raising(typer.Exit(3)))
    assert run(["probe"]) == 3


def test_a_reader_that_goes_away_is_no_error_message() -> None:
    script = f"{sys.executable} -m cli.main sheet | head -c 10; echo ${{PIPESTATUS[0]}}"
    done = subprocess.run(
        ["bash", "-c", script], cwd=ROOT, capture_output=True, text=True, timeout=60
    )
    assert done.stderr == ""
    # head may also read to the end before it closes the pipe
    assert done.stdout.splitlines()[-1][-1] in "01"


@pytest.mark.skipif(not Path("/dev/full").exists(), reason="needs a device that is always full")
def test_a_full_standard_output_is_one_line() -> None:
    with Path("/dev/full").open("w") as full:
        done = subprocess.run(
            [sys.executable, "-m", "cli.main", "sheet"],
            cwd=ROOT,
            stdout=full,
            stderr=subprocess.PIPE,
            text=True,
            timeout=60,
        )
    assert done.returncode == 1
    assert done.stderr.startswith("upstroke: cannot write to standard output: No space left")
    assert done.stderr.count("\n") == 1


def test_a_terminal_without_unicode_gets_plain_signs() -> None:
    done = shell("sheet", PYTHONIOENCODING="ascii")
    assert done.returncode == 0
    assert '"1.00 +/- 0.01 mg/mL"' in done.stdout


def test_piped_output_has_no_colour_codes() -> None:
    assert "\x1b" not in shell("--help", TERM="xterm-256color").stdout


@pytest.mark.parametrize("argv", [["--help"], ["isotherm", "--help"], ["nonsense"]])
def test_help_imports_no_science(argv: list[str]) -> None:
    heavy = ("numpy", "pandas", "scipy", "matplotlib", "ruptures", "rich")
    script = (
        "import sys\nfrom cli.main import run\n"
        f"run({argv!r})\n"
        f"sys.stderr.write('LOADED ' + ' '.join(m for m in {heavy!r} if m in sys.modules))\n"
    )
    done = subprocess.run(
        [sys.executable, "-c", script], cwd=ROOT, capture_output=True, text=True, timeout=60
    )
    # some releases of typer import rich by themselves
    assert done.stderr.rpartition("LOADED ")[2].replace("rich", "").strip() == ""


HELLO = """
import typer
app = typer.Typer()
@app.command()
def hello(name: str = "film") -> None:
    "Say hello."
    print(name)
app()
"""


def test_help_starts_within_twice_a_bare_hello_world(tmp_path: Path) -> None:
    """Wall time against a typer program that does nothing, alternately, best of several."""
    hello = tmp_path / "hello.py"
    hello.write_text(HELLO)

    def seconds(*argv: str) -> float:
        start = time.perf_counter()
        subprocess.run(
            [sys.executable, *argv, "--help"], cwd=ROOT, stdout=subprocess.DEVNULL, check=True
        )
        return time.perf_counter() - start

    pairs = [(seconds("-m", "cli.main"), seconds(str(hello))) for _ in range(5)]
    ours, theirs = (min(column) for column in zip(*pairs, strict=True))
    assert ours <= 2.0 * theirs, f"{ours:.3f} s against {theirs:.3f} s"
