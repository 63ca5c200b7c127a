"""`upstroke report`: results joined into a dossier, held against their files and each other."""

from __future__ import annotations

import csv
import io
import json
import random
import shutil
from pathlib import Path
from typing import Any

import pytest

from cli.main import run
from cli.page_figure import Picture
from cli.report_join import join_results, load_results
from cli.report_page import _pictures

DEMO = Path(__file__).resolve().parents[2] / "demo"


@pytest.fixture(scope="module")
def sample(tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("sample")
    for name in (
        "spacer_isotherm.txt",
        "spacer.toml",
        "held_35.csv",
        "build_good.txt",
        "build_good.toml",
    ):
        shutil.copy(DEMO / name, folder / name)
    at = {
        name: str(folder / name) for name in ("spacer_isotherm.txt", "spacer.toml", "held_35.csv")
    }
    film, sheet, held = at.values()
    log, own = str(folder / "build_good.txt"), str(folder / "build_good.toml")
    commands = {
        "iso": ["isotherm", film, "-s", sheet],
        "hold": ["hold", held, "-s", sheet],
        "target": ["target", film, "-s", sheet, "--hold", held],
        "build": ["transfer", log, "-s", own, "-i", film],
    }
    for name, command in commands.items():
        assert run([*command, "--json", str(folder / f"{name}.json")]) == 0
    return folder


def results(folder: Path) -> list[str]:
    return [str(folder / f"{name}.json") for name in ("build", "target", "hold", "iso")]


def test_json_has_every_result_in_the_order_of_the_work(
    sample: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    assert run(["report", *results(sample), "--title", "Sample 7", "--json", "-"]) == 0
    payload = json.loads(capsys.readouterr().out)
    assert payload["schema"] == "upstroke.report/1"
    assert payload["title"] == "Sample 7"
    assert [r["kind"] for r in payload["results"]] == ["isotherm", "hold", "target", "transfer"]
    for entry in payload["results"]:
        assert entry["answer"]
        assert {i["state"] for i in entry["inputs"]} == {"unchanged"}
        assert entry["result"]["schema"] == f"upstroke.{entry['kind']}/1"
    assert payload["warnings"] == []
    (fact,) = payload["together"]
    assert fact["value"] == "inside the window"


def test_the_page_has_all_of_it_drawn(sample: Path, tmp_path: Path) -> None:
    page, table = tmp_path / "sample.html", tmp_path / "sample.csv"
    assert run(["report", *results(sample), "-o", str(page), "--csv", str(table)]) == 0
    html = page.read_text(encoding="utf-8")
    assert html.count("<article") == 4
    assert html.count("<svg") == 4
    assert html.count("How each number was obtained") == 1
    rows = list(csv.DictReader(io.StringIO(table.read_text(encoding="utf-8"))))
    assert {"kind": "transfer", "what": "layers"}.items() <= {
        k: v for r in rows if r["what"] == "layers" for k, v in r.items()
    }.items()


def test_the_table_fits_80_columns(sample: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert run(["report", *results(sample)]) == 0
    out = capsys.readouterr().out
    assert max(len(line) for line in out.splitlines() if str(sample) not in line) <= 80
    assert "deposition type" in out


def pictures(entry: Any) -> tuple[Picture, ...]:
    return _pictures(entry)


def test_a_changed_or_lost_input_is_said_and_not_drawn(
    sample: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    payload = json.loads((sample / "iso.json").read_text(encoding="utf-8"))
    moved = tmp_path / "iso.json"
    moved.write_text(json.dumps(payload), encoding="utf-8")
    (entry,) = load_results([moved])
    assert len(pictures(entry)) == 1
    payload["source"]["sha256"] = "0" * 64
    moved.write_text(json.dumps(payload), encoding="utf-8")
    dossier = join_results(load_results([moved]), None)
    assert "has changed since" in dossier.warnings[0]
    assert pictures(dossier.entries[0]) == ()
    payload["source"]["path"] = "gone.txt"
    moved.write_text(json.dumps(payload), encoding="utf-8")
    (entry,) = load_results([moved])
    assert {i.path: i.state for i in entry.inputs}["gone.txt"] == "not found"
    page = tmp_path / "x.html"
    assert run(["report", str(moved), "-o", str(page)]) == 0
    assert "not found" in page.read_text(encoding="utf-8")


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("not json", "is no JSON"),
        ("{}", "no schema"),
        ("[3]", "no schema"),
        ('{"schema": "upstroke.isotherm/9"}', "schema upstroke.isotherm/9"),
        ('{"schema": "upstroke.isotherm/1"}', "lacks a part"),
        (
            '{"schema": "upstroke.transfer/1", "strokes": 4, "type": "Y", "layers": null}',
            "lacks a part",
        ),
        ("[" * 100000, "is no JSON"),
    ],
)
def test_what_is_no_result_is_refused_in_one_line(
    tmp_path: Path, capsys: pytest.CaptureFixture[str], text: str, said: str
) -> None:
    path = tmp_path / "x.json"
    path.write_text(text, encoding="utf-8")
    assert run(["report", str(path)]) == 1
    error = capsys.readouterr().err
    assert error.count("\n") == 1
    assert error.startswith("upstroke: ")
    assert said in error
    assert "--json" in error


def test_results_of_different_versions_are_told(sample: Path, tmp_path: Path) -> None:
    payload = json.loads((sample / "iso.json").read_text(encoding="utf-8"))
    payload["versions"]["upstroke"] = "0.0.1"
    old = tmp_path / "old.json"
    old.write_text(json.dumps(payload), encoding="utf-8")
    dossier = join_results(load_results([old, sample / "build.json"]), None)
    assert any("different versions of upstroke" in text for text in dossier.warnings)


def test_a_file_a_result_was_made_from_is_never_written_to(
    sample: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    for name in ("spacer_isotherm.txt", "spacer.toml"):
        before = (sample / name).read_bytes()
        assert run(["report", str(sample / "iso.json"), "-o", str(sample / name), "--force"]) == 1
        assert "never written to" in capsys.readouterr().err
        assert (sample / name).read_bytes() == before


def wrecked(value: Any, rng: random.Random) -> Any:
    """A JSON value with one part left out, or another kind of value in its place."""
    odd = (None, "", "x", "</script>", -1, 1e308, 10**400, True, [], {}, [1, "2"], {"value": "a"})
    if isinstance(value, (dict, list)) and value and rng.random() < 0.9:
        copy = value.copy()
        key = rng.choice(list(copy) if isinstance(copy, dict) else range(len(copy)))
        if rng.random() < 0.1:
            del copy[key]
        else:
            copy[key] = wrecked(copy[key], rng)
        return copy
    return rng.choice(odd)


@pytest.mark.parametrize("name", ["iso", "hold", "target", "build"])
def test_wrecked_results_are_joined_or_refused_in_one_line(
    name: str, sample: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    rng = random.Random(name)
    sound = json.loads((sample / f"{name}.json").read_text(encoding="utf-8"))
    path, page = tmp_path / "bad.json", tmp_path / "page.html"
    seen = set()
    for turn in range(60):
        bad = sound
        for _ in range(rng.randint(1, 3)):
            bad = wrecked(bad, rng)
        path.write_text(json.dumps(bad), encoding="utf-8")
        # a page takes longer, as it is drawn
        output = ["-o", str(page), "--force"] if turn % 12 == 0 else ["--json", "-"]
        status = run(["report", str(path), str(sample / "target.json"), *output])
        said = capsys.readouterr().err
        assert (status, said.count("\n")) in ((0, 0), (1, 1)), said
        assert "fault" not in said
        seen.add(status)
    assert seen == {0, 1}
