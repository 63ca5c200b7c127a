"""One browser window of each size for all tests; skipped, with the reason, where there is no browser."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path

import pytest
from webdriver import Browser, missing


@pytest.fixture(scope="session")
def pages(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A folder with the pages under test, made by the commands from the demonstration's files."""
    if missing():
        pytest.skip(f"a browser is needed: {missing()}")
    from cli.main import run

    demo = Path(__file__).resolve().parents[2] / "demo"
    folder = tmp_path_factory.mktemp("pages")
    spacer, sheet = str(demo / "spacer_isotherm.txt"), str(demo / "spacer.toml")
    assert run(["isotherm", spacer, "-s", sheet, "--report", str(folder / "isotherm.html"),
                "--json", str(folder / "isotherm.json")]) == 0  # fmt: skip
    log, own = str(demo / "build_good.txt"), str(demo / "build_good.toml")
    assert run(["transfer", log, "-s", own, "-i", spacer, "--report", str(folder / "transfer.html"),
                "--json", str(folder / "transfer.json")]) == 0  # fmt: skip
    results = [str(folder / f"{name}.json") for name in ("isotherm", "transfer")]
    assert run(["report", *results, "-o", str(folder / "dossier.html")]) == 0
    hostile = folder / "hostile.toml"
    text = (demo / "spacer.toml").read_text(encoding="utf-8")
    lines = text.splitlines()
    lines[1] = f"title = '''{HOSTILE}'''"
    hostile.write_text("\n".join(lines), encoding="utf-8")
    assert (
        run(["isotherm", spacer, "-s", str(hostile), "--report", str(folder / "hostile.html")]) == 0
    )
    return folder


HOSTILE = (
    "</title></script><script>window.ran=1</script><img src=x onerror='window.ran=2'>"
    '"><svg onload="window.ran=3">'
)


@pytest.fixture(scope="session")
def desk(pages: Path) -> Iterator[Browser]:
    """A window of a desk computer."""
    with Browser(1100, 900) as browser:
        yield browser


@pytest.fixture(scope="session")
def phone(pages: Path) -> Iterator[Browser]:
    """A phone, 360 CSS pixels wide, with a touch screen."""
    with Browser(360, 740, touch=True) as browser:
        yield browser
