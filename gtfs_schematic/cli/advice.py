"""What a person may want to do about a feed: expired data, too many lines for one diagram."""

from __future__ import annotations

import datetime as dt
from collections import Counter
from typing import TYPE_CHECKING

import click

from gtfs_schematic.cli.words import count

if TYPE_CHECKING:
    from gtfs_schematic.feed.model import FeedInfo
    from gtfs_schematic.network.model import Network

_MANY_LINES = 30
_FEW_TRIPS = 5
_LISTED = 5
_STEPS = (5, 10, 20, 30, 40, 60, 80, 100, 150, 200)
"""More lines than a key can hold, and the numbers of trips to try instead; our own choice."""


def expiry(info: FeedInfo, today: dt.date) -> str:
    """Say that a feed does not hold today; "" if it does."""
    if info.end_date and dt.date.fromisoformat(info.end_date) < today:
        return (
            f"The feed has expired: it was valid until {info.end_date}, and today is {today}. "
            "Ask its publisher for a newer one."
        )
    if info.start_date and dt.date.fromisoformat(info.start_date) > today:
        return f"The feed is not valid yet: it starts on {info.start_date}, and today is {today}."
    return ""


def tell_expiry(info: FeedInfo) -> None:
    """Write on standard error that a feed does not hold today, if so.

    Only here does the day of the run count: what is written to files and standard output is the
    same on any day.
    """
    told = expiry(info, dt.datetime.now(tz=dt.UTC).date())
    if told:
        click.echo(f"Note: {told}", err=True)


def suggestions(network: Network) -> list[str]:
    """Suggest options that would make a clearer diagram, one sentence each."""
    modes = Counter(line.mode for line in network.lines)
    told = []
    for mode, lines in sorted(modes.items()):
        if lines > _MANY_LINES:
            others = ", ".join(other for other in sorted(modes) if other != mode)
            without = f"--mode to keep only {others}, or " if others else ""
            told.append(f"{count(lines, f'{mode} line')}: consider {without}{_fewer(network)}.")
    rare = sum(line.trips < _FEW_TRIPS for line in network.lines)
    if rare and len(network.lines) > rare:
        told.append(
            f"{count(rare, 'line')} with fewer than {_FEW_TRIPS} trips: consider --min-trips "
            f"{_FEW_TRIPS}, or --without-route for school runs and the like."
        )
    if len(network.agencies) > 1 and len(network.lines) > _MANY_LINES:
        few = ", ".join(network.agencies[:_LISTED])
        more = ", …" if len(network.agencies) > _LISTED else ""
        told.append(
            f"{count(len(network.agencies), 'agency')}: consider --agency to keep only some of "
            f"{few}{more}."
        )
    if len(network.findings) and any(item.severity == "error" for item in network.findings):
        told.append("Errors in the feed may hide lines or stops: tell its publisher.")
    return told


def _fewer(network: Network) -> str:
    """Suggest the least number of trips that leaves few enough lines."""
    for trips in _STEPS:
        left = sum(line.trips >= trips for line in network.lines)
        if left <= _MANY_LINES:
            return f"--min-trips {trips}, which leaves {count(left, 'line')}"
    return "--route to keep only some"
