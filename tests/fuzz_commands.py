"""Try whole commands on damaged runs and report anything that is neither a result nor a refusal.

    python tests/fuzz_commands.py --inputs 100000 --jobs 2 --seed 1
    python tests/fuzz_commands.py --coverage --minutes 60

Every input is a small run for one of the commands with its columns, rows, run sheet, evidence or bytes
damaged, given to the command line in this process with warnings as errors. Wanted
is status 0 with JSON free of NaN, or one line of refusal; anything else is written down as a finding, to
become a test; so is an input that takes longer than `SLOW`. With `--coverage` (where the package atheris is
installed) the bytes of the export are chosen by the code they reach.
"""

from __future__ import annotations

import argparse
import collections
import contextlib
import hashlib
import io
import json
import os
import random
import shutil
import sys
import tempfile
import time
import traceback
import warnings
from pathlib import Path
from typing import NoReturn

for _name in ("OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS"):
    os.environ[_name] = "1"  # as the program itself does
os.environ["UPSTROKE_DEBUG"] = "1"  # faults come out with their traceback

sys.path[:0] = [
    str(Path(__file__).resolve().parent / "support"),
    str(Path(__file__).resolve().parent.parent),
]

from hostile_inputs import mutated  # noqa: E402
from hostile_runs import Run, damaged, seed_runs  # noqa: E402
from watchdog import TookTooLong, time_limit  # noqa: E402
from watched_code import watch  # noqa: E402

from cli.main import run as run_command  # noqa: E402
from isotherm.errors import UpstrokeError  # noqa: E402

WIDTH = 80
SLOW = 5.0  # s of processor time for one small input


def _no_constant(name: str) -> NoReturn:
    raise ValueError(f"JSON holds {name}")


class Bench:
    """A folder to try inputs in; `attempt` gives the outcome, or the traceback of what should not be."""

    def __init__(self, folder: Path) -> None:
        self.folder = folder
        self.data = folder / "run.csv"
        self.sheet = folder / "run.toml"
        self.evidence = folder / "evidence.toml"
        self.others: list[Path] = []

    def write(self, run: Run, data: bytes | None = None) -> None:
        """Put the input where the commands find it."""
        self.data.write_bytes(run.text().encode() if data is None else data)
        self.sheet.write_text(run.sheet, encoding="utf-8")
        self.evidence.write_text(run.evidence, encoding="utf-8", errors="replace")
        self.others = []
        for number, (export, sheet) in enumerate(run.others):
            path = self.folder / f"other{number}.csv"
            path.write_text(export, encoding="utf-8")
            path.with_suffix(".toml").write_text(sheet, encoding="utf-8")
            self.others.append(path)

    def attempt(self, run: Run, data: bytes | None = None, more: tuple[str, ...] = ()) -> str:
        """Return "done", "refused", "usage", or a traceback."""
        self.write(run, data)
        try:
            with time_limit(SLOW):
                return self._evidence() if run.command == "evidence" else self._command(run, more)
        except (Exception, TookTooLong):
            return traceback.format_exc()

    def _command(self, run: Run, more: tuple[str, ...]) -> str:
        out, err = io.StringIO(), io.StringIO()
        argv = [run.command, *map(str, (self.data, *self.others))]
        if not run.others:  # else each run has the sheet beside it
            argv += ["-s", str(self.sheet)]
        if run.evidence:
            argv += ["-e", str(self.evidence)]
        argv += more or ("--json", "-")
        with contextlib.redirect_stdout(out), contextlib.redirect_stderr(err):
            status = run_command(argv)
        said = err.getvalue()
        if status == 0 or (run.command == "audit" and status == 3):
            if not more:
                json.loads(out.getvalue(), parse_constant=_no_constant)
            elif wide := [line for line in out.getvalue().splitlines() if len(line) > WIDTH]:
                wide = [line for line in wide if str(self.folder) not in line]
                if wide:
                    raise AssertionError(f"wider than {WIDTH} columns: {wide[0]}")
            return "done"
        if status == 2:
            return "usage"
        if status != 1 or said.count("\n") != 1 or "Traceback" in said or "fault in" in said:
            raise AssertionError(f"status {status}: {said}")
        return "refused"

    def _evidence(self) -> str:
        import isotherm
        import transfer
        from cli.evidence_text import evidence_text
        from cli.serialise import json_bytes

        try:
            sheet = isotherm.read_sheet(self.sheet)
            build = transfer.analyse_log(transfer.read_log(self.data, sheet), sheet)
            result = transfer.evidence_for(self.evidence, build, sheet)
        except UpstrokeError as error:
            if "\n" in str(error):
                raise AssertionError(str(error)) from error
            return "refused"
        evidence_text(result, 80)
        json.loads(json_bytes(result.to_json()), parse_constant=_no_constant)
        return "done"


_FILES: tuple[tuple[str, ...], ...] = (
    ("--csv", "out.csv"), ("--report", "out.html"), ("--figure", "out.svg"),
)  # fmt: skip


