"""Limits that a user sets on drift, such as ``displacement-p95=8%``."""

from __future__ import annotations

import difflib
import math
import re
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

from gtfs_schematic.drift.figure import Figure, written
from gtfs_schematic.drift.figures import FIGURE
from gtfs_schematic.drift.model import DriftReport, DriftSettings
from gtfs_schematic.errors import EditionError, UsageError

_FORM = re.compile(r"\s*([a-z0-9.-]+)\s*=\s*(\S+?)\s*")
_NUMBER = re.compile(r"([+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?)\s*(%?)")


@dataclass(frozen=True, slots=True)
class Limit:
    """The most that a figure may reach; where more is better, the least."""

    measure: str
    """Name of the figure."""
    value: float
    """Shares as 0 to 1."""

    @property
    def figure(self) -> Figure:
        """The figure that is limited."""
        return FIGURE[self.measure]

    def __str__(self) -> str:
        """Write the limit as a user would."""
        if self.figure.unit == "share":
            return f"{self.measure}={100.0 * self.value:.12g}%"
        return f"{self.measure}={self.value:g}"


@dataclass(frozen=True, slots=True)
class LimitResult:
    """A limit and what was measured."""

    limit: Limit
    measured: float
    exceeded: bool

    @property
    def written(self) -> str:
        """What was measured, as a reader wants it."""
        return written(self.limit.figure, self.measured)


def parse_limit(text: str) -> Limit:
    """Read one limit of the form NAME=VALUE.

    Raises
    ------
    UsageError
        If the text is of another form, the figure is unknown, or the value does not suit it.
    """
    match = _FORM.fullmatch(text)
    if not match:
        raise UsageError(
            f"limit {text!r}: not of the form NAME=VALUE, for example displacement-p95=8%. "
            f"Names: {', '.join(FIGURE)}."
        )
    return limit_of(match[1], match[2], f"limit {text!r}")


def limit_of(name: str, value: float | str, where: str) -> Limit:
    """Make a limit of a name and a value; shares may be given as percent.

    Raises
    ------
    UsageError
        If the figure is unknown, or the value does not suit it; begins with `where`.
    """
    if name not in FIGURE:
        near = difflib.get_close_matches(name, FIGURE, 1)
        hint = f" Did you mean {near[0]}?" if near else ""
        raise UsageError(f"{where}: no such measure.{hint} Known: {', '.join(FIGURE)}.")
    match = _NUMBER.fullmatch(str(value).strip())
    number = float(match[1]) if match else math.nan
    if not match or not math.isfinite(number):
        raise UsageError(f"{where}: {value!r} is no number, such as 0.5 or 50%.")
    if FIGURE[name].unit == "share":
        number = number / 100.0 if match[2] else number
        if not 0.0 <= number <= 1.0:
            raise UsageError(f"{where}: {name} is a share: give it as 0% to 100%, or 0 to 1.")
    elif match[2]:
        raise UsageError(f"{where}: {name} is no share, so it has no percent.")
    return Limit(name, number)


def limits_of(settings: DriftSettings, texts: Sequence[str] = ()) -> tuple[Limit, ...]:
    """Give the limits of a configuration, and of options, which win.

    Parameters
    ----------
    settings
        Its `limits` by name.
    texts
        Limits of the form NAME=VALUE.

    Raises
    ------
    UsageError
        As `parse_limit` does.
    """
    limits: dict[str, Limit] = {}
    table: Mapping[str, float | str] = settings.limits
    for name, value in table.items():
        limits[name] = limit_of(name, value, f"drift.limits.{name}")
    for text in texts:
        limit = parse_limit(text)
        limits[limit.measure] = limit
    return tuple(limits.values())


def judge(report: DriftReport, limits: Sequence[Limit]) -> tuple[LimitResult, ...]:
    """Hold a report against limits, in the order given.

    Raises
    ------
    EditionError
        If a figure was not measured, for want of a timetable.
    """
    results = []
    for limit in limits:
        measured = limit.figure.read(report)
        if measured is None:
            raise EditionError(
                f"limit {limit}: journeys were not measured, since the edition holds no timetable. "
                "Draw it again from its feed."
            )
        over = measured < limit.value if limit.figure.more_is_better else measured > limit.value
        results.append(LimitResult(limit, measured, over))
    return tuple(results)


def exceeded(report: DriftReport, limits: Sequence[Limit]) -> tuple[LimitResult, ...]:
    """Give the limits that a report exceeds."""
    return tuple(result for result in judge(report, limits) if result.exceeded)
