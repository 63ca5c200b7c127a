"""Packaging says one thing in one place."""

from __future__ import annotations

import re
import tomllib
from pathlib import Path

import pytest

import cli

ROOT = Path(__file__).resolve().parents[2]
PROJECT = tomllib.loads((ROOT / "pyproject.toml").read_text(encoding="utf-8"))


def lowest() -> dict[str, str]:
    lines = (ROOT / ".ci" / "lowest.txt").read_text(encoding="utf-8").splitlines()
    return dict(line.split("==") for line in lines if line and not line.startswith("#"))


def test_lowest_releases_are_those_the_package_promises() -> None:
    for requirement in PROJECT["project"]["dependencies"]:
        name, bound = re.fullmatch(r"([\w-]+)>=([\d.]+)", requirement).groups()
        pinned = lowest()[name]
        assert pinned == bound or pinned.startswith(f"{bound}."), name


def test_the_version_is_written_once() -> None:
    assert "version" in PROJECT["project"]["dynamic"]
    assert PROJECT["tool"]["setuptools"]["dynamic"]["version"] == {"attr": "cli.__version__"}
    assert re.fullmatch(r"\d+\.\d+\.\d+", cli.__version__)


@pytest.mark.parametrize("package", ["isotherm", "transfer", "cli"])
def test_each_package_ships_its_types(package: str) -> None:
    assert package in PROJECT["tool"]["setuptools"]["packages"]
    assert (ROOT / package / "py.typed").exists()
    assert "py.typed" in PROJECT["tool"]["setuptools"]["package-data"][package]


def test_no_package_imports_what_it_should_not() -> None:
    """isotherm imports nothing of transfer or cli, transfer nothing of cli."""
    barred = {"isotherm": ("transfer", "cli"), "transfer": ("cli",)}
    for package, others in barred.items():
        for path in (ROOT / package).glob("*.py"):
            text = path.read_text(encoding="utf-8")
            for other in others:
                assert not re.search(rf"^\s*(from|import) {other}\b", text, re.M), path.name


def test_nothing_else_lies_at_the_top() -> None:
    allowed = {"README.md", "DEVELOPERS.md", "pyproject.toml", "LICENSE", "isotherm", "transfer"}
    allowed |= {"cli", "tests", "demo"}
    made = {"build", "dist", "upstroke.egg-info"}  # by installing; ignored by git
    found = {p.name for p in ROOT.iterdir() if not p.name.startswith((".", "__"))}
    assert found - made - {"spacer.svg"} <= allowed
