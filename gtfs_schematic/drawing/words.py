"""Runs of text: measuring, wrapping, and the sentences that every sheet carries."""

from __future__ import annotations

import bisect
import datetime as dt
import math
import re
import unicodedata
from collections.abc import Iterator, Sequence

from gtfs_schematic.drawing.model import DrawingSettings, TextShape
from gtfs_schematic.labels import fonts
from gtfs_schematic.network.model import Line, Network, ServicePattern, Station, Walk

CAUTIONS = (
    (
        "Schematic diagram, not to scale; north is roughly at the top. "
        "Not for navigation, operation, works or evacuation."
    ),
    (
        "For times and access, the publications of the operator and the local authority hold. "
        "Step-free information comes from the feed and must be verified with the operator."
    ),
)
"""What every sheet says of itself."""
SERVICE_NOTES: dict[ServicePattern, str] = {
    "all-day": "",
    "peak": "peak hours only",
    "night": "nights only",
    "some-days": "not every day",
}
MODE_NAMES = {
    "metro": "Metro",
    "rail": "Rail",
    "monorail": "Monorail",
    "tram": "Tram",
    "cable": "Cable tram",
    "funicular": "Funicular",
    "aerial": "Aerial lift",
    "bus": "Bus",
    "trolleybus": "Trolleybus",
    "ferry": "Ferry",
    "other": "Other lines",
}
_DAYS = ("Monday", "Tuesday", "Wednesday", "Thursday", "Friday", "Saturday", "Sunday")
_WORDS = re.compile(r"\S+(?:\s[–—/·-](?=\s|$))*")
"""Words, a dash or stroke between blanks staying with the word before it."""
_NATURAL = re.compile(r"(\d+)")


def run(
    text: str, at: tuple[float, float], size: float, fill: str, *, bold: bool = False
) -> TextShape:
    """Give a run of text with its baseline start at `at`, measured; millimetres."""
    return TextShape(
        text=text,
        x=at[0],
        y=at[1],
        size=size,
        fill=fill,
        width=fonts.text_width_mm(text, size, bold=bold),
        bold=bold,
    )


def wrap(text: str, width: float, size: float, *, bold: bool = False) -> tuple[str, ...]:
    """Break a text at blanks into as few lines as fit `width` millimetres, about equally long.

    Words stay whole, but for those that are wider.
    """
    words = [
        part for word in _WORDS.findall(text) for part in _broken(word, width, size, bold=bold)
    ]
    best = _filled(words, width, size, bold=bold)
    if len(best) < 2:
        return best
    # Set again ever narrower, as long as that takes no further line.
    for twentieths in range(19, 9, -1):
        narrower = _filled(words, width * twentieths / 20.0, size, bold=bold)
        if len(narrower) > len(best):
            break
        best = narrower
    return best


def _broken(word: str, width: float, size: float, *, bold: bool) -> Iterator[str]:
    """Break a word into parts that fit, if it is too wide, and a letter fits."""
    while len(word) > 1 and fonts.text_width_mm(word, size, bold=bold) > width:
        fits = bisect.bisect_right(
            range(1, len(word)),
            width,
            key=lambda letters: fonts.text_width_mm(word[:letters], size, bold=bold),
        )
        yield word[: max(fits, 1)]
        word = word[max(fits, 1) :]
    yield word


def _filled(words: Sequence[str], width: float, size: float, *, bold: bool) -> tuple[str, ...]:
    """Set words in lines, each as full as `width` allows."""
    lines: list[str] = []
    for word in words:
        longer = f"{lines[-1]} {word}" if lines else word
        if lines and fonts.text_width_mm(longer, size, bold=bold) <= width:
            lines[-1] = longer
        else:
            lines.append(word)
    return tuple(lines)


def natural(text: str) -> tuple[tuple[int, int, str], ...]:
    """Give a sort key that puts line 2 before line 10."""
    return tuple(
        # Python turns no text of thousands of digits into a number.
        (0, int(part), "") if part.isdecimal() and len(part) < 19 else (1, 0, part.casefold())
        for part in _NATURAL.split(text)
        if part
    )


def alphabetical(text: str) -> tuple[tuple[tuple[int, int, str], ...], ...]:
    """Give a sort key that puts a letter with a mark beside the one without."""
    bare = "".join(c for c in unicodedata.normalize("NFKD", text) if not unicodedata.combining(c))
    return natural(bare), natural(text)


def sheet_title(network: Network, settings: DrawingSettings) -> str:
    """Give the title: the one asked for, or publisher (else agency) and "network diagram"."""
    if settings.title:
        return settings.title
    name = network.info.publisher or ", ".join(network.agencies)
    return f"{name}: network diagram" if name else "Network diagram"


def validity(network: Network) -> str:
    """Give the dates for which the timetable holds, as an ISO 8601 interval if both are known."""
    start, end = network.info.start_date, network.info.end_date
    if start and end:
        return f"Valid {start}/{end}"
    if start or end:
        return f"Valid from {start}" if start else f"Valid until {end}"
    return ""


