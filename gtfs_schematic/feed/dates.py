"""Choosing the service dates: a date, a range, or what riders call a weekday, Saturday, night."""

from __future__ import annotations

import datetime as dt
from collections import Counter
from collections.abc import Collection, Mapping, Sequence
from dataclasses import dataclass, replace

from gtfs_schematic.errors import FeedError, UsageError
from gtfs_schematic.feed.service import Validity
from gtfs_schematic.feed.usual import usual_of

DEFAULT = "typical-weekday"
NAMED: Mapping[str, tuple[str, frozenset[int]]] = {
    DEFAULT: ("typical weekday", frozenset(range(5))),
    "saturday": ("typical Saturday", frozenset({5})),
    "sunday": ("typical Sunday", frozenset({6})),
}
"""What can be asked for by name, and the weekdays (0 Monday) that it means."""

_HOUR = 3600
_DAY = 24 * _HOUR
EARLY = (1 * _HOUR, 4 * _HOUR)
LATE = (EARLY[0] + _DAY, EARLY[1] + _DAY)
"""Trips that start from 01:00 to before 04:00 are night service: by then the last ordinary trips
are out, and the first of the morning are not (common practice, no source). Feeds put them before
a date's morning, or after its evening, past 24:00."""
EVER = (-(10**9), 10**9)
_WEEKDAYS = ("Monday", "Tuesday", "Wednesday", "Thursday", "Friday", "Saturday", "Sunday")
_MONTHS = (
    *("January", "February", "March", "April", "May", "June", "July"),
    *("August", "September", "October", "November", "December"),
)


@dataclass(frozen=True, slots=True)
class Window:
    """Trips of one date that depart within hours; seconds after noon minus 12 h."""

    date: dt.date
    low: int = EVER[0]
    high: int = EVER[1]
    """The first time that is too late."""
    shift: int = 0
    """To be added to the departures, so that they count from another date."""


@dataclass(frozen=True)
class Choice:
    """What is drawn."""

    date: dt.date
    """The service date; of several, the busiest."""
    days: tuple[tuple[Window, ...], ...]
    """A departure counts as often as in the day that has it most often."""
    when: str
    """Such as "on 2026-03-11", to follow "runs"."""
    reason: str
    """One sentence or two for a person."""


def choose_dates(feeds: Sequence[Validity], wanted: str) -> Choice:
    """Choose the service dates for one or several feeds together.

    Parameters
    ----------
    wanted
        "typical-weekday", "saturday", "sunday", "night", "busiest", a date as YYYY-MM-DD, or a
        range of dates as YYYY-MM-DD/YYYY-MM-DD (an interval of ISO 8601, both dates included).

    Raises
    ------
    UsageError
        `wanted` is none of these.
    FeedError
        The dates are outside a feed's validity, or no feed runs then; the feeds share no date.

    Notes
    -----
    Of several feeds only dates count on which most of them run. What is typical among the
    Saturdays, the Sundays, the nights, or the dates from Monday to Friday, `usual.usual_of` tells;
    without any service from Monday to Friday, the busiest date is taken.
    """
    if wanted == "busiest":
        return _busiest(feeds, "")
    if wanted == "night":
        return _night(feeds)
    if wanted in NAMED:
        return _typical(feeds, wanted)
    if "/" in wanted:
        return _range(feeds, wanted)
    return _given(feeds, wanted)


def with_expiry(choice: Choice, feeds: Sequence[Validity], today: str) -> Choice:
    """Add to the reason that a feed has expired, or does not hold yet.

    Parameters
    ----------
    today
        YYYY-MM-DD; "" says nothing, so that what comes out does not hang on the day of the run.
    """
    if not today:
        return choice
    date = _parsed(today)
    told = [
        f" {feed.label} has expired: it was valid until {feed.end}, and today is {date}."
        for feed in feeds
        if feed.end < date
    ] + [
        f" {feed.label} is not valid yet: it starts on {feed.start}, and today is {date}."
        for feed in feeds
        if feed.start > date
    ]
    return replace(choice, reason=choice.reason + "".join(told))


def _given(feeds: Sequence[Validity], wanted: str) -> Choice:
    date = _parsed(wanted)
    _check_inside(feeds, date, date)
    total = sum(feed.count(date) for feed in feeds)
    if total == 0:
        _refuse_empty(feeds, date, f"on {_spoken(date)}, {date}")
    return _one(date, f"{_spoken(date)} was asked for; it has {_trips(total)}.")


def _range(feeds: Sequence[Validity], wanted: str) -> Choice:
    start, end = map(_parsed, wanted.split("/", 1))
    if end < start:
        raise UsageError(
            f"The range {wanted!r} ends before it starts. Write the earlier date first."
        )
    _check_inside(feeds, start, end)
    totals = {
        date: sum(feed.count(date) for feed in feeds)
        for date in sorted({date for feed in feeds for date in feed.days if start <= date <= end})
    }
    if not any(totals.values()):
        _refuse_empty(feeds, start, f"from {start} to {end}")
    busiest = min(totals, key=lambda date: (-totals[date], date))
    return Choice(
        busiest,
        tuple((Window(date),) for date in totals),
        f"from {start} to {end}",
        f"{start} to {end} was asked for: all trips of its {_dates(len(totals))} with service, "
        f"each departure as often as on the date that has it most often. The busiest date is "
        f"{_spoken(busiest)}, with {_trips(totals[busiest])}.",
    )


