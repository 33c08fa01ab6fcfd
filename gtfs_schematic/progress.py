"""The protocol through which stages report progress; silent unless somebody listens."""

from __future__ import annotations

from typing import Protocol


class Progress(Protocol):
    """What a stage may call while it works."""

    def phase(self, name: str, total: int | None = None) -> None:
        """Begin a named phase of `total` steps (None: unknown)."""

    def step(self, count: int = 1) -> None:
        """Report that `count` more steps of the phase are done."""

    def note(self, text: str) -> None:
        """Tell the person something worth knowing while the work goes on."""


class Silent:
    """Progress that nobody hears: the default of every stage."""

    def phase(self, name: str, total: int | None = None) -> None:
        """Ignore the phase."""

    def step(self, count: int = 1) -> None:
        """Ignore the step."""

    def note(self, text: str) -> None:
        """Ignore the note."""
