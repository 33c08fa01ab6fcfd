"""Finding the trips that start at night, for which the first departures of all trips are read."""

from __future__ import annotations

from collections import Counter
from collections.abc import Mapping

import numpy as np

from gtfs_schematic.feed import numerals
from gtfs_schematic.feed.blocks import Block, Masks, read_in_blocks
from gtfs_schematic.feed.calendars import Headway
from gtfs_schematic.feed.interned import UNKNOWN
from gtfs_schematic.feed.kernels import Ints
from gtfs_schematic.feed.numerals import NO_TIME
from gtfs_schematic.feed.tables import Tables
from gtfs_schematic.feed.trips import Trips
from gtfs_schematic.feed.values import parse_time

NEVER = 10**9


def first_departures(tables: Tables, trips: Trips) -> Ints:
    """Give every trip's earliest departure, seconds after noon minus 12 h; `NEVER` if unknown.

    Nothing is found here: the calls of the trips that are drawn are read once more.
    """
    firsts = np.full(len(trips.route) + 1, NEVER, dtype=np.int64)

    def bulk(block: Block) -> Masks:
        number = trips.ids.find(block.column(0))
        odd = np.zeros(len(number), dtype=np.uint8)
        departure = np.empty(len(number), dtype=np.int64)
        numerals.parse_times(block.column(1), block.regular.view(np.uint8), odd, departure)
        good = block.regular & (odd == 0) & (number != UNKNOWN) & (departure != NO_TIME)
        np.minimum.at(firsts, number[good], departure[good])
        left: Masks = odd != 0
        return left

    def single(_row: int, texts: tuple[str, ...]) -> None:
        try:
            departure = parse_time(texts[1])
        except ValueError:
            return
        number = trips.ids.find_text(texts[0])
        firsts[number] = min(int(firsts[number]), departure)

    read_in_blocks(
        tables.without_findings(), "stop_times.txt", ("trip_id", "departure_time"), bulk, single
    )
    return firsts[:-1]


def starts_by_service(
    trips: Trips,
    drawn: Masks,
    firsts: Ints,
    headways: Mapping[int, tuple[Headway, ...]],
    hours: tuple[int, int],
) -> dict[str, int]:
    """Count the departures within some hours by service.

    Parameters
    ----------
    drawn
        Trips that count.
    """
    counts: Counter[str] = Counter()
    low, high = hours
    inside = drawn & (firsts >= low) & (firsts < high)
    inside[list(headways)] = False
    services, numbers = np.unique(trips.service[inside], return_counts=True)
    for service, number in zip(services.tolist(), numbers.tolist(), strict=True):
        counts[trips.services[service]] += number
    for trip, rows in headways.items():
        if drawn[trip]:
            times = (s for row in rows for s in row.departures)
            counts[trips.services[int(trips.service[trip])]] += sum(low <= t < high for t in times)
    return dict(counts)
