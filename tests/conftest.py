"""What the tests share: where the project is, and the terminal program as a person runs it."""

from __future__ import annotations

import os

os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")  # before numpy loads: small matrices, two cores

import subprocess
import sys
from pathlib import Path

import pytest
from hypothesis import settings

# the same examples in every run of the suite; --hypothesis-profile=default draws fresh ones
settings.register_profile("suite", derandomize=True, deadline=None)
settings.load_profile("suite")

PROJECT = Path(__file__).resolve().parent.parent


@pytest.fixture(autouse=True)
def width_of_a_pipe(monkeypatch):
    """A page in the same process is as wide as in a pipe, whatever the caller's terminal says."""
    monkeypatch.delenv("COLUMNS", raising=False)


@pytest.fixture
def examples() -> Path:
    return PROJECT / "examples"


@pytest.fixture
def run(tmp_path):
    """Run the program in a fresh folder and return the finished process."""

    def runner(*words: str, env: dict[str, str] | None = None, width: int | None = None):
        settings = {**os.environ, "PYTHONPATH": str(PROJECT), "PYTHONIOENCODING": "utf-8", **(env or {})}
        settings.pop("NO_COLOR", None)
        settings.pop("COLUMNS", None)
        if width:
            settings["COLUMNS"] = str(width)
        return subprocess.run(
            [sys.executable, "-W", "error", "-m", "rfstage", *words],
            cwd=tmp_path,
            env=settings,
            text=True,
            encoding="utf-8",
            capture_output=True,
            check=False,
        )

    return runner
