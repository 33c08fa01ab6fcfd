"""Choosing the service dates: a date, a range, or what riders call a weekday, Saturday, night."""

from __future__ import annotations

import datetime as dt
from collections import Counter
from collections.abc import Collection, Mapping, Sequence
from dataclasses import dataclass, replace

from gtfs_schematic.errors import FeedError, UsageError
from gtfs_schematic.feed.service import Validity

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
_RARE = 0.25
_VERY_RARE = 0.05
_FEW, _MANY = 3, 10
_NEARLY = 0.98
_POOR = 0.5
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
    Of several feeds only dates count on which most of them run. A typical Saturday is found so: the
    number of trips is wanted that is as high as possible and yet usual, which it is if nearly
    (98 %) as many or more run on a quarter of the Saturdays with at least half as many, on a
    twentieth of all Saturdays (or ten), and on three (half of them, if there are fewer than six).
    The earliest Saturday with that number is taken. So neither a holiday nor an event nor a period
    of thin service is typical, but term time is. A typical weekday is found likewise among Mondays
    to Fridays, where a quarter is more than one of five: late trips on Fridays alone are not
    typical. Without any, the busiest date is taken. The shares are our own choice.
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
        nights = sorted({date for feed in feeds for date in feed.days})
        raise FeedError(
            f"No trip runs on a {name.split()[-1]} {span}. The first date with service is "
            f"{nights[0]}; give a date, or {DEFAULT}."
        )
    usual = _usual(list(totals.values()))
    date = min(date for date, total in totals.items() if total == usual)
    kind = "date from Monday to Friday" if wanted == DEFAULT else _WEEKDAYS[date.weekday()]
    if len(totals) == 1:
        return _one(
            date,
            f"{_spoken(date)} is the only {kind} with service {span}; it has {_trips(usual)}.",
        )
    kind = kind.replace("date", "dates") if wanted == DEFAULT else f"{kind}s"
    alike = sum(_NEARLY * usual <= n <= usual / _NEARLY for n in totals.values())
    told = "all" if alike == len(totals) else f"{alike:,}"
    more = sum(n > usual / _NEARLY for n in totals.values())
    apart = f"; {more} with more trips {'is' if more == 1 else 'are'} not typical" if more else ""
    return _one(
        date,
        f"{_spoken(date)} is the busiest {name}: it has {_trips(usual)}, and of the "
        f"{len(totals):,} {kind} with service {span}, {told} have about as many{apart}.",
    )


def _usual(totals: Sequence[int]) -> int:
    """Give the highest number of trips that is not rare; see `choose_dates`."""
    few = min(_FEW, len(totals) / 2)
    for total in sorted(set(totals), reverse=True):
        alike = sum(other >= _NEARLY * total for other in totals)
        similar = sum(other >= _POOR * total for other in totals)
        if alike >= max(_RARE * similar, min(_VERY_RARE * len(totals), _MANY), few):
            return total
    return max(totals)


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
    date = min(inside, key=lambda d: (-inside[d], d))
    windows = [Window(date, *LATE)]
    if date < dt.date.max:
        windows.append(Window(date + dt.timedelta(days=1), *EARLY, shift=_DAY))
    return Choice(
        date,
        (tuple(windows),),
        f"in the night after {date}",
        f"The night after {_spoken(date)} has the most trips that start from 01:00 to before "
        f"04:00, {inside[date]:,}, of the {len(inside):,} nights with such trips from {start} to "
        f"{end}.",
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
