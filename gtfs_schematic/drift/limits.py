"""Limits that a user sets on drift, such as ``residual<0.1``."""

from __future__ import annotations

import difflib
import math
import re
from collections.abc import Callable, Sequence
from dataclasses import dataclass

from gtfs_schematic.drift.model import DriftReport
from gtfs_schematic.errors import UsageError

MEASURES: dict[str, tuple[str, Callable[[DriftReport], float]]] = {
    "residual": (
        "residual of the north-up fit, 0 to 1",
        lambda report: report.north_up.residual,
    ),
    "free-residual": (
        "residual of the free fit, 0 to 1",
        lambda report: report.free.residual,
    ),
    "rotation": (
        "turn of the free fit, degrees either way",
        lambda report: abs(report.free.rotation_deg),
    ),
    "displacement": (
        "largest station displacement, percent of the network's diagonal",
        lambda report: 100.0 * report.summary.displacement_max_share,
    ),
    "displacement-m": (
        "largest station displacement, metres on the ground",
        lambda report: max(station.displacement_m for station in report.stations),
    ),
    "bearing": (
        "largest bearing change of a link, degrees either way",
        lambda report: max(
            (abs(link.bearing_change_deg or 0.0) for link in report.links), default=0.0
        ),
    ),
    "bearing-p95": (
        "95th percentile of the bearing change, degrees",
        lambda report: report.summary.bearing_p95_deg,
    ),
    "order-flips": (
        "share of pairs whose order along an axis is turned round, 0 to 1",
        lambda report: report.summary.order_flips,
    ),
}
"""Per name of a measure what it means and how it is read from a report."""

_FORM = re.compile(r"\s*([a-z0-9-]+)\s*(<=|<)\s*([0-9.eE+-]+)\s*")


@dataclass(frozen=True, slots=True)
class Limit:
    """What a measure must stay below, or at most reach."""

    measure: str
    strict: bool
    """Whether the measure must stay below the value; else it may reach it."""
    value: float

    def __str__(self) -> str:
        """Write the limit as a user would."""
        return f"{self.measure}{'<' if self.strict else '<='}{self.value:g}"


@dataclass(frozen=True, slots=True)
class LimitResult:
    """A limit and what was measured."""

    limit: Limit
    measured: float
    exceeded: bool


def parse_limit(text: str) -> Limit:
    """Read one limit.

    Raises
    ------
    UsageError
        If the text is not of the form MEASURE<VALUE, or the measure is unknown.
    """
    match = _FORM.fullmatch(text)
    try:
        name, sign, value = match.groups() if match else ("", "", "nan")
        number = float(value)
    except ValueError:
        number = math.nan
    if not match or not math.isfinite(number):
        raise UsageError(
            f"limit {text!r}: not of the form MEASURE<VALUE or MEASURE<=VALUE, "
            f"for example residual<0.1. Measures: {', '.join(MEASURES)}."
        )
    if name not in MEASURES:
        near = difflib.get_close_matches(name, MEASURES, 1)
        hint = f" Did you mean {near[0]}?" if near else ""
        raise UsageError(f"limit {text!r}: no such measure.{hint} Known: {', '.join(MEASURES)}.")
    return Limit(name, sign == "<", number)


def judge(report: DriftReport, limits: Sequence[Limit]) -> tuple[LimitResult, ...]:
    """Hold a report against limits, in the order given."""
    results = []
    for limit in limits:
        measured = MEASURES[limit.measure][1](report)
        over = measured >= limit.value if limit.strict else measured > limit.value
        results.append(LimitResult(limit, measured, over))
    return tuple(results)


def exceeded(report: DriftReport, limits: Sequence[Limit]) -> tuple[LimitResult, ...]:
    """Give the limits that a report exceeds."""
    return tuple(result for result in judge(report, limits) if result.exceeded)
