"""The report page as a file: whole, escaped, the same bytes each time, every number with its method."""

from __future__ import annotations

import base64
import hashlib
import json
import re
import tomllib
from pathlib import Path
from typing import Any

import pytest
from dipping_export import write_log
from isotherm_results import result as acid_result
from page_outline import outline

from cli.main import run
from cli.page import Section, one_page, page_bytes
from cli.page_blocks import generic_tables, label_of, pair_text, quantity_text
from cli.page_figure import picture_of
from cli.page_html import safe
from cli.page_methods import all_methods, methods_for
from cli.page_plots import evidence_picture, isotherm_picture, limits_picture, strokes_picture
from cli.page_words import QUESTIONS, answer_of, question_of
from isotherm.figures_style import style

DEMO = Path(__file__).resolve().parents[2] / "demo"


@pytest.fixture(scope="module")
def page(tmp_path_factory: pytest.TempPathFactory) -> bytes:
    path = tmp_path_factory.mktemp("page") / "film.html"
    trace, sheet = str(DEMO / "spacer_isotherm.txt"), str(DEMO / "spacer.toml")
    assert run(["isotherm", trace, "--sheet", sheet, "--report", str(path)]) == 0
    return path.read_bytes()


def test_it_has_question_answer_figure_methods_inputs(page: bytes) -> None:
    text = " ".join(outline(page).text)
    for part in ("Question", "Answer", "Figure", "In numbers", "How each number was obtained"):
        assert part in text
    assert hashlib.sha256((DEMO / "spacer_isotherm.txt").read_bytes()).hexdigest() in text
    assert hashlib.sha256((DEMO / "spacer.toml").read_bytes()).hexdigest() in text
    assert "version of numpy" in text
    assert "Trough area" in text
    assert re.search(r"5[34]\.\d ± 0\.\d mN/m", text)
    assert page.count(b"<svg") == 2


def test_it_loads_nothing_and_runs_one_known_script(page: bytes) -> None:
    seen = outline(page)
    assert all(a.startswith(("#", "data:")) for a in seen.addresses)
    assert seen.handlers == []
    assert b"http://" not in page.replace(b"http://www.w3.org/2000/svg", b"")
    assert b"https://" not in page
    running = [s for s in seen.scripts if s.get("type") != "application/json"]
    assert len(running) == 1
    html = page.decode("utf-8")
    script = re.search(r"<script>(.*?)</script>", html, re.S)
    policy = re.search(r"script-src 'sha256-([^']+)'", html)
    assert script is not None
    assert policy is not None
    assert base64.b64decode(policy[1]) == hashlib.sha256(script[1].encode()).digest()


def test_the_same_result_gives_the_same_bytes() -> None:
    result = acid_result()
    payload = {**result.to_json(), "versions": {"upstroke": "x"}}
    pages = [one_page(payload, pictures=[[isotherm_picture(result)]]) for _ in range(2)]
    assert pages[0] == pages[1]


HOSTILE = "</script><script>alert(1)</script><b onclick='x'>&amp;\x1b[31m\u202e"


def test_nothing_from_a_file_becomes_markup() -> None:
    payload: dict[str, Any] = acid_result().to_json()
    payload["title"] = HOSTILE
    payload["source"]["path"] = HOSTILE
    payload["source"]["sha256"] = HOSTILE
    payload["source"]["columns"] = {HOSTILE: {"header": HOSTILE, "unit": HOSTILE, "index": 1}}
    payload["warnings"] = [HOSTILE]
    payload["settings"] = {HOSTILE: HOSTILE}
    payload["versions"] = {HOSTILE: HOSTILE}
    payload["branches"][0]["phases"][0]["name"] = HOSTILE
    html = page_bytes([Section(payload), Section(payload, name=HOSTILE)], HOSTILE)
    seen = outline(html)
    assert seen.handlers == []
    assert len(seen.scripts) == 1
    assert b"\x1b" not in html
    assert "\u202e".encode() not in html
    assert "".join(seen.text).count("alert(1)") >= 8


