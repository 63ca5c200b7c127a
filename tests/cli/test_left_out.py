"""Whatever part of a result may be missing, the table and the page say the rest."""

from __future__ import annotations

import dataclasses
import sys
import types
import typing
from collections.abc import Iterator
from importlib import import_module
from pathlib import Path
from typing import Any

import pytest
from hostile_runs import seed_runs

from cli.page import section_html
from isotherm.quantity import Quantity

sys.path.append(str(Path(__file__).resolve().parents[1]))
from fuzz_commands import Bench

SOUND = {run.command: run for run in seed_runs() if run.command not in ("evidence", "batch")}
WIDTH = 80
DEEPEST = 4  # parts within parts
# An analysis refuses a record without a branch, and fits every law to every hold.
NEVER_EMPTY = ("branches", "laws", "fits")


def _optional(hint: Any) -> bool:
    return typing.get_origin(hint) in (typing.Union, types.UnionType) and type(
        None
    ) in typing.get_args(hint)


def left_out(value: Any, depth: int = DEEPEST) -> Iterator[tuple[str, Any]]:
    """The same result with one part that may be missing left out, for each such part, and its name."""
    if not dataclasses.is_dataclass(value) or isinstance(value, type) or depth == 0:
        return
    hints = typing.get_type_hints(type(value))
    for field in dataclasses.fields(value):
        part = getattr(value, field.name)
        if isinstance(value, Quantity) and field.name in ("u_random", "u_systematic"):
            continue
        if _optional(hints[field.name]) and part is not None:
            yield field.name, dataclasses.replace(value, **{field.name: None})
        if isinstance(part, tuple) and part and dataclasses.is_dataclass(part[0]):
            if field.name not in NEVER_EMPTY:
                yield f"{field.name} (all)", dataclasses.replace(value, **{field.name: ()})
            for name, other in left_out(part[0], depth - 1):
                yield (
                    f"{field.name}[0].{name}",
                    dataclasses.replace(value, **{field.name: (other, *part[1:])}),
                )
        elif not isinstance(part, tuple):
            for name, other in left_out(part, depth - 1):
                yield f"{field.name}.{name}", dataclasses.replace(value, **{field.name: other})


@pytest.mark.parametrize("command", sorted(SOUND))
def test_each_part_that_may_be_missing(
    command: str, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    module = import_module(f"cli.{command}_text")
    write = getattr(module, f"{command}_text")
    seen: list[Any] = []
    monkeypatch.setattr(module, f"{command}_text", lambda result, *_: seen.append(result) or "")
    assert Bench(tmp_path).attempt(SOUND[command], more=("--force",)) == "done"
    (result,) = seen
    whole = write(result, WIDTH)
    tried = 0
    for name, other in left_out(result):
        said = write(other, WIDTH)
        place = f"without {name}"
        assert all(len(line) <= WIDTH or str(tmp_path) in line for line in said.splitlines()), place
        assert "None" not in said, place
        assert "nan" not in said.split(), place
        assert "None" not in section_html(other.to_json()), place
        tried += 1
    assert whole
    assert tried > 0
