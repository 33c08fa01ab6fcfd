"""Small ordering cases as layouts, and a brute force that knows nothing of the solver."""

from __future__ import annotations

import itertools
import math
from collections.abc import Iterator, Mapping

import pytest
from drawn_networks import Sketch, drawn

from gtfs_schematic.layout.model import Layout

Orders = Mapping[str, tuple[str, ...]]


class BruteForce:
    """Counts crossings and separations straight from the definition, over all orders."""

    def __init__(self, layout: Layout) -> None:
        self.layout = layout
        self.ways = {station.id: self._ways(station.id) for station in layout.network.stations}

    def _ways(self, at: str) -> list[tuple[str, str, str]]:
        ways = set()
        for line in self.layout.network.lines:
            for course in line.courses:
                for a, b, c in zip(course, course[1:], course[2:], strict=False):
                    if b == at and a != c:
                        ways.add((line.id, min(a, c), max(a, c)))
        return sorted(ways)

    def _order(self, orders: Orders, station: str, neighbor: str) -> tuple[str, ...]:
        """Lines from left to right looking from a station towards a neighbor."""
        link = self.layout.network.link_between[frozenset((station, neighbor))]
        lines = orders[link.id]
        return lines if link.start == station else lines[::-1]

    def _ring(self, orders: Orders, at: str) -> dict[tuple[str, str], int]:
        """Give the ports (neighbor, line) round a station their numbers, clockwise."""
        x, y = self.layout.positions[at]
        neighbors = {
            link.end if link.start == at else link.start
            for link in self.layout.network.links
            if at in (link.start, link.end)
        }

        def bearing(neighbor: str) -> float:
            link = self.layout.network.link_between[frozenset((at, neighbor))]
            path = self.layout.paths[link.id]
            p = path[1] if link.start == at else path[-2]
            return math.atan2(p[1] - y, p[0] - x)

        ports = [
            (n, line) for n in sorted(neighbors, key=bearing) for line in self._order(orders, at, n)
        ]
        return {port: i for i, port in enumerate(ports)}

    def crossings(self, orders: Orders) -> int:
        """Count pairs of chords that interleave, over all stations."""
        total = 0
        for at, ways in self.ways.items():
            port = self._ring(orders, at) if ways else {}
            for (k, a, b), (m, c, d) in itertools.combinations(ways, 2):
                if k != m:
                    low, high = sorted((port[a, k], port[b, k]))
                    total += (low < port[c, m] < high) != (low < port[d, m] < high)
        return total

    def separations(self, orders: Orders) -> int:
        """Count pairs that go on together from link to link, neighbours on one of them only."""
        total = 0
        for at, ways in self.ways.items():
            for (k, a, b), (m, c, d) in itertools.combinations(ways, 2):
                if k != m and (a, b) == (c, d):
                    beside = [
                        abs(order.index(k) - order.index(m)) == 1
                        for order in (self._order(orders, at, a), self._order(orders, at, b))
                    ]
                    total += beside[0] != beside[1]
        return total

    def all_orders(self) -> Iterator[dict[str, tuple[str, ...]]]:
        """Give every order of every link."""
        links = self.layout.network.links
        for choice in itertools.product(*(itertools.permutations(k.lines) for k in links)):
            yield {link.id: order for link, order in zip(links, choice, strict=True)}

    def best(self) -> tuple[int, int]:
        """Give the fewest crossings of any order, and the fewest separations with those."""
        return min((self.crossings(o), self.separations(o)) for o in self.all_orders())


@pytest.fixture(scope="session")
def brute_force() -> type[BruteForce]:
    return BruteForce


_PLACES = {
    "u": (50.0, 50.0, "U"),
    "v": (80.0, 50.0, "V"),
    "w": (110.0, 50.0, "W"),
    "a1": (20.0, 20.0, "A1"),
    "a2": (20.0, 80.0, "A2"),
    "a3": (20.0, 50.0, "A3"),
    "a4": (20.0, 40.0, "A4"),
    "b1": (140.0, 20.0, "B1"),
    "b2": (140.0, 80.0, "B2"),
    "b3": (140.0, 50.0, "B3"),
    "b4": (140.0, 40.0, "B4"),
    "n": (80.0, 20.0, "N"),
    "s": (80.0, 80.0, "S"),
}

_CASES = {
    "I1a": {"A": "a1 u v b1", "B": "a2 u v b2"},
    "I1b": {"A": "a1 u v b2", "B": "a2 u v b1"},
    "I2": {"A": "a1 u v b2", "B": "a4 u v b3", "C": "a3 u v b4", "D": "a2 u v b1"},
    "I3": {"A": "a1 u v b1", "B": "a2 u v b2", "C": "a3 u v"},
    "I4": {"A": "a1 u v w b1", "B": "a2 u v w b2", "C": "a3 u v", "D": "v w b3"},
    "I5": {"A": "u v w", "B": "u v w", "C": "v w"},
    "I6": {"A": "u v w", "B": "n v s"},
    "I7": {"A": "u v w", "B": "u v n", "C": "n v w"},
}


@pytest.fixture
def case() -> dict[str, Layout]:
    """Give the hand-made cases by name; u, v, w run from left to right, a and b fan out and in."""
    layouts = {}
    for name, courses in _CASES.items():
        used = {station for course in courses.values() for station in course.split()}
        places = {station: _PLACES[station] for station in sorted(used)}
        layouts[name] = drawn(Sketch(places, {k: ("#000000", (c,)) for k, c in courses.items()}))
    layouts["I8"], layouts["I9"] = (_two_meetings(twisted=twisted) for twisted in (False, True))
    return layouts


def _two_meetings(*, twisted: bool) -> Layout:
    """Two lines share u-v, part above and below, share p-q; twisted swaps all fans of p-q."""
    places = {
        "a1": (10.0, 20.0, "A1"),
        "a2": (10.0, 80.0, "A2"),
        "u": (30.0, 50.0, "U"),
        "v": (50.0, 50.0, "V"),
        "n": (65.0, 30.0, "N"),
        "s": (65.0, 70.0, "S"),
        "p": (80.0, 50.0, "P"),
        "q": (100.0, 50.0, "Q"),
        "b1": (120.0, 20.0, "B1"),
        "b2": (120.0, 80.0, "B2"),
    }
    upper, lower = (
        ("a1 u v s p q b1", "a2 u v n p q b2")
        if twisted
        else (
            "a1 u v n p q b1",
            "a2 u v s p q b2",
        )
    )
    return drawn(Sketch(places, {"A": ("#000000", (upper,)), "B": ("#000000", (lower,))}))
