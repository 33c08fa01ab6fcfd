"""Small networks drawn by hand, with every position and path, for the tests of the later rooms.

All places, lines and names are invented. `star`, `ring`, `ribbon` and `walk_and_crossing` each give
an octilinear `Layout` (its network within); `ALL` lists them. Positions are sheet millimetres, y
down; the ground is the sheet at 100 m to the millimetre, slightly wobbled.
"""

from __future__ import annotations

import itertools
import math
from collections import defaultdict
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, field

from gtfs_schematic.feed.model import FeedInfo
from gtfs_schematic.geometry import Point
from gtfs_schematic.layout.model import Crossing, Layout, SheetFrame
from gtfs_schematic.network.model import (
    Corridor,
    Line,
    Link,
    Network,
    Station,
    StationKind,
    Walk,
)

_INFO = FeedInfo(
    sha256="0" * 64,
    publisher="Verkehrsbund Wiesmarn-Mitte",
    version="7",
    start_date="2026-03-01",
    end_date="2026-06-30",
    service_date="2026-03-11",
    service_reason="It is the date with most trips.",
)


@dataclass(frozen=True)
class Sketch:
    """What is drawn by hand; the rest of a network follows from it."""

    places: Mapping[str, tuple[float, float, str]]
    """Per station id x and y in millimetres, and the name."""
    courses: Mapping[str, tuple[str, tuple[str, ...]]]
    """Per line id its colour, and its courses as station ids with blanks between; a station that
    is passed without a call stands in brackets."""
    bends: Mapping[str, tuple[Point, ...]] = field(default_factory=dict)
    """Per "start-end" the bends of the link's path, from start to end."""
    walks: tuple[tuple[str, str], ...] = ()
    crossings: tuple[tuple[str, str, float, float], ...] = ()
    """Two links that cross without a station, and where."""
    width_mm: float = 210.0
    height_mm: float = 148.0


def drawn(sketch: Sketch) -> Layout:
    """Give the layout that a sketch describes, and the network within it."""
    links = _links(sketch)
    walks = tuple(Walk(f"walk-{a}-{b}", a, b, 180) for a, b in map(sorted, sorted(sketch.walks)))
    network = Network(
        info=_INFO,
        agencies=(_INFO.publisher,),
        stations=_stations(sketch, links),
        links=links,
        walks=walks,
        lines=tuple(_line(line_id, *sketch.courses[line_id]) for line_id in sorted(sketch.courses)),
        corridors=_corridors(links),
        findings=(),
        left_out=(),
    )
    at = {station_id: (x, y) for station_id, (x, y, _) in sketch.places.items()}
    return Layout(
        network=network,
        sheet=SheetFrame(
            sketch.width_mm,
            sketch.height_mm,
            12.0,
            20.0,
            sketch.width_mm - 12.0,
            sketch.height_mm - 12.0,
        ),
        positions={station_id: at[station_id] for station_id in sorted(at)},
        paths={
            link.id: (at[link.start], *sketch.bends.get(link.id, ()), at[link.end])
            for link in links
        },
        walk_paths={walk.id: (at[walk.start], at[walk.end]) for walk in walks},
        crossings=tuple(Crossing(a, b, (x, y)) for a, b, x, y in sketch.crossings),
    )


def _split(text: str) -> tuple[str, ...]:
    return tuple(word.strip("()") for word in text.split())


def _calls(text: str) -> tuple[str, ...]:
    return tuple(word for word in text.split() if not word.startswith("("))


def _line(line_id: str, color: str, texts: tuple[str, ...]) -> Line:
    return Line(
        id=line_id,
        name=line_id,
        long_name=f"Line {line_id}",
        color=color,
        text_color="#FFFFFF",
        color_from_feed=True,
        mode="metro",
        route_ids=(f"route-{line_id}",),
        itineraries=tuple(_calls(text) for text in texts),
        courses=tuple(_split(text) for text in texts),
        trips=120,
        service="all-day",
        first_departure_s=5 * 3600,
        last_departure_s=23 * 3600,
        headway_s=600,
    )


