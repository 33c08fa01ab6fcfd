"""Small diagrams that know a timetable, for tests of the drift."""

from __future__ import annotations

import itertools
from dataclasses import dataclass

from gtfs_schematic.drift.placed import TimedPattern
from gtfs_schematic.geometry import Point

METRES_EAST = 111_319.49
"""Of a degree along the equator of WGS 84: 2π · 6378137 m / 360."""
METRES_NORTH = 110_574.28
"""Of a degree along a meridian where it meets the equator: 2π · 6335439 m / 360."""


@dataclass(frozen=True)
class Stop:
    """A drawn station on the equator: x, y in metres north-east of (0, 0)."""

    id: str
    x_m: float
    y_m: float
    x_mm: float
    y_mm: float
    group: str = ""
    change_s: int | None = None

    @property
    def name(self) -> str:
        """Name of the station."""
        return f"Stop {self.id.upper()}"

    @property
    def stop_ids(self) -> tuple[str, ...]:
        """Two platforms."""
        return (f"{self.id}1", f"{self.id}2")

    @property
    def lon(self) -> float:
        """Degrees east."""
        return self.x_m / METRES_EAST

    @property
    def lat(self) -> float:
        """Degrees north."""
        return self.y_m / METRES_NORTH


@dataclass(frozen=True)
class Rail:
    """A drawn link."""

    id: str
    start: str
    end: str
    lines: tuple[str, ...]
    path_mm: tuple[Point, ...]
    time_s: int | None = None


@dataclass(frozen=True)
class Named:
    """A line."""

    id: str
    name: str
    color: str = "#AA0000"


@dataclass(frozen=True)
class Drawn:
    """A whole diagram."""

    stations: tuple[Stop, ...]
    links: tuple[Rail, ...]
    walks: tuple[Rail, ...]
    lines: tuple[Named, ...]
    patterns: tuple[TimedPattern, ...] = ()


def rail(key: str, a: Stop, b: Stop, *lines: str, time_s: int | None = None) -> Rail:
    """Join two stops by a straight link."""
    ends = ((a.x_mm, a.y_mm), (b.x_mm, b.y_mm))
    return Rail(key, a.id, b.id, lines, ends, time_s)


def two_ways() -> Drawn:
    """Draw a slow line short and a fast one long, from A to D; the worked example of a test.

    Line 1 runs A B D, line 2 A C D; a walk joins D and E, which line 3 joins with F.
    """
    a, b = Stop("a", 0, 0, 0, 0, "a"), Stop("b", 1000, 900, 10, -10, "b")
    c = Stop("c", 1000, -900, 10, 30, "c")
    d = Stop("d", 2000, 0, 20, 0, "d", change_s=60)
    e, f = Stop("e", 2100, 0, 25, 0, "d"), Stop("f", 3000, 0, 35, 0, "f")
    hour = tuple(range(8 * 3600, 12 * 3600, 600))
    return Drawn(
        stations=(a, b, c, d, e, f),
        links=(
            rail("ab", a, b, "1"),
            rail("bd", b, d, "1"),
            rail("ac", a, c, "2"),
            rail("cd", c, d, "2"),
            rail("ef", e, f, "3"),
        ),
        walks=(rail("de", d, e, time_s=90),),
        lines=(Named("1", "1"), Named("2", "2"), Named("3", "3")),
        patterns=(
            TimedPattern("1", ("a", "b", "d"), (0, 500, 1000), hour),
            TimedPattern("1", ("d", "b", "a"), (0, 500, 1000), hour),
            TimedPattern("2", ("a", "c", "d"), (0, 200, 400), hour),
            TimedPattern("2", ("d", "c", "a"), (0, 200, 400), hour),
            TimedPattern("3", ("e", "f"), (0, 100), hour[::2]),
            TimedPattern("3", ("f", "e"), (0, 100), hour[::2]),
        ),
    )


def comb(b_mm: float = 60.0, gap_m: float = 4000.0) -> Drawn:
    """Draw two rows of stations a kilometre apart, the second row `gap_m` north of the first.

    Drawn at 10 mm a link, and the second row `b_mm` above the first.
    """
    one = [Stop(f"a{i}", 1000 * i, 0, 10 * i, 0, f"a{i}") for i in range(5)]
    two = [Stop(f"b{i}", 1000 * i, gap_m, 10 * i, -b_mm, f"b{i}") for i in range(5)]
    rails = [
        rail(f"{p.id}{q.id}", p, q, p.id[0])
        for row in (one, two)
        for p, q in itertools.pairwise(row)
    ]
    hour = tuple(range(30000, 33600, 600))
    patterns = (
        TimedPattern("a", tuple(s.id for s in one), (0, 60, 120, 180, 240), hour),
        TimedPattern("b", tuple(s.id for s in two), (0, 60, 120, 180, 240), hour[:2]),
    )
    return Drawn((*one, *two), tuple(rails), (), (Named("a", "A"), Named("b", "B")), patterns)
