"""No input is run as code, and one module alone writes files: read off the project's own source."""

from __future__ import annotations

import ast
from collections.abc import Callable
from functools import cache
from pathlib import Path

import pytest

ROOT = Path(__file__).resolve().parents[2]
SOURCES = sorted(p for part in ("isotherm", "transfer", "cli") for p in (ROOT / part).glob("*.py"))

# Calls that make code of data or hand words to a shell, and modules whose loading does.
RUNNING_CALLS = {
    "eval", "exec", "compile", "__import__", "system", "popen", "literal_eval", "read_pickle",
}  # fmt: skip
RUNNING_MODULES = {
    "pickle", "marshal", "shelve", "dill", "joblib", "yaml", "subprocess", "code", "runpy", "ctypes",
}  # fmt: skip
WRITING_CALLS = {
    "write_text", "write_bytes", "to_csv", "to_excel", "tofile", "savetxt", "dump", "touch", "rename",
    "unlink", "link", "symlink_to", "hardlink_to", "mkdir", "rmtree", "copy2", "chmod",
}  # fmt: skip
WRITING_FLAGS = {"O_WRONLY", "O_RDWR", "O_CREAT", "O_TRUNC", "O_APPEND"}


def name_of(call: ast.Call) -> tuple[str, str]:
    """The name called, and that of what it is called on, where that is a plain name."""
    function = call.func
    if isinstance(function, ast.Attribute):
        return function.attr, function.value.id if isinstance(function.value, ast.Name) else ""
    return (function.id, "") if isinstance(function, ast.Name) else ("", "")


def running(tree: ast.AST) -> list[str]:
    """What makes code of data."""
    found = []
    for node in ast.walk(tree):
        names: list[str] = []
        if isinstance(node, ast.Import):
            names = [a.name.partition(".")[0] for a in node.names]
        elif isinstance(node, ast.ImportFrom) and not node.level:
            names = [(node.module or "").partition(".")[0]]
        found += [name for name in names if name in RUNNING_MODULES]
        if isinstance(node, ast.Call):
            name, on = name_of(node)
            if name in RUNNING_CALLS and (name, on) != ("compile", "re"):
                found.append(name)
    return found


def writing(tree: ast.AST) -> list[str]:
    """What could write a file."""
    found = []
    for node in ast.walk(tree):
        if isinstance(node, ast.Attribute) and node.attr in WRITING_FLAGS:
            found.append(node.attr)
        if not isinstance(node, ast.Call):
            continue
        name, on = name_of(node)
        words = [a.value for a in (*node.args, *(k.value for k in node.keywords))
                 if isinstance(a, ast.Constant) and isinstance(a.value, str)]  # fmt: skip
        mode = name in ("open", "fdopen") and any(set(w) & set("wax+") for w in words if len(w) < 4)
        moved = (name, on) == ("replace", "os")
        kept = name == "savefig" and ast.unparse(node.args[0]) != "buffer"  # else into memory
        if name in WRITING_CALLS or mode or moved or kept:
            found.append(name)
    return found


@cache
def trees() -> dict[str, ast.Module]:
    return {
        path.relative_to(ROOT).as_posix(): ast.parse(path.read_text(encoding="utf-8"))
        for path in SOURCES
    }


def found_by(check: Callable[[ast.AST], list[str]]) -> dict[str, list[str]]:
    return {where: found for where, tree in trees().items() if (found := check(tree))}


def test_nothing_makes_code_of_data() -> None:
    assert found_by(running) == {}


def test_only_one_module_writes_files() -> None:
    found = found_by(writing)
    assert found.pop("cli/whole.py")
    assert found.pop("cli/main.py") == ["O_WRONLY"]  # of the null device, for a closed output
    assert found == {}


def test_modules_are_loaded_by_names_of_this_project_only() -> None:
    def loading(tree: ast.AST) -> list[str]:
        calls = [n for n in ast.walk(tree) if isinstance(n, ast.Call)]
        return [
            ast.unparse(call)
            for call in calls
            if name_of(call)[0] == "import_module" and not isinstance(call.args[0], ast.Constant)
        ]

    packages = {f"{name}/__init__.py" for name in ("isotherm", "transfer", "cli")}
    assert set(found_by(loading)) <= packages | {"cli/main.py"}  # each by a table of its own


@pytest.mark.parametrize(
    "text",
    ["import pickle", "from yaml import load", "eval(text)", "os.system(text)", "compile(text)"],
)
def test_code_of_data_would_be_seen(text: str) -> None:
    assert running(ast.parse(text))


@pytest.mark.parametrize(
    "text",
    ["open(path, 'wb')", "path.open('a')", "path.write_text(x)", "os.open(p, os.O_RDWR)",
     "os.replace(a, b)", "figure.savefig(path)"],
)  # fmt: skip
def test_a_writer_would_be_seen(text: str) -> None:
    assert writing(ast.parse(text))
