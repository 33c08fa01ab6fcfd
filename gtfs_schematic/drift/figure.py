"""One figure that sums up a drift report, and how it is written for a reader."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Literal

from gtfs_schematic.drift.model import DriftReport

Unit = Literal["share", "degrees", "metres", "ratio", "count", "plain"]
Reader = Callable[[DriftReport], float | None]

_DIGITS = {"degrees": 1, "metres": 0, "ratio": 2, "count": 0, "plain": 3}
_SIGNS = {"degrees": "°", "metres": " m"}


@dataclass(frozen=True, slots=True)
class Figure:
    """One figure of a report."""

    name: str
    """How limits, tables and files call it."""
    label: str
    unit: Unit
    meaning: str
    """Definition, range and source, for a reader of the page."""
    read: Reader
    """None where it was not measured."""
    more_is_better: bool = False


def written(figure: Figure, value: float | None) -> str:
    """Write a value as a reader wants it."""
    if value is None:
        return "not measured"
    if figure.unit == "share":
        return f"{100.0 * value + 0.0:.1f} %"
    return f"{value + 0.0:,.{_DIGITS[figure.unit]}f}{_SIGNS.get(figure.unit, '')}"