def test_a_hostile_label_in_a_figure_stays_inside_its_script() -> None:
    payload = {
        "strokes": [
            {"number": 1, "direction": "up", "flags": [HOSTILE],
             "ratio": {"value": 1.0, "u": 0.01, "unit": "1"}}
        ],
        "limits": [0.95, 1.05],
    }  # fmt: skip
    picture = strokes_picture(payload)
    assert picture is not None
    html = one_page({"schema": "upstroke.other/1"}, pictures=[[picture]])
    seen = outline(html)
    data = [text for text in seen.text if text.startswith('{"w"')]
    assert HOSTILE in json.loads(data[0])["series"][0]["said"][0]


def test_safe_spells_out_what_could_act() -> None:
    assert safe("<a href='x'>&") == "&lt;a href=&#x27;x&#x27;&gt;&amp;"
    assert safe("a\x00b") == "a\\x00b"


# --- what is said ------------------------------------------------------------------------------


def test_quantities_keep_honest_digits() -> None:
    assert quantity_text({"value": 0.20513, "u": 0.0011, "unit": "nm^2"}) == "0.2051 ± 0.0022 nm²"
    loss = {"value": 0.01697, "u": 0.00005, "unit": "1"}
    assert quantity_text(loss, factor=100.0, unit="%") == "1.697 ± 0.010 %"
    assert quantity_text(None) == "–"
    assert quantity_text({"value": None, "u": None, "unit": "1"}) == "–"


def test_keys_become_words() -> None:
    assert label_of("collapse_pressure") == "collapse pressure"
    assert label_of("from_s") == "from, s"
    assert pair_text([None, 3.25], "mN/m", 2) == "open to 3.25 mN/m"


def test_any_result_can_be_laid_out() -> None:
    q = {"value": 1.0, "u": 0.1, "unit": "mN/m"}
    payload = {"schema": "x", "a_b": q, "many": [{"n": 1, "deep": {"q": q}}], "long": list(range(50)),
               "inner": {"value_of": 3.0}}  # fmt: skip
    numbers, many = generic_tables(payload)
    assert ("a b", "1.00 ± 0.20 mN/m") in numbers.rows
    assert ("inner: value of", "3") in numbers.rows
    assert many.columns == ("n", "deep q")
    assert many.rows == (("1", "1.00 ± 0.20 mN/m"),)


def test_an_isotherm_that_did_not_collapse_says_so() -> None:
    payload = acid_result().to_json()
    payload["branches"][0]["collapse"] = None
    fact = next(f for f in answer_of(payload) if f.label == "collapse")
    assert fact.value == "not reached"
    assert fact.remark.startswith("Π ≥ ")


# --- methods -----------------------------------------------------------------------------------


def test_every_kind_of_result_has_a_question_and_methods_with_sources() -> None:
    for kind in QUESTIONS:
        assert question_of({"schema": f"upstroke.{kind}/1"}) == QUESTIONS[kind]
        own = [m for m in methods_for(kind) if m.pages != ("all",)]
        assert own, kind
    known = set(QUESTIONS) | {"all"}
    for method in all_methods():
        assert method.source.endswith("."), method.name
        assert len(method.text) > 60, method.name
        assert set(method.pages) <= known, method.name


def test_no_section_of_the_methods_page_is_overlooked() -> None:
    text = (Path(__file__).resolve().parents[2] / "cli" / "methods.md").read_text(encoding="utf-8")
    assert len(all_methods()) == len(re.findall(r"^### ", text, re.M))
    assert "—" not in text


def test_what_the_page_is_made_of_ships_with_the_package() -> None:
    root = Path(__file__).resolve().parents[2]
    project = tomllib.loads((root / "pyproject.toml").read_text(encoding="utf-8"))
    shipped = project["tool"]["setuptools"]["package-data"]["cli"]
    assert {"methods.md", "page.css", "page.js"} <= set(shipped)


# --- what can be read off ----------------------------------------------------------------------


