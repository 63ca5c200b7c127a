"""Try the reader on random and mutated inputs and report anything that is neither a result nor a refusal.

    python tests/fuzz_reader.py --inputs 1000000 --seed 1
    python tests/fuzz_reader.py --minutes 60

Each input is read as an export, as a trace and as a run sheet: half are damaged exports, three in ten are
damaged run sheets, the rest are piles of pieces that mean something to the reader. With `--coverage` (where
the package atheris is installed) inputs are chosen by the code they reach; without it they are random.
What is found is written beside the report, one file per finding, to become a test.
"""

from __future__ import annotations

import argparse
import collections
import hashlib
import importlib
import os
import random
import sys
import tempfile
import time
import traceback
import warnings
from collections.abc import Callable
from pathlib import Path

try:
    import resource
except ImportError:  # not every system has it
    resource = None  # type: ignore[assignment]

sys.path[:0] = [
    str(Path(__file__).resolve().parent / "support"),
    str(Path(__file__).resolve().parent.parent),
]

from hostile_inputs import PIECES, mutated, piled, seed_inputs  # noqa: E402
from hostile_runs import scrambled, seed_runs  # noqa: E402
from watchdog import TookTooLong, time_limit  # noqa: E402
from watched_code import watch  # noqa: E402

from isotherm.errors import UpstrokeError  # noqa: E402
from isotherm.sheet_read import parse_sheet, read_sheet  # noqa: E402
from isotherm.table import read_table  # noqa: E402
from isotherm.trace_read import read_trace  # noqa: E402

_SHEET = parse_sheet(
    '[film]\nmolar_mass = "300 g/mol"\nconcentration = "1 mg/mL"\nvolume = "50 µL"\n'
    '[subphase]\ntemperature = "20 degC"\n[trough]\nwidth = "75 mm"\nlargest_area = "240 cm^2"\n'
)
_SLOW = 2.0  # s of processor time for one reading of a small input
_READER = (
    "file_",
    "sheet",
    "table",
    "text_",
    "trace_",
    "unit",
    "water",
    "molecular",
)  # names of its modules
_KINDS = {"export": 0.5, "sheet": 0.3, "pile": 0.2}  # shares of the inputs


def _made(kind: str, rng: random.Random, exports: list[bytes], sheet: str) -> bytes:
    """One input of a kind."""
    if kind == "export":
        return mutated(rng, exports)
    if kind == "sheet":
        text = scrambled(sheet, rng).encode("utf-8", "surrogatepass")
        return mutated(rng, [text]) if rng.random() < 0.3 else text
    return piled(rng)


def _try(data: bytes, path: Path, kind: str, outcomes: collections.Counter[str]) -> str:
    """Read one input in every way; the traceback of what should not be, or ""."""
    path.write_bytes(data)
    readings: tuple[tuple[str, Callable[[], object]], ...] = (
        ("table", lambda: read_table(path)),
        ("trace", lambda: read_trace(path, _SHEET)),
        ("sheet", lambda: read_sheet(path)),
    )
    for name, read in readings:
        try:
            with time_limit(_SLOW):
                read()
            outcomes[f"{kind} as {name} read"] += 1
        except UpstrokeError as error:
            outcomes[f"{kind} as {name} refused"] += 1
            if "\n" in str(error) or not str(error).strip():
                return f"{name}: a refusal of several lines: {str(error)!r}"
        except (Exception, TookTooLong):
            return f"{name}: {traceback.format_exc()}"
    return ""


