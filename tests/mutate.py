"""Change one operator or number of a module at a time and see whether its tests notice.

    python tests/mutate.py --sample 20 --seed 1
    python tests/mutate.py isotherm/modulus.py --tests tests/isotherm/test_modulus.py

Each change is made in a copy of the project, never in place. A change the tests do not notice ("survived") is
a weak test, a change without effect, or code that need not be there: they are printed to be looked at.
"""

from __future__ import annotations

import argparse
import ast
import copy
import os
import random
import shutil
import subprocess
import sys
import tempfile
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path

ROOT = Path(__file__).resolve().parent.parent

# Modules to sample, with the quick tests that answer for them.
SAMPLE: dict[str, tuple[str, ...]] = {
    "isotherm/modulus.py": (
        "tests/isotherm/test_modulus.py",
        "tests/isotherm/test_local_parabola.py",
    ),
    "isotherm/condense.py": ("tests/isotherm/test_condense.py", "tests/isotherm/test_branches.py"),
    "isotherm/branches.py": ("tests/isotherm/test_branches.py",),
    "isotherm/partition.py": ("tests/isotherm/test_knee_model.py",),
    "isotherm/knee_model.py": ("tests/isotherm/test_knee_model.py",),
    "isotherm/knee_evidence.py": ("tests/isotherm/test_knee_model.py",),
    "isotherm/knee_fit.py": (
        "tests/isotherm/test_knee_model.py",
        "tests/isotherm/test_analysis.py",
    ),
    "isotherm/phases.py": ("tests/isotherm/test_phases.py", "tests/isotherm/test_analysis.py"),
    "isotherm/molecular_area.py": ("tests/isotherm/test_molecular_area.py",),
    "isotherm/quantity.py": (
        "tests/isotherm/test_quantity.py",
        "tests/isotherm/test_quantity_text.py",
    ),
    "isotherm/trace_order.py": ("tests/isotherm/test_trace_order.py",),
    "transfer/geometry.py": (
        "tests/transfer/test_geometry.py",
        "tests/outside/test_transfer_ratio.py",
    ),
    "transfer/log_cleaning.py": ("tests/transfer/test_log.py",),
    "transfer/contact.py": ("tests/transfer/test_contact.py", "tests/transfer/test_strokes.py"),
    "transfer/strokes.py": (
        "tests/transfer/test_strokes.py",
        "tests/transfer/test_contact.py",
    ),
    "transfer/strokes_pressure.py": (
        "tests/transfer/test_pressure.py",
        "tests/transfer/test_strokes.py",
    ),
    "transfer/ratio.py": (
        "tests/outside/test_transfer_ratio.py",
        "tests/transfer/test_contact.py",
        "tests/transfer/test_ratio.py",
    ),
    "transfer/drift.py": ("tests/transfer/test_drift.py", "tests/outside/test_transfer_ratio.py"),
    "transfer/drift_changes.py": (
        "tests/outside/test_transfer_ratio.py",
        "tests/transfer/test_drift.py",
    ),
    "transfer/deposition.py": ("tests/transfer/test_deposition.py",),
    "transfer/stack.py": ("tests/transfer/test_deposition.py",),
    "transfer/audit.py": ("tests/transfer/test_audit_verdict.py",),
    "transfer/audit_finding.py": ("tests/transfer/test_audit_verdict.py",),
    **{
        f"transfer/rule_{rule}.py": ("tests/transfer/test_audit_findings.py",)
        for rule in (
            "drift",
            "evidence",
            "layers",
            "mean",
            "plan",
            "pressure",
            "ratio",
            "renewals",
            "speed",
            "strokes",
            "thickness",
            "type",
        )
    },
}
_COMPARE: dict[type, type] = {
    ast.Lt: ast.LtE, ast.LtE: ast.Lt, ast.Gt: ast.GtE, ast.GtE: ast.Gt, ast.Eq: ast.NotEq,
    ast.NotEq: ast.Eq, ast.Is: ast.IsNot, ast.IsNot: ast.Is, ast.In: ast.NotIn, ast.NotIn: ast.In,
}  # fmt: skip
_ARITHMETIC: dict[type, type] = {
    ast.Add: ast.Sub, ast.Sub: ast.Add, ast.Mult: ast.Div, ast.Div: ast.Mult, ast.Pow: ast.Mult,
    ast.FloorDiv: ast.Mult, ast.Mod: ast.Mult, ast.BitAnd: ast.BitOr, ast.BitOr: ast.BitAnd,
}  # fmt: skip


@dataclass(frozen=True)
class Mutant:
    """One change: where, what, and the module's text with it."""

    line: int
    what: str
    source: str


