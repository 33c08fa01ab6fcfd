"""Networks made from station places and line courses, for tests that need many of them."""

from __future__ import annotations

import itertools
from collections import defaultdict
from collections.abc import Mapping, Sequence

import numpy as np

from gtfs_schematic.feed.model import FeedInfo
from gtfs_schematic.network.model import Line, Link, Network, Station, Walk
from gtfs_schematic.network.smooth import corridors_of

_DEGREES_PER_KM = 0.009
_INFO = FeedInfo("0" * 64, "Nobody", "1", "2026-01-01", "2026-12-31", "2026-03-11", "a test")


def network_of(
    places_km: Mapping[str, tuple[float, float]],
    courses: Sequence[Sequence[str]],
    walks: Sequence[tuple[str, str]] = (),
) -> Network:
    """Make a network near the equator of stations (km east, km north) and one line per course."""
    lines_on: dict[tuple[str, str], set[str]] = defaultdict(set)
    calls: dict[str, set[str]] = defaultdict(set)
    lines = []
    for number, course in enumerate(courses):
        line = f"L{number:02}"
        lines.append(_line(line, tuple(course)))
        for a, b in itertools.pairwise(course):
            lines_on[min(a, b), max(a, b)].add(line)
        for station in course:
            calls[station].add(line)
    links = tuple(
        Link(f"{a}-{b}", a, b, tuple(sorted(on))) for (a, b), on in sorted(lines_on.items())
    )
    stations = tuple(
        Station(
            id=s, name=f"Station {s}", second_name="", stop_ids=(s,),
            lon=places_km[s][0] * _DEGREES_PER_KM, lat=places_km[s][1] * _DEGREES_PER_KM,
            kind="stop", group=s, lines=tuple(sorted(calls[s])), boarding="unknown",
        )
        for s in sorted(calls)
    )  # fmt: skip
    return Network(
        info=_INFO, agencies=("Nobody",), stations=stations, links=links,
        walks=tuple(Walk(f"walk {a}-{b}", a, b, 120) for a, b in sorted(walks)),
        lines=tuple(lines), corridors=corridors_of(stations, links), findings=(), left_out=(),
    )  # fmt: skip


def _line(line: str, course: tuple[str, ...]) -> Line:
    return Line(
        id=line, name=line, long_name="", color="#335577", text_color="#FFFFFF",
        color_from_feed=True, mode="metro", route_ids=(line,), itineraries=(course,),
        courses=(course,), trips=20, service="all-day", first_departure_s=18000,
        last_departure_s=80000, headway_s=600,
    )  # fmt: skip


def wandering_network(seed: int, side: int, lines: int, length: int) -> Network:
    """Make lines wander over a shaken grid of `side` × `side` stations, diagonals included."""
    chance = np.random.default_rng(seed)
    places = {
        f"S{x:02}{y:02}": (x * 0.7 + chance.normal(0, 0.16), y * 0.7 + chance.normal(0, 0.16))
        for x in range(side)
        for y in range(side)
    }
    courses = []
    for _ in range(lines):
        x, y = (int(v) for v in chance.integers(0, side, 2))
        heading = int(chance.integers(0, 8))
        course = [(x, y)]
        for _ in range(length):
            heading = (heading + int(chance.choice([-1, 0, 0, 0, 1]))) % 8
            dx = (1, 1, 0, -1, -1, -1, 0, 1)[heading]
            dy = (0, 1, 1, 1, 0, -1, -1, -1)[heading]
            x, y = x + dx, y + dy
            if not (0 <= x < side and 0 <= y < side) or (x, y) in course:
                break
            course.append((x, y))
        if len(course) > 2:
            courses.append([f"S{x:02}{y:02}" for x, y in course])
    courses = courses or [["S0000", "S0101"]]
    return network_of(places, courses)


def radial_network(seed: int, arms: int, rings: int, stations: int) -> Network:
    """Make `arms` / 2 lines through one centre, `rings` ring lines, `stations` to an arm."""
    chance = np.random.default_rng(seed)
    places = {"C": (0.0, 0.0)}
    for arm, step in itertools.product(range(arms), range(1, stations + 1)):
        angle = 2 * np.pi * (arm + chance.normal(0, 0.08)) / arms
        radius = 0.6 * step**1.3 + chance.normal(0, 0.05)
        places[f"A{arm}N{step:02}"] = (radius * np.cos(angle), radius * np.sin(angle))
    arm_of = [[f"A{arm}N{step:02}" for step in range(1, stations + 1)] for arm in range(arms)]
    courses = [[*reversed(arm_of[arm]), "C", *arm_of[arm + arms // 2]] for arm in range(arms // 2)]
    for ring in range(1, rings + 1):
        step = ring * stations // (rings + 1)
        around = [arm_of[arm][step] for arm in range(arms)]
        courses.append([*around, around[0]])
    return network_of(places, courses)


def star_network(seed: int, arms: int, stations: int = 2) -> Network:
    """Make lines through one centre with any number of arms; an odd arm ends there."""
    chance = np.random.default_rng(seed)
    places = {"C": (0.0, 0.0)}
    for arm in range(arms):
        angle = 2 * np.pi * (arm + chance.normal(0, 0.1)) / arms
        for step in range(1, stations + 1):
            places[f"A{arm:02}N{step}"] = (1.2 * step * np.cos(angle), 1.2 * step * np.sin(angle))
    arm_of = [[f"A{arm:02}N{step}" for step in range(1, stations + 1)] for arm in range(arms)]
    half = arms // 2
    courses = [[*reversed(arm_of[arm]), "C", *arm_of[arm + half]] for arm in range(half)]
    if arms % 2:
        courses.append([*reversed(arm_of[-1]), "C"])
    return network_of(places, courses)


def hub_network(side: int = 5) -> Network:
    """Make a grid of lines with four more through the middle station: it has twelve arms."""
    places = {f"G{x}{y}": (1.0 * x, 1.0 * y) for x in range(side) for y in range(side)}
    courses = [[f"G{x}{y}" for y in range(side)] for x in range(side)]
    courses += [[f"G{x}{y}" for x in range(side)] for y in range(side)]
    m = side // 2
    for (a, b), (c, d) in (
        ((1, 1), (-1, 1)), ((1, -1), (-1, -1)), ((2, 1), (-2, -1)), ((1, -2), (-1, 2)),
    ):  # fmt: skip
        courses.append([f"G{m + a}{m + b}", f"G{m}{m}", f"G{m + c}{m + d}"])
    return network_of(places, courses)
