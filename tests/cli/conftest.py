"""Results built by hand, so that the command's words and files are tested apart from the science."""

from __future__ import annotations

import pytest
from isotherm_results import compression, expansion, result

from isotherm.result import IsothermResult


@pytest.fixture
def acid() -> IsothermResult:
    """One compression with every kind of feature."""
    return result()


@pytest.fixture
def acid_cycle() -> IsothermResult:
    """A compression and the expansion after it."""
    return result(compression(), expansion())


@pytest.fixture(autouse=True)
def _faults_show(monkeypatch: pytest.MonkeyPatch) -> None:
    """Let faults out with their traceback, so that a failing test says where."""
    monkeypatch.setenv("UPSTROKE_DEBUG", "1")
