"""Sentences and lists that several commands print."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterable, Sequence
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from gtfs_schematic.drift.limits import LimitResult
    from gtfs_schematic.drift.model import DriftReport
    from gtfs_schematic.feed.model import FeedInfo, Finding, LeftOut, Severity
    from gtfs_schematic.network.model import Network

FEW = 5
"""How many rows of a long list are shown."""

_PLURALS = {
    "agency": "agencies",
    "boundary": "boundaries",
    "frequency": "frequencies",
    "stop on a line": "stops on lines",
}


def count(number: int, noun: str) -> str:
    """Write a number and a noun: "1 stop", "2 stops"."""
    return f"{number} {noun if number == 1 else _PLURALS.get(noun, noun + 's')}"


def first_few(rows: Sequence[str], *, everything: bool, where: str) -> list[str]:
    """Indent the first rows of a list, and say where the others are."""
    shown = rows if everything else rows[:FEW]
    lines = [f"  {row}" for row in shown]
    if len(rows) > len(shown):
        lines.append(f"  … and {len(rows) - len(shown)} more ({where})")
    return lines


def service_date(info: FeedInfo) -> str:
    """Say which date is drawn, and why."""
    return f"Service date: {info.service_date}. {info.service_reason}"


def size(network: Network) -> str:
    """Say how much a network holds."""
    from gtfs_schematic.network.between import from_station_to_station

    links = len(from_station_to_station(network))
    return (
        f"{count(len(network.lines), 'line')}, {count(len(network.stations), 'station')} in "
        f"{count(network.groups, 'interchange group')}, {count(links, 'link')}, "
        f"{count(len(network.walks), 'walk')}"
    )


def left_out(items: Sequence[LeftOut], *, everything: bool = False, where: str) -> list[str]:
    """List what the diagram does not show, by kind."""
    if not items:
        return ["Left out: nothing"]
    kinds = Counter(item.kind for item in items)
    head = ", ".join(count(kinds[kind], kind) for kind in sorted(kinds))
    rows = [f"{item.kind} {item.id}: {item.reason}" for item in items]
    return [f"Left out: {head}", *first_few(rows, everything=everything, where=where)]


def findings(items: Sequence[Finding], *, everything: bool = False, where: str) -> list[str]:
    """List what is wrong with the feed, the gravest first."""
    from gtfs_schematic.edition.make import sentence

    if not items:
        return ["Findings: none"]
    names: dict[Severity, str] = {"error": "error", "warning": "warning", "info": "note"}
    grades = Counter(item.severity for item in items)
    head = ", ".join(count(grades[grade], names[grade]) for grade in names if grade in grades)
    order = list(names)
    ranked = sorted(items, key=lambda item: order.index(item.severity))
    rows = [sentence(item) for item in ranked]
    return [f"Findings: {head}", *first_few(rows, everything=everything, where=where)]


def drift(report: DriftReport) -> list[str]:
    """Say how far a diagram departs from the ground."""
    figures = report.summary
    worst = max(report.stations, key=lambda s: (s.displacement_m, s.station_id))
    turn = round(report.free.rotation_deg, 1) + 0.0  # no negative zero
    likeness = (
        f"Drift: residual {report.north_up.residual:.3f} with north up, "
        f"{report.free.residual:.3f} turned by {turn:.1f}° (0 is to scale)"
    )
    displacement = (
        f"  displacement: median {100 * figures.displacement_median_share:.1f} %, largest "
        f"{100 * figures.displacement_max_share:.1f} % of {report.diagonal_m / 1000:.1f} km "
        f"({worst.name}, {worst.displacement_m:.0f} m)"
    )
    bearings = (
        f"  bearings: mean change {figures.bearing_mean_deg:.1f}°, "
        f"{100 * figures.bearing_over_45:.1f} % of the length turned by more than 45°, "
        f"{100 * figures.bearing_over_90:.1f} % by more than 90°"
    )
    return [likeness, displacement, bearings, *misled(report)]


def misled(report: DriftReport) -> list[str]:
    """Say whom a diagram misleads."""
    pairs = (
        f"  pairs: {count(len(report.false_neighbors), 'false neighbor')}, "
        f"{count(len(report.hidden_walks), 'hidden walk')}, "
        f"{count(len(report.competing), 'pair')} of competing routes compared wrongly"
    )
    if report.journeys is None:
        return [pairs, "  journeys: not measured, since the edition holds no timetable"]
    over = dict(report.journeys.over)[1.15]
    journeys = (
        f"  journeys: {100 * over:.1f} % of {report.journeys.pairs:,} take over 15 % longer by the "
        f"way that looks shortest, the worst {100 * (report.journeys.largest - 1):.0f} %"
    )
    return [pairs, journeys]


def side_by_side(report: DriftReport, other: DriftReport) -> list[str]:
    """List every figure of two drawings."""
    from gtfs_schematic.drift.figure import written
    from gtfs_schematic.drift.figures import FIGURES

    rows = [
        (figure.name, *(written(figure, figure.read(each)) for each in (report, other)))
        for figure in FIGURES
    ]
    head = ("Side by side", "that drawing", "this edition")
    return [f"{name:<28}{one:>16}{two:>16}" for name, one, two in (head, *rows)]


def limits(results: Iterable[LimitResult]) -> list[str]:
    """Say which limits are kept and which are exceeded."""
    return [
        f"Limit {result.limit}: {'EXCEEDED' if result.exceeded else 'kept'} "
        f"(measured {result.written})"
        for result in results
    ]
