"""How many traces a second `upstroke batch` does, and what memory it takes.

    python tests/benchmarks/batch_throughput.py --traces 1000 --rows 3000 --jobs 2

Simulated films of all families from the tests' generator, each in a file of its own; the whole command is
timed, imports and CSV included, and its largest memory (with that of its workers) read from the system.
"""

from __future__ import annotations

import argparse
import resource
import subprocess
import sys
import tempfile
import time
from collections.abc import Sequence
from pathlib import Path

import numpy as np

ROOT = Path(__file__).resolve().parents[2]
sys.path[:0] = [str(ROOT), str(ROOT / "tests" / "accuracy")]

from isotherm_simulator import simulate  # noqa: E402

__all__ = ["main"]


def write_traces(folder: Path, traces: int, rows: int) -> None:
    """Write `traces` exports of `rows` rows, evenly taken from simulated runs that are at least as long."""
    seed, written = 0, 0
    while written < traces:
        trace, _ = simulate(seed, None)
        seed += 2
        if trace.area.size < rows:
            continue
        take = np.linspace(0, trace.area.size - 1, rows).round().astype(int)
        with (folder / f"run-{written:05d}.csv").open("w", encoding="utf-8") as file:
            file.write("Area per molecule (nm^2),Surface pressure (mN/m)\n")
            np.savetxt(
                file, np.column_stack([trace.area[take], trace.pressure[take]]), fmt="%.5f,%.3f"
            )
        written += 1


def main(arguments: Sequence[str] | None = None) -> int:
    """Time the command and print one line."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--traces", type=int, default=1000)
    parser.add_argument("--rows", type=int, default=3000)
    parser.add_argument("--jobs", type=int, default=2)
    options = parser.parse_args(arguments)
    with tempfile.TemporaryDirectory() as folder:
        runs = Path(folder) / "runs"
        runs.mkdir()
        write_traces(runs, options.traces, options.rows)
        command = [sys.executable, "-m", "cli.main", "batch", str(runs), "--csv", f"{folder}/b.csv"]
        begin = time.perf_counter()
        subprocess.run(
            [*command, "--jobs", str(options.jobs)], cwd=ROOT, check=True, stdout=subprocess.DEVNULL
        )
        taken = time.perf_counter() - begin
    memory = resource.getrusage(resource.RUSAGE_CHILDREN).ru_maxrss / 1024
    print(
        f"{options.traces} traces of {options.rows} rows, {options.jobs} processes: {taken:.1f} s, "
        f"{options.traces / taken:.1f} traces/s, largest process {memory:.0f} MiB"
    )
    return 0


if __name__ == "__main__":
    raise SystemExit(main())
