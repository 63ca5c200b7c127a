"""Where a command's output goes: paths checked before any work, files written whole at the end."""

from __future__ import annotations

import os
import stat
import unicodedata
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from pathlib import Path

import typer

from cli.terminal import say
from cli.whole import StagedFiles
from isotherm.errors import UpstrokeError

__all__ = [
    "FIGURE_SUFFIXES",
    "OutputChoice",
    "OutputPlan",
    "Renderers",
    "check_target",
    "plan_outputs",
]

FIGURE_SUFFIXES = (".svg", ".png", ".pdf")


@dataclass(frozen=True)
class OutputChoice:
    """What the user asked for: paths as typed, None where not asked; `json` may be "-"."""

    json: str | None = None
    csv: Path | None = None
    figure: Path | None = None
    report: Path | None = None
    force: bool = False


@dataclass(frozen=True)
class Renderers:
    """How to make each output; called only for those asked for, all before any is written."""

    text: Callable[[], str]
    json: Callable[[], bytes]
    csv: Callable[[], bytes] | None = None
    figure: Callable[[str], bytes] | None = None  # takes the format: svg, png, pdf
    report: Callable[[], bytes] | None = None


@dataclass(frozen=True)
class OutputPlan:
    """Checked targets (symbolic links resolved), None where an output is not asked for."""

    json: Path | None
    json_to_stdout: bool
    csv: Path | None
    figure: Path | None
    report: Path | None
    force: bool

    def keep_off(self, inputs: Sequence[Path]) -> None:
        """Refuse targets that are inputs named by another input, known only once that is read.

        Raises
        ------
        UpstrokeError
            A target is one of `inputs` or its twin.
        """
        targets = {
            "--json": self.json,
            "--csv": self.csv,
            "--figure": self.figure,
            "--report": self.report,
        }
        for option, target in targets.items():
            if target is not None:
                _keep_off(option, target, target, inputs)

    def deliver(self, renderers: Renderers) -> None:
        """Render everything asked for, then write it: all of it, or nothing.

        The text goes to standard output unless the JSON does.

        Raises
        ------
        UpstrokeError
            Something cannot be written.
        """
        files: list[tuple[Path, bytes]] = []
        json = renderers.json() if self.json or self.json_to_stdout else b""
        if self.json is not None:
            files.append((self.json, json))
        if self.csv is not None and renderers.csv is not None:
            files.append((self.csv, renderers.csv()))
        if self.figure is not None and renderers.figure is not None:
            files.append((self.figure, renderers.figure(self.figure.suffix.lower()[1:])))
        if self.report is not None and renderers.report is not None:
            files.append((self.report, renderers.report()))
        spoken = json.decode() if self.json_to_stdout else renderers.text()
        with StagedFiles(replace=self.force) as staged:
            for target, data in files:
                staged.add(target, data)
            # what standard output took cannot be taken back, so it comes before the files get names
            say(spoken)
            staged.commit()


def plan_outputs(choice: OutputChoice, inputs: Sequence[Path]) -> OutputPlan:
    """Check every output path before work starts.

    Parameters
    ----------
    choice : OutputChoice
        What was asked for.
    inputs : sequence of Path
        Every file the command reads.

    Returns
    -------
    OutputPlan
        The targets, symbolic links resolved.

    Raises
    ------
    UpstrokeError
        A target is an input or its twin, exists (without --force), is named twice, is no regular
        file, or its directory is missing or closed to the user.
    typer.BadParameter
        Wrong usage: a figure of no known format.
    """
    wanted: dict[str, Path] = {}
    if choice.json is not None and choice.json != "-":
        wanted["--json"] = Path(choice.json)
    for option, path in (
        ("--csv", choice.csv),
        ("--figure", choice.figure),
        ("--report", choice.report),
    ):
        if path is not None:
            wanted[option] = path
    if choice.figure is not None and choice.figure.suffix.lower() not in FIGURE_SUFFIXES:
        raise typer.BadParameter(
            f"'{choice.figure}' must end in {', '.join(FIGURE_SUFFIXES)}", param_hint="--figure"
        )
    targets: dict[str, Path] = {}
    for option, path in wanted.items():
        if str(path) == "-":
            raise typer.BadParameter("only --json can go to standard output", param_hint=option)
        target = _resolved(path)
        _keep_off(option, path, target, inputs)
        for other, earlier in targets.items():
            if _same_place(target, earlier):
                raise UpstrokeError(
                    f"is the same file as {other}",
                    where=f"{option} {path}",
                    remedy="name a file for each",
                )
        _check_free(path, target, force=choice.force)
        targets[option] = target
    return OutputPlan(
        json=targets.get("--json"),
        json_to_stdout=choice.json == "-",
        csv=targets.get("--csv"),
        figure=targets.get("--figure"),
        report=targets.get("--report"),
        force=choice.force,
    )


def _keep_off(option: str, path: Path, target: Path, inputs: Sequence[Path]) -> None:
    for source in inputs:
        if _same_place(target, source):
            raise UpstrokeError(
                f"is the input {source}" if target != source else "is an input",
                where=f"{option} {path}",
                remedy="inputs are never written to: name another file",
            )


def check_target(path: Path, *, force: bool) -> Path:
    """Return the place a single output goes to, after the checks that need no inputs.

    Raises
    ------
    UpstrokeError
        It exists (without `force`), is no regular file, or its directory is missing or closed.
    """
    target = _resolved(path)
    _check_free(path, target, force=force)
    return target


def _resolved(path: Path) -> Path:
    """Return the place `path` stands for, symbolic links followed."""
    if "\0" in str(path):
        raise UpstrokeError("a file name cannot hold a null character", remedy="name another file")
    try:
        return path.resolve()
    except (OSError, RuntimeError) as error:
        reason = getattr(error, "strerror", None) or "its symbolic links go round in a circle"
        raise UpstrokeError(
            f"cannot be used: {reason}", where=str(path), remedy="name another file"
        ) from error


def _check_free(path: Path, target: Path, *, force: bool) -> None:
    """Refuse a place where no file can be put."""
    where = str(path)
    mode = target.lstat().st_mode if os.path.lexists(target) else None
    if mode is not None and stat.S_ISDIR(mode):
        raise UpstrokeError("is a directory", where=where, remedy="name a file in it")
    if mode is not None and not stat.S_ISREG(mode):
        raise UpstrokeError(
            "is not a regular file", where=where, remedy="name a file, or use --json - for a pipe"
        )
    if mode is not None and not force:
        raise UpstrokeError(
            "exists already", where=where, remedy="add --force to replace it or name another file"
        )
    folder = target.parent
    if not folder.is_dir():
        raise UpstrokeError(
            f"its directory {folder} does not exist", where=where, remedy="make it first"
        )
    if not os.access(folder, os.W_OK | os.X_OK):
        raise UpstrokeError(
            f"its directory {folder} is closed to you",
            where=where,
            remedy="name a file in a directory you may write to",
        )


def _folded(name: str) -> str:
    """Fold a file name as the least discerning file systems do (case, Unicode composition)."""
    return unicodedata.normalize("NFC", unicodedata.normalize("NFC", name).casefold())


def _same_place(target: Path, other: Path) -> bool:
    """Say whether two paths are one file, or would be on a disk blind to case or composition."""
    try:
        if os.path.samefile(target, other):
            return True
    except OSError:
        pass  # one of them does not exist
    for place in (other, Path(os.path.realpath(other))):
        if _folded(target.name) == _folded(place.name):
            try:
                if os.path.samefile(target.parent, place.absolute().parent):
                    return True
            except OSError:
                continue
    return False