def test_points_lie_where_the_figure_has_them() -> None:
    from matplotlib.figure import Figure

    with style():
        figure = Figure(figsize=(4.0, 2.0))
        axes = figure.add_axes((0.25, 0.25, 0.5, 0.5))
        axes.plot([0.0, 1.0, 2.0], [0.0, 10.0, 20.0], label="line")
        axes.plot([0.0, 1.0], [5.0, 5.0], label="a guide of two points")
        axes.set_xlim(0.0, 2.0)
        axes.set_ylim(0.0, 20.0)
        axes.set_xlabel("area A (nm²)")
        axes.set_ylabel("pressure (mN/m)")
        picture = picture_of(figure, "x")
    (series,) = picture.series
    # 4 in × 72 points; the axes take the middle half; the vertical coordinate grows downwards
    assert series.x == pytest.approx([72.0, 144.0, 216.0])
    assert series.y == pytest.approx([108.0, 72.0, 36.0])
    assert series.said[1] == "area A 1.00 nm², pressure 10.0 mN/m"
    assert (picture.width, picture.height) == pytest.approx((288.0, 144.0))
    assert not picture.svg.startswith("<?xml")
    assert "<!--" not in picture.svg


def test_the_cursor_says_only_what_the_sheet_allows() -> None:
    picture = isotherm_picture(acid_result())
    assert picture.cursor
    said = picture.series[0].said[5]
    assert said.startswith("A ")
    assert "modulus" in said
    assert "packing error" not in said
    assert "strokes left" not in said


def test_strokes_show_ratio_with_uncertainty(tmp_path: Path) -> None:
    log, sheet = write_log(tmp_path)
    out = tmp_path / "build.json"
    report = tmp_path / "build.html"
    assert (
        run(["transfer", str(log), "-s", str(sheet), "--json", str(out), "--report", str(report)])
        == 0
    )
    payload = json.loads(out.read_text(encoding="utf-8"))
    picture = strokes_picture(payload)
    assert picture is not None
    texts = [said for series in picture.series for said in series.said]
    assert len(texts) == 4
    assert all("±" in text for text in texts)
    assert "Strokes" in "".join(outline(report.read_bytes()).text)
    assert strokes_picture({"strokes": []}) is None
    assert limits_picture({"limits": []}) is None


def test_evidence_is_drawn_against_layers() -> None:
    q = {"value": -13.1, "u": 0.1, "unit": "Hz"}
    kind = {"kind": "resonator_frequency", "label": "crystal", "increment_per_layer": q,
            "expected_per_layer": q, "intercept": {"value": 0.0, "u": 1.0, "unit": "Hz"},
            "points": [{"layers": n, "value": -13.0 * n, "u": 1.0, "unit": "Hz"} for n in (2.0, 4.0)],
            }  # fmt: skip
    picture = evidence_picture({"evidence": [kind]})
    assert picture is not None
    assert picture.series[0].name == "crystal"
    assert picture.series[0].said == ("2 layers: -26.0 ± 2.0 Hz", "4 layers: -52.0 ± 2.0 Hz")
    assert evidence_picture({"evidence": []}) is None


def test_series_and_single_runs_all_write_a_page(tmp_path: Path) -> None:
    traces = [str(DEMO / name) for name in ("spacer_isotherm.txt", "second_isotherm.csv")]
    sheet = str(DEMO / "spacer.toml")
    wanted = {
        "check": ["check", str(DEMO / "bare_subphase.csv"), "-s", sheet],
        "hold": ["hold", str(DEMO / "held_35.csv"), "-s", sheet],
        "target": ["target", traces[0], "-s", sheet, "--hold", str(DEMO / "held_35.csv")],
        "replicates": ["replicates", *traces, "-s", sheet],
        "batch": ["batch", *traces, "-s", sheet],
        "several": ["isotherm", *traces, "-s", sheet],
    }
    for name, command in wanted.items():
        path = tmp_path / f"{name}.html"
        assert run([*command, "--report", str(path)]) == 0, name
        text = " ".join(t for t in outline(path.read_bytes()).text if "use strict" not in t)
        assert "How each number was obtained" in text, name
        assert "SHA-256" in text or name == "replicates", name
        assert not any(word in text for word in (" nan ", "None", "Infinity")), name
