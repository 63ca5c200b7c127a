"""The reference of all commands, made from what the commands say of themselves.

Run from the project's top directory to renew it: python tests/support/command_reference.py
"""

from __future__ import annotations

import sys
from pathlib import Path
from typing import Any

ROOT = Path(__file__).resolve().parents[2]
PLACE = ROOT / "cli" / "reference.md"

HEAD = """\
# Commands

Made from the commands' own help by `python tests/support/command_reference.py`; a test fails when stale.
"""


def _commands() -> dict[str, Any]:
    from importlib import import_module

    import typer

    from cli.main import COMMANDS

    return {
        name: typer.main.get_command(import_module(entry.module).app)
        for name, entry in COMMANDS.items()
    }


def _option_row(parameter: Any) -> str:
    names = ", ".join(f"`{name}`" for name in parameter.opts)
    metavar = "" if parameter.is_flag else f" `{parameter.metavar or 'VALUE'}`"
    default = ""
    if not parameter.is_flag and parameter.default not in (None, [], ()):
        default = f" Default: {parameter.default}."
    needed = " Required." if parameter.required else ""
    text = " ".join((parameter.help or "").split())
    return f"| {names}{metavar} | {text}{default}{needed} |"


def _section(name: str, command: Any) -> str:
    body = (command.help or "").strip()
    told, _, examples = body.partition("\b\n")
    lines = [f"## `upstroke {name}`", "", *told.strip().splitlines(), ""]
    lines += ["```sh"]
    lines += [line.strip() for line in examples.splitlines()[1:] if line.strip()]
    lines += ["```", "", "| option | meaning |", "| --- | --- |"]
    for parameter in command.params:
        if parameter.param_type_name == "argument":
            many = "..." if parameter.nargs == -1 else ""
            text = " ".join((parameter.help or "").split())
            lines.append(f"| `{parameter.metavar}{many}` | {text} |")
    lines += [
        _option_row(parameter)
        for parameter in command.params
        if parameter.param_type_name == "option" and "--help" not in parameter.opts
    ]
    return "\n".join(lines)


def reference() -> str:
    """Return the whole reference as Markdown."""
    sections = [_section(name, command) for name, command in _commands().items()]
    return "\n\n".join([HEAD.strip(), *sections]) + "\n"


if __name__ == "__main__":
    sys.path.insert(0, str(ROOT))
    PLACE.write_text(reference(), encoding="utf-8")