def _links(sketch: Sketch) -> tuple[Link, ...]:
    lines: dict[tuple[str, str], set[str]] = defaultdict(set)
    for line_id, (_, texts) in sketch.courses.items():
        for text in texts:
            for a, b in itertools.pairwise(_split(text)):
                lines[min(a, b), max(a, b)].add(line_id)
    return tuple(Link(f"{a}-{b}", a, b, tuple(sorted(lines[a, b]))) for a, b in sorted(lines))


def _stations(sketch: Sketch, links: tuple[Link, ...]) -> tuple[Station, ...]:
    group = {station_id: station_id for station_id in sketch.places}
    for a, b in sorted(sketch.walks):
        low, high = sorted((group[a], group[b]))
        group = {station_id: low if g == high else g for station_id, g in group.items()}
    stations = []
    for i, station_id in enumerate(sorted(sketch.places)):
        x, y, name = sketch.places[station_id]
        stations.append(
            Station(
                id=station_id,
                name=name,
                second_name="",
                stop_ids=(f"stop-{station_id}",),
                lon=11.0 + (x + 1.5 * math.sin(7.0 * i)) * 0.0014,
                lat=50.0 - (y + 1.5 * math.cos(5.0 * i)) * 0.0009,
                kind=_kind(sketch, links, station_id),
                group=group[station_id],
                lines=tuple(
                    line_id
                    for line_id, (_, texts) in sorted(sketch.courses.items())
                    if any(station_id in _calls(text) for text in texts)
                ),
                boarding="unknown",
            )
        )
    return tuple(stations)


def _kind(sketch: Sketch, links: tuple[Link, ...], station_id: str) -> StationKind:
    sets = {link.lines for link in links if station_id in (link.start, link.end)}
    if any(station_id in walk for walk in sketch.walks):
        return "interchange"
    courses = [_split(text) for _, texts in sketch.courses.values() for text in texts]
    if any(station_id in (c[0], c[-1]) and c[0] != c[-1] for c in courses):
        return "terminus"
    return "interchange" if len(sets) > 1 and len(set().union(*sets)) > 1 else "stop"


def _corridors(links: tuple[Link, ...]) -> tuple[Corridor, ...]:
    around: dict[str, list[Link]] = defaultdict(list)
    for link in links:
        around[link.start].append(link)
        around[link.end].append(link)

    def onward(station: str, link: Link) -> Link | None:
        pair = around[station]
        if len(pair) != 2 or pair[0].lines != pair[1].lines:
            return None
        return pair[0] if pair[1] == link else pair[1]

    done: set[str] = set()
    corridors: list[Corridor] = []
    ends = [(station, link) for station in sorted(around) for link in around[station]]
    for start, first in sorted(ends, key=lambda end: onward(end[0], end[1]) is not None):
        if first.id in done:
            continue
        stations, chain = [start], list[str]()
        step: Link | None = first
        while step is not None and step.id not in done:
            done.add(step.id)
            chain.append(step.id)
            stations.append(step.end if stations[-1] == step.start else step.start)
            step = onward(stations[-1], step)
        corridors.append(
            Corridor(f"corridor-{chain[0]}", tuple(stations), tuple(chain), first.lines)
        )
    return tuple(sorted(corridors, key=lambda corridor: corridor.id))


