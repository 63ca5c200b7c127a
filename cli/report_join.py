"""Results on one sample, read back from JSON and held against their files and against each other."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from cli.page_blocks import Fact
from cli.page_words import answer_of, kind_of, question_of, tables_of
from isotherm.errors import UpstrokeError

__all__ = ["Dossier", "Entry", "InputState", "join_results", "load_results"]

# the order of the work, from the bare water to the finished stack
ORDER = (
    "check", "isotherm", "replicates", "batch", "mixture", "temperature", "fluid", "potential",
    "oscillation", "cycles", "hold", "target", "transfer", "audit",
)  # fmt: skip
REMEDY = "make it again with the command's --json"
LARGEST = 200_000_000  # bytes; a result is far smaller


@dataclass(frozen=True)
class InputState:
    """A file a result was made from. state : "unchanged", "changed" or "not found"; found : where it is."""

    path: str
    sha256: str
    state: str
    found: Path | None


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
        try:
            if path.stat().st_size > LARGEST:
                raise UpstrokeError("is too large for a result", where=str(path), remedy=REMEDY)
            data = path.read_bytes()
        except OSError as error:
            raise UpstrokeError(
                f"cannot be read: {error.strerror}", where=str(path), remedy="name a file that can"
            ) from error
        try:
            parsed = json.loads(data)
        except (ValueError, RecursionError) as error:
            raise UpstrokeError(
                "is no JSON; a report is made from results written with --json",
                where=str(path),
                remedy=REMEDY,
            ) from error
        digest = hashlib.sha256(data).hexdigest()
        for payload in parsed if isinstance(parsed, list) else [parsed]:
            entries.append(_entry(path, digest, payload))
    return entries


def _entry(path: Path, digest: str, payload: Any) -> Entry:
    schema = payload.get("schema") if isinstance(payload, dict) else None
    known = {f"upstroke.{kind}/1" for kind in ORDER}
    if not isinstance(payload, dict) or schema not in known:
        found = f"schema {schema}" if schema else "no schema"
        raise UpstrokeError(
            f"is no result this report can join ({found})", where=str(path), remedy=REMEDY
        )
    try:
        answer = tuple(answer_of(payload))
        tables_of(payload)
    except (KeyError, TypeError, AttributeError, ValueError, IndexError) as error:
        raise UpstrokeError(
            f"lacks a part of a result ({schema}): {error}", where=str(path), remedy=REMEDY
        ) from error
    return Entry(path, digest, payload, answer, _states(path, payload))


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
    state = "not found"
    for place in (Path(name), path.parent / name, path.parent / Path(name).name):
        try:
            if not place.is_file():
                continue
            same = hashlib.sha256(place.read_bytes()).hexdigest() == digest
        except (OSError, ValueError):
            continue
        if same:
            return InputState(name, digest, "unchanged", place)
        state = "changed"
    return InputState(name, digest, state, None)


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
    windows = [e for e in entries if e.kind == "target" and e.payload.get("window")]
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