def _changes(node: ast.AST) -> Iterator[str]:
    """Change `node` in place, one change after another; yield what was done."""
    if isinstance(node, ast.Compare) and type(node.ops[0]) in _COMPARE:
        old = node.ops[0]
        node.ops[0] = _COMPARE[type(old)]()
        yield f"{type(old).__name__} becomes {type(node.ops[0]).__name__}"
    elif isinstance(node, ast.BinOp) and type(node.op) in _ARITHMETIC:
        before = node.op
        node.op = _ARITHMETIC[type(before)]()
        yield f"{type(before).__name__} becomes {type(node.op).__name__}"
    elif isinstance(node, ast.BoolOp):
        was = node.op
        node.op = ast.Or() if isinstance(was, ast.And) else ast.And()
        yield f"{type(was).__name__} becomes {type(node.op).__name__}"
    elif isinstance(node, ast.UnaryOp) and isinstance(node.op, ast.Not):
        node.op = ast.UAdd()
        yield "not is dropped"
    elif isinstance(node, ast.Constant) and type(node.value) in (int, float):
        value = node.value
        node.value = value + 1
        yield f"{value} becomes {node.value}"


def mutants(source: str) -> list[Mutant]:
    """Return every change of a module's text, annotations and type checking left alone."""
    tree = ast.parse(source)
    skipped: set[int] = set()
    for node in ast.walk(tree):
        parts: list[ast.AST | None] = []
        if isinstance(node, ast.FunctionDef):
            parts += [node.returns, *(a.annotation for a in node.args.args + node.args.kwonlyargs)]
        elif isinstance(node, ast.AnnAssign):
            parts.append(node.annotation)
        for part in parts:
            if part is not None:
                skipped.update(id(inner) for inner in ast.walk(part))
    out = []
    nodes = list(ast.walk(tree))
    for index, node in enumerate(nodes):
        if id(node) in skipped:
            continue
        changed_tree = copy.deepcopy(tree)
        changed = list(ast.walk(changed_tree))[index]
        for what in _changes(changed):
            out.append(Mutant(getattr(node, "lineno", 0), what, ast.unparse(changed_tree)))
    return out


def _passes(copy_of: Path, tests: tuple[str, ...], seconds: float) -> bool:
    command = [sys.executable, "-m", "pytest", "-q", "-x", "-p", "no:cacheprovider", *tests]
    try:
        done = subprocess.run(
            command,
            cwd=copy_of,
            timeout=seconds,
            check=False,
            stdout=subprocess.DEVNULL,
            stderr=subprocess.DEVNULL,
            env={**os.environ, "OMP_NUM_THREADS": "1", "PYTHONDONTWRITEBYTECODE": "1"},
        )
    except subprocess.TimeoutExpired:
        return False
    return done.returncode == 0


def main() -> int:
    """Run from the command line; print the survivors and the score."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("module", nargs="?")
    parser.add_argument("--tests", nargs="+", default=[])
    parser.add_argument("--sample", type=int, default=15, help="changes tried in each module")
    parser.add_argument("--seed", type=int, default=1)
    parser.add_argument("--seconds", type=float, default=120.0, help="longest the tests may take")
    options = parser.parse_args()
    chosen = {options.module: tuple(options.tests)} if options.module else SAMPLE
    killed = tried = 0
    with tempfile.TemporaryDirectory() as place:
        work = Path(place) / "project"
        ignored = shutil.ignore_patterns(".git", ".*cache", "__pycache__", ".hypothesis")
        shutil.copytree(ROOT, work, ignore=ignored)
        for module, wanted in chosen.items():
            tests = tuple(name for name in wanted if (ROOT / name).exists())
            if not tests or not _passes(work, tests, options.seconds):
                print(f"{module}: its tests are missing or fail as they are; left out", flush=True)
                continue
            text = (ROOT / module).read_text(encoding="utf-8")
            every = mutants(text)
            picked = random.Random(options.seed).sample(every, min(options.sample, len(every)))
            dead = 0
            for mutant in picked:
                (work / module).write_text(mutant.source, encoding="utf-8")
                if _passes(work, tests, options.seconds):
                    line = text.splitlines()[mutant.line - 1].strip()
                    print(f"{module}:{mutant.line}: survived: {mutant.what}: {line}", flush=True)
                else:
                    dead += 1
            (work / module).write_text(text, encoding="utf-8")
            print(f"{module}: {dead} of {len(picked)} noticed", flush=True)
            killed, tried = killed + dead, tried + len(picked)
    print(f"{killed} of {tried} changes noticed ({100.0 * killed / max(tried, 1):.0f} %)")
    return 0


if __name__ == "__main__":
    sys.exit(main())