def _typical(feeds: Sequence[Validity], wanted: str) -> Choice:
    name, weekdays = NAMED[wanted]
    totals, span = _totals(feeds, weekdays)
    if not totals:
        if wanted == DEFAULT:
            return _busiest(feeds, "There is no service from Monday to Friday. ")
        first = min(date for feed in feeds for date in feed.days)
        raise FeedError(
            f"No trip runs on a {name.split()[-1]} {span}. The first date with service is "
            f"{first}; give a date, or {DEFAULT}."
        )
    usual = usual_of(totals)
    kind = "date from Monday to Friday" if wanted == DEFAULT else _WEEKDAYS[usual.date.weekday()]
    if len(totals) == 1:
        told = f"is the only {kind} with service {span}; it has {_trips(usual.trips)}."
        return _one(usual.date, f"{_spoken(usual.date)} {told}")
    kinds = "dates from Monday to Friday" if wanted == DEFAULT else f"{kind}s"
    return _one(
        usual.date,
        f"{_spoken(usual.date)} is the busiest {name}: it has {_trips(usual.trips)}, and of the "
        f"{len(totals):,} {kinds} with service {span}, {usual.told}.",
    )


def _busiest(feeds: Sequence[Validity], before: str) -> Choice:
    totals, span = _totals(feeds, range(7))
    date = min(totals, key=lambda d: (-totals[d], d))
    same = sum(total == totals[date] for total in totals.values())
    first = f", as the first of {same} such dates" if same > 1 else ""
    if len(totals) == 1:
        return _one(
            date,
            f"{before}{_spoken(date)} is the only date with service {span}; it has "
            f"{_trips(totals[date])}.",
        )
    return _one(
        date,
        f"{before}{_spoken(date)} has the most trips, {totals[date]:,}, of the "
        f"{_dates(len(totals))} with service {span}{first}.",
    )


def _night(feeds: Sequence[Validity]) -> Choice:
    start, end = max(feed.start for feed in feeds), min(feed.end for feed in feeds)
    nights: Counter[dt.date] = Counter()
    for feed in feeds:
        for date, services in feed.days.items():
            nights[date] += sum(feed.late.get(service, 0) for service in services)
            if date > dt.date.min:
                eve = date - dt.timedelta(days=1)
                nights[eve] += sum(feed.early.get(service, 0) for service in services)
    inside = {date: count for date, count in nights.items() if start <= date <= end and count}
    if not inside:
        raise FeedError(
            f"No trip starts in the night, from 01:00 to before 04:00, from {start} to {end}. "
            f"Give a date, or {DEFAULT}."
        )
    usual = usual_of(inside)
    windows = [Window(usual.date, *LATE)]
    if usual.date < dt.date.max:
        windows.append(Window(usual.date + dt.timedelta(days=1), *EARLY, shift=_DAY))
    hours = "from 01:00 to before 04:00"
    starts = f"{_trips(usual.trips)} {'starts' if usual.trips == 1 else 'start'} {hours}"
    among = f"of the {len(inside):,} nights with such trips from {start} to {end}, {usual.told}"
    if len(inside) == 1:
        among = f"no other night has any from {start} to {end}"
    return Choice(
        usual.date,
        (tuple(windows),),
        f"in the night after {usual.date}",
        f"The night after {_spoken(usual.date)} is the busiest typical night: {starts}, and "
        f"{among}.",
    )


def _totals(feeds: Sequence[Validity], weekdays: Collection[int]) -> tuple[dict[dt.date, int], str]:
    """Give the trips of every date on which most feeds run, and the range looked at in words."""
    start, end = max(feed.start for feed in feeds), min(feed.end for feed in feeds)
    totals: Counter[dt.date] = Counter()
    running: Counter[dt.date] = Counter()
    for feed in feeds:
        for date in feed.days:
            if start <= date <= end:
                totals[date] += feed.count(date)
                running[date] += 1
    if not totals:
        ranges = "; ".join(f"{feed.label}: {feed.start} to {feed.end}" for feed in feeds)
        raise FeedError(
            f"The feeds share no date with service ({ranges}). Give feeds that hold at one time."
        )
    most = max(running.values())
    kept = {
        date: total
        for date, total in sorted(totals.items())
        if running[date] == most and date.weekday() in weekdays
    }
    return kept, f"from {start} to {end}"


def _check_inside(feeds: Sequence[Validity], start: dt.date, end: dt.date) -> None:
    for feed in feeds:
        if end < feed.start or start > feed.end:
            told = f"{start}" if start == end else f"{start} to {end}"
            raise FeedError(
                f"{told} is outside the validity of {feed.label}, which is {feed.start} to "
                f"{feed.end}. Give a date within it."
            )


def _refuse_empty(feeds: Sequence[Validity], date: dt.date, when: str) -> None:
    near = sorted({d for f in feeds for d in f.days}, key=lambda d: (abs(d - date), d))
    raise FeedError(f"No trip runs {when}. The nearest date with service is {near[0]}.")


def _parsed(text: str) -> dt.date:
    try:
        return dt.date.fromisoformat(text.strip())
    except ValueError:
        raise UsageError(
            f"{text!r} is no service date: write YYYY-MM-DD, for example 2026-03-11, a range such "
            f"as 2026-03-09/2026-03-15, or one of {', '.join((*NAMED, 'night', 'busiest'))}."
        ) from None


def _one(date: dt.date, reason: str) -> Choice:
    return Choice(date, ((Window(date),),), f"on {date}", reason)


def _trips(count: int) -> str:
    return f"{count:,} trip{'' if count == 1 else 's'}"


def _dates(count: int) -> str:
    return f"{count:,} date{'' if count == 1 else 's'}"


def _spoken(date: dt.date) -> str:
    return f"{_WEEKDAYS[date.weekday()]} {date.day} {_MONTHS[date.month - 1]} {date.year}"
