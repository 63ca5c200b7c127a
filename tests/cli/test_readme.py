"""The README keeps its promises: its commands, and a list of commands made from the help."""

from __future__ import annotations

import re
from pathlib import Path

from command_reference import PLACE, reference

from cli.main import COMMANDS

ROOT = Path(__file__).resolve().parents[2]
README = (ROOT / "README.md").read_text(encoding="utf-8")


def command_table() -> str:
    """The list of commands as the README must have it; print it to renew the README."""
    rows = [f"| `upstroke {name}` | {entry.summary} |" for name, entry in COMMANDS.items()]
    return "\n".join(["| command | answers |", "| --- | --- |", *rows])


def test_it_opens_with_one_paragraph_and_two_commands() -> None:
    blocks = re.split(r"\n\n", README)
    assert blocks[0] == "# upstroke"
    assert not blocks[1].startswith(("```", "#"))
    fenced = re.findall(r"^```sh\n(.*?)^```", README, re.M | re.S)
    assert "pip install ." in fenced[0]
    assert "upstroke isotherm demo/" in fenced[0]
    assert "pytest" in fenced[1]
    assert all(command.count("\n") == 1 for command in fenced[:2])


def test_the_list_of_commands_is_what_the_help_says() -> None:
    found = re.search(r"fails when it is stale -->\n(.*?)\n?<!-- end of commands", README, re.S)
    assert found is not None
    assert found[1].strip() == command_table()


def test_every_file_it_names_exists() -> None:
    for name in re.findall(r"(?:demo/[\w./-]+\w)|(?:\]\(([\w./-]+)\))", README):
        if name:
            assert (ROOT / name).exists(), name
    for name in re.findall(r"demo/[\w.-]+\.\w+", README):
        assert (ROOT / name).exists(), name


def test_the_reference_is_what_the_commands_say() -> None:
    assert PLACE.read_text(encoding="utf-8") == reference(), "renew it as its second line says"
