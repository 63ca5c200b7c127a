"""From paths to analysed isotherms: folders, each run's own sheet, several processes."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any

from cli.several import Outcomes, run_each
from isotherm.errors import UpstrokeError

if TYPE_CHECKING:
    from isotherm.result import IsothermResult
    from isotherm.sheet import RunSheet

__all__ = [
    "Run",
    "analyse_runs",
    "analysed",
    "find_runs",
    "run_inputs",
    "run_settings",
    "run_sheet",
]

# What a folder of runs is searched for.
EXPORT_SUFFIXES = (".txt", ".csv", ".tsv", ".dat", ".asc", ".xlsx")


@dataclass(frozen=True)
class Run:
    """One trace to analyse: the sheet that goes with it, columns told by option, pressures asked."""

    trace: Path
    sheet: Path | None
    columns: tuple[str, ...] = ()
    at: tuple[float, ...] = (10.0, 20.0, 30.0, 40.0)

    def __str__(self) -> str:
        return str(self.trace)


def find_runs(
    traces: Sequence[Path],
    sheet: Path | None,
    columns: Sequence[str] | None,
    at: tuple[float, ...] = (10.0, 20.0, 30.0, 40.0),
    *,
    own_sheets: bool = False,
) -> list[Run]:
    """Name every run: a folder stands for the exports in it, by name.

    Parameters
    ----------
    traces : sequence of Path
        Files and folders.
    sheet : Path or None
        The sheet common to all runs.
    columns : sequence of str or None
        `--column` options.
    at : tuple of float
        Pressures to report area and modulus at, mN/m.
    own_sheets : bool
        Whether a sheet beside a trace (run7.toml for run7.txt) goes before the common one.

    Raises
    ------
    UpstrokeError
        A folder holds no export.
    """
    runs: list[Run] = []
    for path in traces:
        files = [path]
        if path.is_dir():
            files = sorted(f for f in path.iterdir() if f.suffix.lower() in EXPORT_SUFFIXES)
            if not files:
                raise UpstrokeError(
                    "holds no export",
                    where=str(path),
                    remedy=f"name the files, or let them end in {', '.join(EXPORT_SUFFIXES)}",
                )
        for file in files:
            beside = file.with_suffix(".toml")
            mine = beside if own_sheets and beside != file and beside.is_file() else sheet
            runs.append(Run(file, mine, tuple(columns or ()), at))
    return runs


def run_inputs(runs: Sequence[Run]) -> list[Path]:
    """Return every file the runs read."""
    return [*(run.trace for run in runs), *dict.fromkeys(run.sheet for run in runs if run.sheet)]


def run_sheet(run: Run) -> RunSheet:
    """Read the sheet of one run, with its column options laid over it."""
    from cli.inputs import load_sheet

    return load_sheet(run.sheet, list(run.columns))


def analysed(run: Run) -> IsothermResult:
    """Read and analyse one run."""
    from isotherm.analysis import analyse
    from isotherm.trace_read import read_trace

    return analyse(read_trace(run.trace, run_sheet(run)), at=run.at)


def analyse_runs(
    runs: Sequence[Run], *, keep_going: bool, jobs: int
) -> Outcomes[Run, IsothermResult]:
    """Analyse every run, in order; a bad sheet or column option is told before any work."""
    for one in dict.fromkeys((run.sheet, run.columns) for run in runs):
        run_sheet(Run(Path(), *one))
    return run_each(runs, analysed, keep_going=keep_going, jobs=jobs)


def run_settings(command: str, runs: Sequence[Run], **others: Any) -> dict[str, Any]:
    """Return what the JSON records of the options: sheets with their hashes, columns, and others."""
    from cli.serialise import input_stamp

    stamps = {sheet: input_stamp(sheet) for sheet in dict.fromkeys(r.sheet for r in runs) if sheet}
    settings: dict[str, Any] = {"command": command, **others}
    if len({run.sheet for run in runs}) <= 1:
        settings["sheet"] = next(iter(stamps.values()), None)
    else:
        settings["sheets"] = [None if r.sheet is None else stamps[r.sheet] for r in runs]
    if runs and runs[0].columns:
        settings["columns"] = list(runs[0].columns)
    return settings
