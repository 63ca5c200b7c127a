"""Results on one sample, read back from JSON and held against their files and against each other."""

from __future__ import annotations

import hashlib
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from cli.page_blocks import Fact
from cli.page_words import answer_of, kind_of, question_of
from isotherm.errors import UpstrokeError
from isotherm.json_file import read_json

__all__ = ["Dossier", "Entry", "InputState", "join_results", "load_results"]

# the order of the work, from the bare water to the finished stack
ORDER = (
    "check", "isotherm", "replicates", "batch", "mixture", "temperature", "fluid", "potential",
    "oscillation", "cycles", "hold", "target", "transfer", "audit",
)  # fmt: skip
# What comes of reading a result whose parts are missing or of another kind than it says.
UNFIT = (ArithmeticError, AttributeError, LookupError, TypeError, ValueError)
REMEDY = "make it again with the command's --json"


@dataclass(frozen=True)
class InputState:
    """A file a result was made from.

    state : "unchanged", "changed" or "not found". found : where it is, if unchanged. places : every file
    that was read to look for it.
    """

    path: str
    sha256: str
    state: str
    found: Path | None
    places: tuple[Path, ...] = ()


@dataclass(frozen=True)
class Entry:
    """One result: the file it came from, its JSON form, its answer, and the state of its inputs."""

    path: Path
    sha256: str
    payload: dict[str, Any]
    answer: tuple[Fact, ...]
    inputs: tuple[InputState, ...]

    @property
    def kind(self) -> str:
        """What kind of result it is."""
        return kind_of(self.payload)

    @property
    def title(self) -> str:
        """Its own title and the file it is about."""
        named = str((self.payload.get("source") or {}).get("path") or self.path)
        file = named.replace("\\", "/").rpartition("/")[2]
        own = self.payload.get("title")
        return f"{own}, {file}" if own else file


