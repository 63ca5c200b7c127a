"""The report pages in a real browser: quiet console, no network, readable, usable by every hand."""

from __future__ import annotations

import re
from itertools import pairwise
from pathlib import Path
from typing import Any

import pytest
from webdriver import Browser

PAGES = ("isotherm", "transfer", "dossier", "hostile")

# WCAG 2.1, success criterion 1.4.3 and its definitions of relative luminance and contrast ratio.
CONTRAST = """
const luminance = (c) => {
  const [r, g, b] = c.map((v) => { v /= 255; return v <= .03928 ? v / 12.92 : ((v + .055) / 1.055) ** 2.4; });
  return .2126 * r + .7152 * g + .0722 * b;
};
const colour = (text) => text.match(/[\\d.]+/g).map(Number);
const behind = (node) => {
  for (; node; node = node.parentElement) {
    const c = colour(getComputedStyle(node).backgroundColor);
    if (c.length < 4 || c[3] > 0) return c.slice(0, 3);
  }
  return [255, 255, 255];
};
const found = [];
const walk = document.createTreeWalker(document.body, NodeFilter.SHOW_TEXT);
while (walk.nextNode()) {
  const text = walk.currentNode.textContent.trim(), own = walk.currentNode.parentElement;
  if (!text || ["SCRIPT", "STYLE"].includes(own.tagName) || own.closest("svg")) continue;
  const [a, b] = [colour(getComputedStyle(own).color).slice(0, 3), behind(own)].map(luminance);
  found.push([(Math.max(a, b) + .05) / (Math.min(a, b) + .05), text.slice(0, 40)]);
}
return found;
"""
PLACE = """
const box = document.querySelectorAll(".plot")[arguments[0]].querySelector("svg").getBoundingClientRect();
return [box.left, box.top, box.width, box.height];
"""
SAID = 'return document.querySelectorAll("output")[arguments[0]].textContent;'


def _plot(browser: Browser, number: int = 0) -> tuple[float, ...]:
    browser.run('document.querySelectorAll(".plot")[arguments[0]].scrollIntoView();', number)
    return tuple(browser.run(PLACE, number))


def _area(said: str) -> float:
    found = re.search(r"A ([\d.]+)", said)
    assert found, said
    return float(found[1])


@pytest.mark.parametrize("name", PAGES)
def test_the_console_stays_quiet_and_nothing_is_loaded(
    desk: Browser, pages: Path, name: str
) -> None:
    desk.console()
    desk.open(pages / f"{name}.html")
    desk.run('for (const p of document.querySelectorAll(".plot")) p.focus();')
    desk.press("right", "end", "up", "down")
    assert desk.console() == []
    loaded = desk.run('return performance.getEntriesByType("resource").map((e) => e.name);')
    assert [one for one in loaded if not one.startswith("data:")] == []


@pytest.mark.parametrize("name", PAGES)
def test_a_phone_needs_no_sideways_scroll(phone: Browser, pages: Path, name: str) -> None:
    phone.open(pages / f"{name}.html")
    assert phone.run("return innerWidth;") == 360
    assert phone.run("return document.documentElement.scrollWidth;") <= 360


def test_a_hostile_title_stays_text(desk: Browser, pages: Path) -> None:
    desk.open(pages / "hostile.html")
    assert desk.run("return window.ran === undefined;") is True
    assert "<script>window.ran=1" in desk.run('return document.querySelector("h1").textContent;')
    # and the policy stops a script that got in another way
    desk.run(
        'const s = document.createElement("script"); s.textContent = "window.ran = 4";'
        "document.body.append(s);"
    )
    assert desk.run("return window.ran === undefined;") is True
    assert any("Content Security Policy" in line for line in desk.console())


@pytest.mark.parametrize("name", PAGES)
def test_every_text_has_contrast(desk: Browser, pages: Path, name: str) -> None:
    desk.open(pages / f"{name}.html")
    ratios: list[Any] = desk.run(CONTRAST)
    assert len(ratios) > 40
    assert [one for one in ratios if one[0] < 4.5] == []


@pytest.mark.parametrize("name", PAGES)
def test_landmarks_headings_and_names(desk: Browser, pages: Path, name: str) -> None:
    desk.open(pages / f"{name}.html")
    counts = desk.run(
        'return ["main", "header", "footer", "h1", "title"].map((n) => document.querySelectorAll(n).length);'
    )
    assert counts == [1, 1, 1, 1, 1]
    assert desk.run("return document.documentElement.lang;") == "en"
    levels = desk.run(
        'return [...document.querySelectorAll("h1,h2,h3,h4")].map((h) => Number(h.tagName[1]));'
    )
    assert all(after - before <= 1 for before, after in pairwise(levels))
    ids = desk.run('return [...document.querySelectorAll("[id]")].map((e) => e.id);')
    assert len(ids) == len(set(ids))
    unnamed = desk.run(
        'return [...document.querySelectorAll("[role=group],[role=img],[role=region],[role=note],nav")]'
        '.filter((e) => !e.getAttribute("aria-label")).length;'
    )
    assert unnamed == 0
    assert desk.run(
        'return [...document.querySelectorAll("table")].every((t) => t.caption && t.tHead);'
    )
    # every drawing refers only to its own parts
    lost = desk.run(
        'return [...document.querySelectorAll("svg use")].filter((u) => '
        '!document.getElementById(u.getAttribute("href").slice(1))).length;'
    )
    assert lost == 0


