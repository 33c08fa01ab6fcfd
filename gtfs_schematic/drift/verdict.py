"""Say in plain words what of a diagram holds and what to look at."""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping
from dataclasses import dataclass

from gtfs_schematic.drift.model import DriftReport, MisleadingPair

_WINDS = ("north", "north-east", "east", "south-east", "south", "south-west", "west", "north-west")

# From when on a figure is worth a look; common practice, no source, unless one is named.
_TURNED = 0.05
_OCTANTS = 0.78
"""Official diagrams keep more than 78 % of relations of place (ISPRS IJGI 2023, 12(8):309)."""
_DISPLACED = 0.08
_SPREAD = math.log(2.0)
_MISLED = 0.05


@dataclass(frozen=True, slots=True)
class Verdict:
    """Sentences about what holds and what to look at, the most important first."""

    good: tuple[str, ...]
    bad: tuple[str, ...]


def verdict_of(report: DriftReport) -> Verdict:
    """Judge a report for a reader who knows none of its measures."""
    said = [
        *_directions(report),
        *_places(report),
        *_lengths(report),
        *_pairs(report),
        *_journeys(report),
    ]
    return Verdict(
        tuple(text for holds, text in said if holds),
        tuple(text for holds, text in said if not holds),
    )


def wind(direction_deg: float) -> str:
    """Give the name of the nearest of eight compass directions."""
    return _WINDS[round(direction_deg / 45.0) % 8]


def kilometres(metres: float) -> str:
    """Write a distance on the ground."""
    return f"{metres:.0f} m" if metres < 995.0 else f"{metres / 1000.0:.1f} km"


def names_of(report: DriftReport) -> Mapping[str, str]:
    """Give station names by id."""
    return {station.station_id: station.name for station in report.stations}


def percent(share: float) -> str:
    """Write a share; small ones are told apart from none, and large ones from all."""
    if 0.0 < share < 0.001:
        return "under 0.1 %"
    if 0.999 < share < 1.0:
        return "over 99.9 %"
    return f"{100.0 * share:.3g} %"


Said = Iterator[tuple[bool, str]]


def _directions(report: DriftReport) -> Said:
    figures, names = report.summary, names_of(report)
    worst = max(report.links, key=lambda k: abs(k.bearing_change_deg or 0.0), default=None)
    if figures.bearing_over_90 > 0.0 and worst is not None:
        yield (
            False,
            (
                f"{percent(figures.bearing_over_90)} of the network's length seems to run back: "
                f"its links turn by more than 90°. Worst: {names[worst.start]} – "
                f"{names[worst.end]}."
            ),
        )
    elif report.links:
        yield True, "No link seems to run back: none turns by more than 90°."
    turned = figures.bearing_over_45
    yield (
        turned <= _TURNED,
        (
            f"{percent(turned)} of the length turns by more than 45°; the mean turn is "
            f"{figures.bearing_mean_deg:.0f}° (eight directions cost about 11°)."
        ),
    )
    yield (
        figures.octant_agreement >= _OCTANTS,
        (
            f"Seen from any station, {percent(figures.octant_agreement)} of the others lie in the "
            "direction in which the diagram shows them, to an eighth of the compass."
        ),
    )


def _places(report: DriftReport) -> Said:
    share = report.summary.displacement_p95_share
    farthest = max(report.stations, key=lambda s: (s.displacement_m, s.station_id))
    yield (
        share <= _DISPLACED,
        (
            f"95 % of the stations are drawn within {kilometres(share * report.diagonal_m)} "
            f"({percent(share)} of the network's diagonal) of where a true map would have them. "
            f"Farthest: {farthest.name}, {kilometres(farthest.displacement_m)} to the "
            f"{wind(farthest.direction_deg)}."
        ),
    )


def _lengths(report: DriftReport) -> Said:
    spread = report.summary.log_length_sd
    yield (
        spread <= _SPREAD,
        f"The scale varies by a factor of {math.exp(spread):.1f} either way from link to link "
        "(one standard deviation): the diagram does not show how long a ride is."
        if spread > _SPREAD
        else f"The scale varies little: by a factor of {math.exp(spread):.1f} either way from "
        "link to link (one standard deviation).",
    )
    if report.competing:
        yield (
            False,
            (
                f"{_count(len(report.competing), 'pair')} of competing routes look longer or "
                "shorter against each other than they are by more than the set share, enough to "
                "shift riders."
            ),
        )


def _pairs(report: DriftReport) -> Said:
    false, hidden = report.false_neighbors, report.hidden_walks
    if false:
        one = len(false) == 1
        text = "looks like neighbors and is not" if one else "look like neighbors and are not"
        yield False, _told(report, false, text)
    else:
        yield True, "No stations look like neighbors without being it."
    if hidden:
        one = len(hidden) == 1
        text = "is a short walk apart and does not" if one else "are a short walk apart and do not"
        yield False, _told(report, hidden, f"{text} look it")
    else:
        yield True, "No stations that are a short walk apart look far apart."


def _told(report: DriftReport, pairs: tuple[MisleadingPair, ...], text: str) -> str:
    names, pair = names_of(report), pairs[0]
    first = "" if len(pairs) == 1 else "first "
    return (
        f"{_count(len(pairs), 'pair')} of stations {text}: {first}{names[pair.start]} and "
        f"{names[pair.end]}, {kilometres(pair.true_m)} apart and drawn {pair.drawn_links:.1f} "
        "typical links apart."
    )


def _journeys(report: DriftReport) -> Said:
    journeys = report.journeys
    if journeys is None:
        yield False, "Journeys were not measured: the diagram's data holds no timetable."
        return
    names, misled = names_of(report), dict(journeys.over)[1.15]
    text = (
        f"For {percent(misled)} of journeys the way that looks shortest takes over 15 % longer "
        "than the fastest"
    )
    if journeys.worst:
        worst = journeys.worst[0]
        minutes = (worst.looks_shortest.time_s - worst.fastest.time_s) / 60.0
        text += (
            f". Worst: {names[worst.start]} to {names[worst.end]}, {minutes:.0f} minutes or "
            f"{percent(worst.ratio - 1.0)} longer"
        )
    yield misled <= _MISLED, text + "."


def _count(number: int, noun: str) -> str:
    return f"{number} {noun}{'' if number == 1 else 's'}"
