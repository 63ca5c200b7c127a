"""The demonstration: made by its generator, marked invented, and telling what the commands print today."""

from __future__ import annotations

import importlib.util
import re
import sys
from pathlib import Path
from types import ModuleType

import pytest

from cli.main import COMMANDS

DEMO = Path(__file__).resolve().parents[2] / "demo"


def load(name: str) -> ModuleType:
    spec = importlib.util.spec_from_file_location(name, DEMO / f"{name}.py")
    assert spec is not None
    assert spec.loader is not None
    module = importlib.util.module_from_spec(spec)

    sys.modules[name] = module
    spec.loader.exec_module(module)
    return module


MAKER, WALK = load("make_demo"), load("walk_through")


def test_the_generator_makes_the_files_that_are_there(tmp_path: Path) -> None:
    MAKER.main(tmp_path)
    made = {path.name for path in tmp_path.iterdir()}
    assert made == set(MAKER.FILES)
    for name in made:
        assert (tmp_path / name).read_bytes() == (DEMO / name).read_bytes(), (
            f"{name} is stale: run python demo/make_demo.py"
        )


@pytest.mark.parametrize("name", sorted(MAKER.FILES))
def test_every_file_says_that_it_is_invented(name: str) -> None:
    text = (DEMO / name).read_bytes().decode(MAKER.FILES[name][1])
    assert "invented" in text.splitlines()[0].lower()


def test_it_is_small_and_nothing_else_is_there() -> None:
    files = [path for path in DEMO.iterdir() if path.is_file()]
    assert sum(path.stat().st_size for path in files) < 1_500_000
    known = {*MAKER.FILES, "README.md", "make_demo.py", "walk_through.py", "spacer_isotherm.svg"}
    assert {path.name for path in files} == known


def test_the_exports_are_dressed_differently() -> None:
    encodings = {encoding for _, encoding in MAKER.FILES.values()}
    assert {"utf-8", "utf-16", "cp1252", "ascii", "utf-8-sig"} <= encodings
    heads = []
    for name in ("spacer_isotherm.txt", "second_isotherm.csv", "unzeroed_isotherm.dat"):
        heads.append((DEMO / name).read_bytes().decode(MAKER.FILES[name][1]).splitlines()[20])
    assert "\t" in heads[0]
    assert ";" in heads[1]
    assert re.search(r"\d,\d", heads[1])
    assert re.match(r"\s+\d", heads[2])


def test_the_walk_through_uses_commands_and_files_that_exist() -> None:
    page = WALK.PAGE.read_text(encoding="utf-8")
    commands = [command for command, _ in WALK.BLOCK.findall(page)]
    assert len(commands) >= 10
    assert page.count("```console") == len(commands)
    for command in commands:
        assert command.split()[1] in COMMANDS
    for name in re.findall(r"demo/([\w.]+\w)", page):
        assert (DEMO / name).exists(), name
    assert "Everything here is invented" in page


@pytest.mark.slow
def test_the_walk_through_shows_what_the_commands_print_today(
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    monkeypatch.delenv("UPSTROKE_DEBUG", raising=False)
    page = WALK.PAGE.read_text(encoding="utf-8")
    now = WALK.renewed(page)
    for (command, old), (_, new) in zip(
        WALK.BLOCK.findall(page), WALK.BLOCK.findall(now), strict=True
    ):
        assert new == old, f"stale: {command}\nrun python demo/walk_through.py"


@pytest.mark.slow
def test_the_picture_says_what_the_command_draws_today() -> None:
    """Every text in it, which stands in a comment before its outline; strokes differ between releases."""
    drawn, kept = (
        re.findall(rb"<!-- (.*?) -->", picture)
        for picture in (WALK.picture(), WALK.PICTURE.read_bytes())
    )
    assert len(kept) > 20
    assert drawn == kept, "run python demo/walk_through.py"