def star() -> Layout:
    """Draw three lines on one trunk that part; a fourth line crosses; one branches."""
    return drawn(
        Sketch(
            places={
                "amsel": (30.0, 35.0, "Amselgrund"),
                "birke": (45.0, 50.0, "Birkenhain"),
                "dorn": (20.0, 75.0, "Dornau"),
                "eich": (40.0, 75.0, "Eichenau Siedlung"),
                "furt": (30.0, 115.0, "Furt"),
                "gries": (45.0, 100.0, "Griesbachbrücke"),
                "west": (70.0, 75.0, "Westtor"),
                "markt": (85.0, 75.0, "Alter Markt"),
                "rathaus": (100.0, 75.0, "Rathaus"),
                "ost": (120.0, 75.0, "Osttor am Gaswerk"),
                "hang": (140.0, 55.0, "Hangweg"),
                "iller": (160.0, 35.0, "Illerquelle"),
                "juli": (145.0, 75.0, "Julienhof"),
                "kiefer": (165.0, 75.0, "Kieferloh"),
                "lohe": (185.0, 75.0, "Lohe"),
                "moor": (185.0, 55.0, "Moorende Gewerbepark"),
                "nessel": (140.0, 95.0, "Nesselwang Süd"),
                "otter": (150.0, 115.0, "Ottersee"),
                "pappel": (100.0, 40.0, "Pappelallee"),
                "quell": (100.0, 55.0, "Quellgasse"),
                "reh": (100.0, 100.0, "Rehwiese"),
                "sand": (100.0, 120.0, "Sand"),
            },
            courses={
                "A": ("#B3202C", ("amsel birke west markt rathaus ost hang iller",)),
                "B": (
                    "#1F5FA8",
                    (
                        "dorn eich west markt rathaus ost juli kiefer lohe",
                        "dorn eich west markt rathaus ost juli kiefer moor",
                    ),
                ),
                "C": ("#2E7D4F", ("furt gries west markt rathaus ost nessel otter",)),
                "D": ("#C27A00", ("pappel quell rathaus reh sand",)),
            },
            bends={"nessel-otter": ((150.0, 105.0),)},
        )
    )


def ring() -> Layout:
    """Draw a ring line, a line that shares a part of it, and a line straight across it."""
    return drawn(
        Sketch(
            places={
                "r01": (85.0, 30.0, "Nordring"),
                "r02": (105.0, 30.0, "Kanzlei"),
                "r03": (125.0, 30.0, "Thingplatz"),
                "r04": (145.0, 50.0, "Orgelbauerstraße"),
                "r05": (145.0, 70.0, "Ostring"),
                "r06": (145.0, 95.0, "Färbergraben"),
                "r07": (125.0, 115.0, "Hafen"),
                "r08": (105.0, 115.0, "Südring"),
                "r09": (80.0, 115.0, "Zollhaus"),
                "r10": (60.0, 95.0, "Weberei"),
                "r11": (60.0, 70.0, "Westring"),
                "r12": (60.0, 55.0, "Ulmenplatz"),
                "x1": (25.0, 70.0, "Vogelherd"),
                "x2": (42.0, 70.0, "Hochfeld"),
                "x3": (85.0, 70.0, "Dom"),
                "x4": (105.0, 70.0, "Stadttheater und Kongresshalle"),
                "x5": (125.0, 70.0, "Post"),
                "x6": (165.0, 70.0, "Lerchenau"),
                "x7": (185.0, 70.0, "Erlen"),
                "y1": (45.0, 15.0, "Ziegelei"),
                "y2": (65.0, 20.0, "Bad"),
                "y3": (165.0, 115.0, "Mühlwehr"),
                "y4": (165.0, 130.0, "Am Steinbruch"),
            },
            courses={
                "R": ("#6A3FA0", ("r01 r02 r03 r04 r05 r06 r07 r08 r09 r10 r11 r12 r01",)),
                "X": ("#D0602B", ("x1 x2 r11 x3 x4 x5 r05 x6 x7",)),
                "Y": ("#0E8A8A", ("y1 y2 r01 r02 r03 r04 r05 r06 y3 y4",)),
            },
            bends={"y1-y2": ((50.0, 20.0),), "r01-y2": ((75.0, 20.0),)},
        )
    )


