"""A progress bar on stderr for what takes longer than a moment."""

from __future__ import annotations

import sys
import time
from collections.abc import Callable

PATIENCE = 1.0  # s: past it a progress bar shows


def progress() -> Callable[[int, int], None]:
    """Return a progress report on stderr, silent for the first second and where that is no terminal."""
    began = time.monotonic()
    shown: list[object] = []

    def report(done: int, of: int) -> None:
        if sys.stderr is None or not sys.stderr.isatty() or (not shown and time.monotonic() - began < PATIENCE):
            return
        from rich.console import Console
        from rich.progress_bar import ProgressBar

        console = Console(file=sys.stderr)
        shown.append(done)
        console.print(ProgressBar(total=of, completed=done, width=40), f" {done} of {of} points", end="\r")
        if done == of:
            console.print(" " * 78, end="\r")

    return report