@dataclass(frozen=True)
class Dossier:
    """All results of a sample, in the order of the work, and what is to be said of them together."""

    title: str
    entries: tuple[Entry, ...]
    together: tuple[Fact, ...]
    warnings: tuple[str, ...]

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form, schema upstroke.report/1."""
        return {
            "schema": "upstroke.report/1",
            "title": self.title,
            "warnings": list(self.warnings),
            "together": [_fact(fact) for fact in self.together],
            "results": [
                {
                    "path": str(entry.path),
                    "sha256": entry.sha256,
                    "kind": entry.kind,
                    "title": entry.title,
                    "question": question_of(entry.payload),
                    "answer": [_fact(fact) for fact in entry.answer],
                    "inputs": [
                        {"path": i.path, "sha256": i.sha256, "state": i.state} for i in entry.inputs
                    ],
                    "result": entry.payload,
                }
                for entry in self.entries
            ],
        }


def _fact(fact: Fact) -> dict[str, str | None]:
    return {"what": fact.label, "value": fact.value, "remark": fact.remark or None}


def load_results(paths: Sequence[Path]) -> list[Entry]:
    """Read results; a file with a list gives one entry for each.

    Raises
    ------
    UpstrokeError
        A file cannot be read, is no result of upstroke, or lacks a part of one.
    """
    entries = []
    for path in paths:
        parsed, data = read_json(path, remedy=REMEDY)
        digest = hashlib.sha256(data).hexdigest()
        for payload in parsed if isinstance(parsed, list) else [parsed]:
            entries.append(_entry(path, digest, payload))
    return entries


def _entry(path: Path, digest: str, payload: Any) -> Entry:
    schema = payload.get("schema") if isinstance(payload, dict) else None
    known = {f"upstroke.{kind}/1" for kind in ORDER}
    if not isinstance(schema, str) or schema not in known:
        found = f"schema {schema}" if schema else "no schema"
        raise UpstrokeError(
            f"is no result this report can join ({found})", where=str(path), remedy=REMEDY
        )
    try:
        entry = Entry(path, digest, payload, tuple(answer_of(payload)), _states(path, payload))
        _render(entry)
    except UNFIT as error:
        raise UpstrokeError(
            f"lacks a part of a result ({schema}): {error}", where=str(path), remedy=REMEDY
        ) from error
    return entry


def _render(entry: Entry) -> None:
    """Try everything a report says of one result, so that a part that is no such part is told here."""
    from cli.page import section_html
    from cli.report_text import report_text

    alone = Dossier(entry.title, (entry,), (), ())
    report_text(alone, 80)
    section_html(entry.payload)


def _states(path: Path, payload: dict[str, Any]) -> tuple[InputState, ...]:
    found: dict[tuple[str, str], InputState] = {}

    def walk(value: Any) -> None:
        if isinstance(value, dict):
            name, digest = value.get("path"), value.get("sha256")
            if isinstance(name, str) and isinstance(digest, str) and (name, digest) not in found:
                found[name, digest] = _state(path, name, digest)
            for item in value.values():
                walk(item)
        elif isinstance(value, list):
            for item in value:
                walk(item)

    for key in ("source", "sources", "settings", "evidence_source", "runs"):
        walk(payload.get(key))
    return tuple(found.values())


def _state(path: Path, name: str, digest: str) -> InputState:
    """Look for an input where it was named, then beside the result."""
    read: list[Path] = []
    for place in (Path(name), path.parent / name, path.parent / Path(name).name):
        try:
            if not place.is_file():
                continue
            with place.open("rb") as file:
                same = hashlib.file_digest(file, "sha256").hexdigest() == digest
        except (OSError, ValueError):
            continue
        read.append(place)
        if same:
            return InputState(name, digest, "unchanged", place, tuple(read))
    return InputState(name, digest, "changed" if read else "not found", None, tuple(read))


def join_results(entries: Sequence[Entry], title: str | None) -> Dossier:
    """Put results in the order of the work and hold them against each other."""
    ordered = sorted(entries, key=lambda entry: ORDER.index(entry.kind))
    warnings: list[str] = []
    digests: dict[str, set[str]] = {}
    for entry in ordered:
        for item in entry.inputs:
            digests.setdefault(item.path, set()).add(item.sha256)
            if item.state == "changed":
                warnings.append(f"{item.path} has changed since {entry.path.name} was made from it")
    warnings += [
        f"the results were made from different versions of {name}"
        for name, seen in digests.items()
        if len(seen) > 1
    ]
    versions = {str((e.payload.get("versions") or {}).get("upstroke")) for e in ordered}
    if len(versions) > 1:
        warnings.append(f"made by different versions of upstroke: {', '.join(sorted(versions))}")
    together = _pressures(ordered)
    own = title or next(
        (str(e.payload["title"]) for e in reversed(ordered) if e.payload.get("title")), "Sample"
    )
    return Dossier(own, tuple(ordered), tuple(together), tuple(dict.fromkeys(warnings)))


def _pressures(entries: Sequence[Entry]) -> list[Fact]:
    """Hold the pressure of each build against the window of each choice of pressure."""
    facts = []
    windows = [e for e in entries if e.kind == "target" and _is_window(e.payload.get("window"))]
    for entry in entries:
        held = entry.payload.get("pressure_target")
        if entry.kind not in ("transfer", "audit") or not isinstance(held, (int, float)):
            continue
        for choice in windows:
            low, high = choice.payload["window"]
            inside = (low is None or held >= low) and (high is None or held <= high)
            ends = f"{'open' if low is None else f'{low:.1f}'} to {'open' if high is None else f'{high:.1f}'}"
            facts.append(
                Fact(
                    f"{entry.title}: dipped at {held:g} mN/m",
                    "inside the window" if inside else "outside the window",
                    f"{ends} mN/m, by {choice.path.name}",
                )
            )
    return facts


def _is_window(value: Any) -> bool:
    """Whether it is a pair of pressures, each of them a number or null."""
    if not isinstance(value, list) or len(value) != 2:
        return False
    return all(end is None or isinstance(end, (int, float)) for end in value)