def subtitle(network: Network) -> str:
    """Give dates, publisher and version in one line; what is unknown is left out."""
    info = network.info
    source = ", ".join(
        part
        for part in (info.publisher, f"feed version {info.version}" if info.version else "")
        if part
    )
    parts = (
        validity(network),
        f"Service of {_dated(info.service_date)}" if info.service_date else "",
        f"Data: {source}" if source else "",
    )
    return "  ·  ".join(part for part in parts if part)


def _dated(date: str) -> str:
    """Give a date with its day of the week."""
    try:
        return f"{_DAYS[dt.date.fromisoformat(date).weekday()]} {date}"
    except ValueError:
        return date


def how_often(line: Line) -> str:
    """Give the time between departures, at midday if there are any; "" if unknown."""
    midday = [part.headway_s for part in line.periods if part.period == "midday"]
    headway = (midday[0] if midday else None) or line.headway_s
    return f"every {max(1, round(headway / 60.0))} min" if headway else ""


def hours(line: Line) -> str:
    """Give the first and the last departure on the service date."""
    first, last = _clock(line.first_departure_s), _clock(line.last_departure_s)
    return f"departures from {first} to {last}"


def _clock(seconds: int) -> str:
    """Give a time of the clock; what lies past midnight is said to."""
    days, rest = divmod(seconds, 86400)
    text = f"{rest // 3600:02d}:{rest % 3600 // 60:02d}"
    return f"{text} on the next day" if days > 0 else text


def credits_line(network: Network, settings: DrawingSettings) -> str:
    """Give the attribution: the one asked for, then the feed's own, without repeats."""
    owed = "; ".join(dict.fromkeys(network.info.attributions))
    parts = [settings.attribution, f"Credit: {owed}." if owed else ""]
    if any(parts):
        return " ".join(part for part in parts if part)
    source = network.info.publisher or ", ".join(network.agencies)
    return f"Timetable data: {source}." if source else ""


def notes(network: Network, settings: DrawingSettings) -> tuple[str, ...]:
    """Give the paragraphs at the foot of the sheet."""
    return tuple(part for part in (*CAUTIONS, credits_line(network, settings)) if part)


def line_title(line: Line, network: Network) -> str:
    """Give what a line is called beside its name: its long name, or where it runs."""
    if line.long_name and line.long_name.casefold() != line.name.casefold():
        return line.long_name
    return line_course(line, network)


def line_course(line: Line, network: Network) -> str:
    """Give a line's ends, e.g. "Furt – Lohe / Moorende", or say that it is a ring.

    An itinerary that calls only at stations of a longer one is a short working, not a branch.
    """
    calls = sorted((set(course) for course in line.itineraries), key=len)
    ends = [
        (course[0], course[-1])
        for course in line.itineraries
        if course and not any(set(course) < longer for longer in calls)
    ]
    if not ends:
        return line.name
    start, end = ends[0]
    if start == end:
        return f"Ring by {_name(network, start)}"
    others = [b if a == start else a for a, b in ends[1:] if start in (a, b)]
    far = dict.fromkeys(_name(network, end) for end in (end, *others) if end != start)
    return f"{_name(network, start)} – {' / '.join(far)}"


def station_title(station: Station, network: Network) -> str:
    """Give the text alternative of a station: its name, kind if it is special, and lines."""
    names = sorted((network.line[line].name for line in station.lines), key=natural)
    kind = "" if station.kind == "stop" else f" ({station.kind})"
    lines = f"{'line' if len(names) == 1 else 'lines'} {', '.join(names)}" if names else ""
    return f"{station.name}{kind}{': ' if lines else ''}{lines}"


def walk_title(walk: Walk, network: Network) -> str:
    """Give the text alternative of a walk, with its time in whole minutes, never too short."""
    ends = f"{_name(network, walk.start)} – {_name(network, walk.end)}"
    return f"Walk {ends}{walk_time(walk.time_s)}"


def walk_time(time_s: int | None) -> str:
    """Give the time of a walk behind a comma, in whole minutes, never too short."""
    return "" if time_s is None else f", {math.ceil(time_s / 60)} min"


def description(network: Network) -> str:
    """Give the text alternative of the whole diagram: what it shows, and where each line runs."""
    lines = sorted(network.lines, key=lambda line: (natural(line.name), line.id))
    counts = f"{len(lines)} lines and {len(network.stations)} stations"
    courses = "; ".join(f"{line.name}: {line_course(line, network)}" for line in lines)
    return f"Schematic diagram of {counts}. {courses}."


def sentence(parts: Sequence[str]) -> str:
    """Join the parts that say something with commas."""
    return ", ".join(part for part in parts if part)


def _name(network: Network, station_id: str) -> str:
    station = network.station.get(station_id)
    return station.name if station else station_id