def _worker(
    seed: int, inputs: int, seconds: float, findings: Path
) -> tuple[int, dict[str, int], int]:
    warnings.simplefilter("error")
    rng = random.Random(seed)
    seeds = seed_runs()
    outcomes: collections.Counter[str] = collections.Counter()
    found = 0
    end = time.monotonic() + seconds
    place = tempfile.mkdtemp(dir="/dev/shm" if os.path.isdir("/dev/shm") else None)
    os.chdir(place)
    bench = Bench(Path(place))
    done = 0
    for done in range(1, inputs + 1):
        if time.monotonic() > end:
            break
        sound = rng.choice(seeds)
        run = damaged(sound, rng)
        data = mutated(rng, [run.text().encode()]) if rng.random() < 0.2 else None
        more: tuple[str, ...] = ()
        if run.command != "evidence" and rng.random() < 0.1:
            kind = rng.choice((*_FILES, ()))
            more = (*kind, "--force") if kind else ("--force",)  # the last prints the table
        outcome = bench.attempt(run, data, more)
        label = outcome if outcome in ("done", "refused", "usage") else "finding"
        outcomes[f"{run.command} {label}"] += 1
        if label == "finding":
            found += 1
            home = findings / f"{seed}-{done}"
            home.mkdir(parents=True, exist_ok=True)
            bench.write(run, data)
            for file in (bench.data, bench.sheet, bench.evidence):
                shutil.copy(file, home)
            (home / "what.txt").write_text(f"{run.command} {more}\n{outcome}", encoding="utf-8")
    os.chdir("/")
    shutil.rmtree(place, ignore_errors=True)
    return done, dict(outcomes), found


def _by_coverage(findings: Path, seconds: float, command: str) -> None:
    """Hand one command to atheris, which picks the bytes of its export by the code they reach."""
    import atheris

    warnings.simplefilter("error")
    bench = Bench(Path(tempfile.mkdtemp()))
    sound = next(run for run in seed_runs() if run.command == command)

    def one(data: bytes) -> None:
        outcome = bench.attempt(sound, data)
        if outcome not in ("done", "refused", "usage"):
            name = findings / f"{command}-{hashlib.blake2b(data, digest_size=6).hexdigest()}"
            name.with_suffix(".bin").write_bytes(data)
            name.with_suffix(".txt").write_text(outcome, encoding="utf-8")

    bench.attempt(sound)  # imports what is to be watched
    watch()
    corpus = findings / f"corpus-{command}"
    corpus.mkdir(parents=True, exist_ok=True)
    rng = random.Random(1)
    (corpus / "sound").write_text(sound.text(), encoding="utf-8")
    for number in range(40):
        (corpus / f"damaged-{number}").write_text(damaged(sound, rng).text(), encoding="utf-8")
    limits = ["-max_len=8000", f"-max_total_time={int(min(seconds, 1e8))}"]
    atheris.Setup([sys.argv[0], f"-artifact_prefix={findings}/", *limits, str(corpus)], one)
    atheris.Fuzz()


def main() -> int:
    """Run from the command line; exit 1 when anything was found."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--inputs", type=int, default=2_000)
    parser.add_argument("--minutes", type=float, default=1e9)
    parser.add_argument("--seed", type=int, default=1)
    parser.add_argument("--jobs", type=int, default=1)
    parser.add_argument(
        "--findings", type=Path, default=Path(tempfile.gettempdir()) / "command-findings"
    )
    parser.add_argument("--coverage", action="store_true")
    parser.add_argument("--command", default="isotherm", help="which one, with --coverage")
    options = parser.parse_args()
    options.findings = options.findings.resolve()
    options.findings.mkdir(parents=True, exist_ok=True)
    if options.coverage:
        _by_coverage(options.findings, options.minutes * 60.0, options.command)
        return 0
    begin = time.monotonic()
    share = -(-options.inputs // options.jobs)
    tasks = [
        (options.seed * 1000 + job, share, options.minutes * 60.0, options.findings)
        for job in range(options.jobs)
    ]
    if options.jobs == 1:
        results = [_worker(*tasks[0])]
    else:
        from concurrent.futures import ProcessPoolExecutor

        with ProcessPoolExecutor(options.jobs) as pool:
            results = list(pool.map(_worker, *zip(*tasks, strict=True)))
    tried = sum(result[0] for result in results)
    found = sum(result[2] for result in results)
    outcomes: collections.Counter[str] = collections.Counter()
    for result in results:
        outcomes.update(result[1])
    print(f"{tried} runs in {time.monotonic() - begin:.0f} s")
    for name, count in sorted(outcomes.items()):
        print(f"  {name:20s} {count}")
    print(f"findings: {found}" + (f", in {options.findings}" if found else ""))
    return 1 if found else 0


if __name__ == "__main__":
    sys.exit(main())