def test_the_cursor_follows_the_mouse(desk: Browser, pages: Path) -> None:
    desk.open(pages / "isotherm.html")
    left, top, width, height = _plot(desk)
    desk.point(left + 0.35 * width, top + 0.3 * height)
    first = desk.run(SAID, 0)
    for name in ("A ", "Π ", "modulus ", "packing error ", "strokes left "):
        assert name in first
    assert "±" in first
    desk.point(left + 0.6 * width, top + 0.3 * height)
    assert _area(desk.run(SAID, 0)) > _area(first) + 0.02


def test_the_cursor_reads_where_it_stands(desk: Browser, pages: Path) -> None:
    """The reading under the cursor is the area the axis has there, within the width of a few points."""
    desk.open(pages / "isotherm.html")
    left, top, width, height = _plot(desk)
    data = desk.run('return JSON.parse(document.getElementById("p1-1-points").textContent);')
    own = data["series"][0]
    areas = [_area(said) for said in own["said"]]
    # places rise linearly with area: the outermost two give the axis
    slope = (own["x"][0] - own["x"][-1]) / (areas[0] - areas[-1])
    for part in (0.3, 0.45, 0.7):
        desk.point(left + part * width, top + 0.5 * height)
        expected = areas[-1] + (part * data["w"] - own["x"][-1]) / slope
        assert _area(desk.run(SAID, 0)) == pytest.approx(expected, abs=0.003)


def test_the_cursor_follows_a_finger(phone: Browser, pages: Path) -> None:
    phone.open(pages / "isotherm.html")
    left, top, width, height = _plot(phone)
    assert width <= 360
    phone.point(left + 0.35 * width, top + 0.3 * height, touch=True)
    first = phone.run(SAID, 0)
    assert "strokes left " in first
    phone.point(left + 0.6 * width, top + 0.3 * height, touch=True)
    assert _area(phone.run(SAID, 0)) > _area(first) + 0.02


def test_a_finger_draws_the_cursor_along_without_moving_the_page(
    phone: Browser, pages: Path
) -> None:
    phone.open(pages / "isotherm.html")
    left, top, width, height = _plot(phone)
    scrolled = phone.run("return [scrollX, scrollY];")
    middle = top + 0.3 * height
    phone.drag((left + 0.35 * width, middle), (left + 0.65 * width, middle))
    end = _area(phone.run(SAID, 0))
    phone.point(left + 0.35 * width, middle, touch=True)
    assert end > _area(phone.run(SAID, 0)) + 0.02
    assert phone.run("return [scrollX, scrollY];") == scrolled


def test_the_cursor_follows_the_keys(desk: Browser, pages: Path) -> None:
    desk.open(pages / "isotherm.html")
    assert (
        desk.run('return document.querySelector("output").getAttribute("aria-live");') == "polite"
    )
    desk.run('document.querySelector(".plot").focus();')
    desk.press("home")
    start = _area(desk.run(SAID, 0))
    desk.press("end")
    end = _area(desk.run(SAID, 0))
    assert end > start + 0.05
    desk.press("left", "left", "left")
    assert start < _area(desk.run(SAID, 0)) < end
    desk.press("home")
    assert _area(desk.run(SAID, 0)) == start


def test_every_stroke_can_be_read(desk: Browser, pages: Path) -> None:
    desk.open(pages / "transfer.html")
    desk.run('document.querySelector(".plot").focus();')
    desk.press("home")
    assert desk.run(SAID, 0).startswith("down-stroke: 1, ratio 0.9")
    desk.press("up", "home", "right")
    assert desk.run(SAID, 0).startswith("up-stroke: 4, ratio ")


def test_it_prints_on_a4(desk: Browser, pages: Path) -> None:
    desk.open(pages / "isotherm.html")
    paper = desk.paper()
    assert paper.startswith(b"%PDF")
    boxes = set(re.findall(rb"/MediaBox \[([\d. ]+)\]", paper))
    width, height = (float(v) for v in boxes.pop().split()[2:])
    assert (width, height) == pytest.approx((595.3, 841.9), abs=1.0)  # ISO 216: 210 mm × 297 mm
    desk.command("Emulation.setEmulatedMedia", {"media": "print"})
    try:
        shown = desk.run(
            'return [...document.querySelectorAll("output, .skip")].map((e) => getComputedStyle(e).display);'
        )
        assert set(shown) == {"none"}
        assert desk.run("return document.documentElement.scrollWidth <= innerWidth;")
    finally:
        desk.command("Emulation.setEmulatedMedia", {"media": ""})
