"""A progress line on a terminal, for work that takes more than a second."""

from __future__ import annotations

import sys
import time

import click

BAR = 24
PATIENCE_SECONDS = 1.0


class Progress:
    """Shows how many tasks are done, on a terminal and after a second only; nothing in a pipe."""

    def __init__(self) -> None:
        self._start = time.monotonic()
        self._shown = False

    def __call__(self, done: int, total: int) -> None:
        """Show ``done`` of ``total`` tasks."""
        if not sys.stderr.isatty() or time.monotonic() - self._start < PATIENCE_SECONDS:
            return
        filled = BAR * done // max(total, 1)
        bar = "#" * filled + "-" * (BAR - filled)
        click.echo(f"\rmixed networks [{bar}] {done}/{total}", nl=False, err=True)
        self._shown = True

    def close(self) -> None:
        """End the line, when there is one."""
        if self._shown:
            click.echo("", err=True)