def _worker(
    seed: int, inputs: int, seconds: float, folder: Path
) -> tuple[int, dict[str, int], int]:
    """Try `inputs` inputs or for `seconds`, whichever ends first."""
    warnings.simplefilter("error")
    rng = random.Random(seed)
    exports, sheet = seed_inputs(), seed_runs()[0].sheet
    outcomes: collections.Counter[str] = collections.Counter()
    seen: set[int] = set()
    found = 0
    end = time.monotonic() + seconds
    with tempfile.TemporaryDirectory(
        dir="/dev/shm" if os.path.isdir("/dev/shm") else None
    ) as place:
        path = Path(place) / "input"
        for done in range(inputs):
            if time.monotonic() > end:
                return done, dict(outcomes), found
            (kind,) = rng.choices(list(_KINDS), list(_KINDS.values()))
            data = _made(kind, rng, exports, sheet)
            key = int.from_bytes(hashlib.blake2b(data, digest_size=8).digest())
            outcomes["of them distinct"] += key not in seen
            seen.add(key)
            problem = _try(data, path, kind, outcomes)
            if problem:
                found += 1
                name = folder / f"finding-{seed}-{done}"
                name.with_suffix(".bin").write_bytes(data)
                name.with_suffix(".txt").write_text(problem, encoding="utf-8")
                if found >= 50:
                    return done + 1, dict(outcomes), found
    return inputs, dict(outcomes), found


def _by_coverage(folder: Path, seconds: float) -> None:
    """Hand the reader to atheris, which picks inputs by the code they reach, from the same seeds.

    What is found is written down and the search goes on; its corpus stays in `folder` for the next time.
    """
    import atheris

    warnings.simplefilter("error")
    path = Path(tempfile.mkdtemp()) / "input"
    outcomes: collections.Counter[str] = collections.Counter()

    def one(data: bytes) -> None:
        problem = _try(data, path, "input", outcomes)
        if problem:
            name = folder / f"finding-{hashlib.blake2b(data, digest_size=6).hexdigest()}"
            name.with_suffix(".bin").write_bytes(data)
            name.with_suffix(".txt").write_text(problem, encoding="utf-8")

    package = Path(__file__).resolve().parent.parent / "isotherm"
    for module in sorted(package.glob("*.py")):
        if module.stem.startswith(_READER):  # what is imported later would not be watched
            importlib.import_module(f"isotherm.{module.stem}")
    watch()
    corpus = folder / "corpus"
    corpus.mkdir(exist_ok=True)
    for number, seed in enumerate([*seed_inputs(), seed_runs()[0].sheet.encode()]):
        (corpus / f"seed-{number}").write_bytes(seed)
    words = folder / "words.dict"
    words.write_text("".join(f'"{_escaped(piece)}"\n' for piece in PIECES), encoding="ascii")
    limits = ["-max_len=4000", f"-max_total_time={int(min(seconds, 1e8))}", f"-dict={words}"]
    atheris.Setup([sys.argv[0], f"-artifact_prefix={folder}/", *limits, str(corpus)], one)
    atheris.Fuzz()


def _escaped(piece: bytes) -> str:
    """A piece as libFuzzer's dictionaries write it."""
    return "".join(f"\\x{byte:02x}" for byte in piece)


def main() -> int:
    """Run from the command line; exit 1 when anything was found."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--inputs", type=int, default=20_000)
    parser.add_argument("--minutes", type=float, default=1e9)
    parser.add_argument("--seed", type=int, default=1)
    parser.add_argument("--jobs", type=int, default=1)
    parser.add_argument(
        "--findings", type=Path, default=Path(tempfile.gettempdir()) / "reader-findings"
    )
    parser.add_argument("--coverage", action="store_true")
    options = parser.parse_args()
    options.findings.mkdir(parents=True, exist_ok=True)
    if options.coverage:
        _by_coverage(options.findings, options.minutes * 60.0)
        return 0
    begin = time.monotonic()
    share = -(-options.inputs // options.jobs)
    tasks = [
        (options.seed * 1000 + job, share, options.minutes * 60.0, options.findings)
        for job in range(options.jobs)
    ]
    print(f"seed {options.seed}, {options.jobs} x {share} inputs", flush=True)
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
    print(f"{tried} inputs in {time.monotonic() - begin:.0f} s, each read three ways")
    for name, count in sorted(outcomes.items()):
        print(f"  {name:24s} {count}")
    if resource is not None:
        peak = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024  # MiB, of one process
        print(f"  {'peak memory, MiB':24s} {peak:.0f}")
    print(f"findings: {found}" + (f", in {options.findings}" if found else ""))
    return 1 if found else 0


if __name__ == "__main__":
    sys.exit(main())
