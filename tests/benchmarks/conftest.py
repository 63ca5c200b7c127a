"""Benchmarks run only when asked for: `python -m pytest tests/benchmarks --benchmark-only`."""

from __future__ import annotations

from pathlib import Path

import pytest


def pytest_ignore_collect(collection_path: Path, config: pytest.Config) -> bool | None:
    """Leave this folder out of the ordinary run."""
    return None if config.getoption("benchmark_only", False) else True