def ribbon() -> Layout:
    """Draw four lines side by side through bends of 45 and 90 degrees; line 2 passes stations."""
    return drawn(
        Sketch(
            places={
                "a1": (20.0, 60.0, "Aumühle"),
                "a2": (40.0, 60.0, "Lindenkreuz"),
                "b1": (20.0, 80.0, "Bergwerk Glückauf"),
                "b2": (50.0, 80.0, "Kraftwerk"),
                "c1": (35.0, 115.0, "Neustift"),
                "m1": (70.0, 80.0, "Hauptbahnhof"),
                "m2": (90.0, 80.0, "Messe"),
                "m3": (110.0, 60.0, "Universität und Botanischer Garten"),
                "m4": (110.0, 40.0, "Klinikum"),
                "m5": (140.0, 40.0, "Schöne Aussicht"),
                "m6": (150.0, 50.0, "Flut"),
                "m7": (150.0, 75.0, "Heide"),
                "d1": (170.0, 95.0, "Rosenhöhe"),
                "d2": (185.0, 95.0, "Tal"),
                "e1": (150.0, 105.0, "Wasserturm"),
                "e2": (130.0, 125.0, "Unterer Kirchgrund"),
                "f1": (130.0, 95.0, "Kessel"),
            },
            courses={
                "1": ("#A8322D", ("a1 a2 m1 m2 m3 m4 m5 m6 m7 d1 d2",)),
                "2": ("#2463B0", ("b1 b2 m1 (m2) m3 (m4) m5 (m6) m7 e1 e2",)),
                "3": ("#3C7A2A", ("c1 m1 m2 m3 m4 m5 m6 m7 f1",)),
                "4": ("#8A5A00", ("b1 b2 m1 m2 m3 m4 m5",)),
            },
            bends={
                "a2-m1": ((50.0, 60.0),),
                "m4-m5": ((110.0, 30.0), (130.0, 30.0)),
            },
        )
    )


def walk_and_crossing() -> Layout:
    """Draw two lines that cross without a station, and an interchange of two stations by a walk."""
    return drawn(
        Sketch(
            places={
                "g1": (20.0, 50.0, "Grünau"),
                "g2": (45.0, 50.0, "Holzmarkt"),
                "g3": (70.0, 75.0, "Alte Börse"),
                "g4": (100.0, 75.0, "Krone"),
                "g5": (140.0, 75.0, "Neue Synagoge"),
                "g6": (165.0, 50.0, "Tor"),
                "g7": (185.0, 50.0, "Weiler unter dem Rotenstein"),
                "h1": (90.0, 25.0, "Jägerhaus"),
                "h2": (90.0, 45.0, "Ibisgarten"),
                "h3": (90.0, 65.0, "Passage"),
                "h4": (90.0, 95.0, "Landungsbrücken"),
                "h5": (110.0, 115.0, "Ufer"),
                "k1": (45.0, 120.0, "Salzspeicher"),
                "k2": (70.0, 95.0, "Seilerbahn"),
                "k3": (120.0, 95.0, "Pulverturm"),
                "k4": (165.0, 95.0, "Obstgärten"),
            },
            courses={
                "G": ("#00695C", ("g1 g2 g3 g4 g5 g6 g7",)),
                "H": ("#7B2D8B", ("h1 h2 h3 h4 h5",)),
                "K": ("#B07D00", ("k1 k2 h4 k3 k4",)),
            },
            walks=(("g4", "h3"),),
            crossings=(("g3-g4", "h3-h4", 90.0, 75.0),),
        )
    )


ALL: dict[str, Callable[[], Layout]] = {
    "ribbon": ribbon,
    "ring": ring,
    "star": star,
    "walk_and_crossing": walk_and_crossing,
}


def bearings(points: Sequence[Point]) -> list[float]:
    """Give the direction of each segment in degrees from east towards south."""
    return [
        math.degrees(math.atan2(q[1] - p[1], q[0] - p[0])) % 360.0
        for p, q in itertools.pairwise(points)
    ]
