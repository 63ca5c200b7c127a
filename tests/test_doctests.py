"""The examples in the docstrings run, and using the packages as libraries is cheap."""

from __future__ import annotations

import doctest
import importlib
import subprocess
import sys
from pathlib import Path

import pandas as pd
import pytest

import isotherm
import transfer

ROOT = Path(__file__).resolve().parents[1]
OPTIONS = doctest.ELLIPSIS | doctest.IGNORE_EXCEPTION_DETAIL


def with_examples() -> list[str]:
    names = []
    for package in ("isotherm", "transfer", "cli"):
        for path in sorted((ROOT / package).glob("*.py")):
            if ">>>" in path.read_text(encoding="utf-8"):
                names.append(f"{package}.{path.stem}".removesuffix(".__init__"))
    return names


@pytest.mark.parametrize("name", with_examples())
def test_examples(name: str, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(ROOT)
    outcome = doctest.testmod(importlib.import_module(name), optionflags=OPTIONS)
    assert outcome.attempted > 0
    assert outcome.failed == 0


@pytest.mark.parametrize("package", [isotherm, transfer])
def test_every_public_name_is_there(package: object) -> None:
    names = package.__all__  # type: ignore[attr-defined]
    assert sorted(package._HOMES) == sorted(names)  # type: ignore[attr-defined]
    assert set(names) <= set(dir(package))
    for name in names:
        assert getattr(package, name).__doc__
    with pytest.raises(AttributeError, match="no attribute 'nothing'"):
        package.nothing  # type: ignore[attr-defined]  # noqa: B018


def test_importing_the_packages_imports_no_science() -> None:
    code = (
        "import isotherm, transfer, sys; "
        "print([m for m in ('numpy', 'pandas', 'scipy') if m in sys.modules])"
    )
    done = subprocess.run(
        [sys.executable, "-c", code], cwd=ROOT, capture_output=True, text=True, check=True
    )
    assert done.stdout.strip() == "[]"


def test_frames_of_a_target_and_of_what_has_rows(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(ROOT)
    sheet = isotherm.read_sheet("demo/spacer.toml")
    film = isotherm.analyse(isotherm.read_trace("demo/spacer_isotherm.txt", sheet))
    plan = transfer.to_frame(transfer.choose_target(film, sheet))
    assert len(plan) == 20
    assert (plan.u_film_removed > 0).all()
    runs = isotherm.to_frame(isotherm.analyse_replicates([film, film]))
    assert isinstance(runs, pd.DataFrame)
    assert len(runs) == 2
    features = transfer.to_frame(film)
    assert {"collapse_pressure", "kink_area"} <= set(features.feature)
    with pytest.raises(TypeError, match="no result"):
        transfer.to_frame(3)
