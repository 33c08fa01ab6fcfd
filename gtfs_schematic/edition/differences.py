"""The words of a change sheet: one change, and the limits below which a change is small."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from typing import Literal

Subject = Literal["line", "station", "walk", "drawing"]
Kind = Literal[
    "new", "gone", "merged", "split", "renamed", "long name", "second name", "recolored",
    "renumbered", "stops", "codes", "routes", "mode", "extended", "shortened", "rerouted", "calls",
    "way", "retimed", "service", "moved", "lines", "step-free", "time", "drawn anew",
]  # fmt: skip


@dataclass(frozen=True, slots=True)
class Change:
    """One thing that differs."""

    subject: Subject
    kind: Kind
    id: str
    name: str
    before: str = ""
    after: str = ""
    places: tuple[str, ...] = ()
    """Ids of the stations at which it is to be seen."""
    small: bool = False
    """Whether it stays below the limits."""


@dataclass(frozen=True, slots=True)
class ChangeLimits:
    """From what on a change of quantity is worth a line on the sheet."""

    moved_m: float = 25.0
    """A station that moved less on the ground has hardly moved (common practice, no source)."""
    retimed_share: float = 0.2
    """Share by which trips, headway or the length of the day must change."""


def listed(ids: Iterable[str], names: Mapping[str, str], most: int = 8) -> str:
    """Give names as one text, in the order given; a long list is cut short and says so."""
    known = [names.get(key, key) for key in ids]
    more = f" and {len(known) - most} more" if len(known) > most else ""
    return ", ".join(known[:most]) + more


def clock(seconds: int | None) -> str:
    """Write a time of the service day: 29:10 is ten past five on the next morning."""
    return "" if seconds is None else f"{seconds // 3600}:{seconds % 3600 // 60:02}"
