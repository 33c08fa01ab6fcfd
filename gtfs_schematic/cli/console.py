"""Progress on standard error: a live line on a terminal, plain lines elsewhere."""

from __future__ import annotations

import sys
import time
from collections.abc import Iterator
from contextlib import contextmanager
from typing import TYPE_CHECKING

import click

from gtfs_schematic.progress import Progress, Silent

if TYPE_CHECKING:
    from rich.progress import Progress as Bars
    from rich.progress import TaskID


@contextmanager
def listening(*, quiet: bool = False) -> Iterator[Progress]:
    """Give a listener for a run, and tidy the terminal up when it ends."""
    if quiet:
        yield Silent()
    elif sys.stderr.isatty():
        with _bars() as bars:
            yield _Live(bars)
    else:
        plain = _Plain()
        yield plain
        plain.end()


def _capital(name: str) -> str:
    """Begin a phase's name with a capital letter, however the stage wrote it."""
    return name[:1].upper() + name[1:]


def _bars() -> Bars:
    from rich.console import Console
    from rich.progress import (
        BarColumn,
        MofNCompleteColumn,
        Progress,
        SpinnerColumn,
        TextColumn,
        TimeElapsedColumn,
    )

    return Progress(
        SpinnerColumn(),
        TextColumn("{task.description}"),
        BarColumn(bar_width=24),
        MofNCompleteColumn(),
        TimeElapsedColumn(),
        console=Console(stderr=True),
        transient=True,
    )


class _Live:
    """One line that moves while the work goes on."""

    def __init__(self, bars: Bars) -> None:
        self._bars = bars
        self._task: TaskID | None = None

    def phase(self, name: str, total: int | None = None) -> None:
        """Begin a new line."""
        if self._task is not None:
            self._bars.remove_task(self._task)
        self._task = self._bars.add_task(_capital(name), total=total)

    def step(self, count: int = 1) -> None:
        """Move the bar on."""
        if self._task is not None:
            self._bars.advance(self._task, count)

    def note(self, text: str) -> None:
        """Write a line above the bar."""
        self._bars.console.print(text, markup=False, highlight=False)


class _Plain:
    """One line per phase, with its seconds when it ends: for logs."""

    def __init__(self) -> None:
        self._name = ""
        self._since = 0.0

    def phase(self, name: str, total: int | None = None) -> None:  # noqa: ARG002 - no bar here
        """End the phase before and begin a new one."""
        self.end()
        self._name, self._since = _capital(name), time.monotonic()

    def step(self, count: int = 1) -> None:
        """Keep quiet: a log wants no bar."""

    def note(self, text: str) -> None:
        """Write a line of its own."""
        click.echo(text, err=True)

    def end(self) -> None:
        """Say how long the phase took, unless nobody would have noticed it."""
        seconds = time.monotonic() - self._since
        if self._name and seconds >= 0.05:
            click.echo(f"{self._name}: {seconds:.1f} s", err=True)
        self._name = ""
