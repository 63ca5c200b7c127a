"""The same input gives the same bytes, whatever the number of processes and threads."""

from __future__ import annotations

import json
import os
import subprocess
import sys
from pathlib import Path

import pytest

ROOT = Path(__file__).resolve().parents[2]
SHEET = ["--sheet", "demo/spacer.toml"]
TRACES = ["demo/spacer_isotherm.txt", "demo/second_isotherm.csv"]
COMMANDS = {
    "isotherm": ["isotherm", *TRACES, *SHEET],
    "hold": ["hold", "demo/held_35.csv", *SHEET],
    "transfer": ["transfer", "demo/build_good.txt", "--sheet", "demo/build_good.toml"],
}
THREADS = ("OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS")


def said(arguments: list[str], *, threads: int, seed: str = "0") -> bytes:
    done = subprocess.run(
        [sys.executable, "-m", "cli.main", *arguments, "--json", "-"],
        cwd=ROOT,
        check=True,
        capture_output=True,
        env={
            **os.environ,
            **dict.fromkeys(THREADS, str(threads)),
            "PYTHONHASHSEED": seed,
        },
    )
    return done.stdout


@pytest.mark.parametrize("command", sorted(COMMANDS))
def test_threads_and_hash_seed_change_no_byte(command: str) -> None:
    one = said(COMMANDS[command], threads=1)
    assert one == said(COMMANDS[command], threads=2, seed="77")
    payload = json.loads(one)
    for result in payload if isinstance(payload, list) else [payload]:
        assert result["settings"]
        assert {"upstroke", "numpy"} <= set(result["versions"])


def test_processes_change_no_byte() -> None:
    arguments = COMMANDS["isotherm"]
    assert said(arguments, threads=1) == said([*arguments, "--jobs", "2"], threads=1)
