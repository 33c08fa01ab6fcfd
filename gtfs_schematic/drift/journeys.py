"""Theoretical planning error: what it costs to take the way that looks shortest on the diagram."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from gtfs_schematic.drift.model import PLANNING_RATIOS, DriftSettings, Journey, Journeys
from gtfs_schematic.drift.placed import Diagram
from gtfs_schematic.drift.ways import Ways, ways_of

_BLOCK = 128
_OFTEN = 2
"""A station heads or ends so many of the listed journeys at most, so that they differ."""

Floats = NDArray[np.float64]


def measure_journeys(diagram: Diagram, settings: DriftSettings) -> Journeys | None:
    """Measure the theoretical planning error over all pairs of stations.

    Parameters
    ----------
    diagram
        Stations, links, walks, and the timetable of the service date.
    settings
        What a change looks like, how long it takes, and how far to look.

    Returns
    -------
    Journeys or None
        None if the diagram knows no timetable, or no pair of stations is joined by it.

    Notes
    -----
    For stations u and v, with t the time of a way by the timetable and l its length as drawn,
    TPE(u, v) = t(argmin l) / min t, at least 1 (Milea, Schrijvers, Buchin and Haverkort 2011,
    "Shortest-Paths Preserving Metro Maps"). l counts the drawn courses and, per change, what
    a change looks like; t counts waits, rides, changes and walks. Of ways that look equally
    short the fastest is taken: a diagram that draws an express beside the local misleads nobody.
    Pairs within one interchange are left out.
    """
    if not diagram.patterns:
        return None
    ways = ways_of(diagram, settings)
    origins = _origins(len(diagram.stations), settings.most_origins)
    groups = [station.group for station in diagram.stations]
    group = np.unique(np.array(groups), return_inverse=True)[1]
    ratios, extras, pairs, unreached = [], [], [], 0
    for block in _blocks(origins):
        seen, least = ways.seen_and_least_s(block)
        apart = group[block][:, None] != group[None, :]
        joined = apart & np.isfinite(least)
        unreached += int(np.count_nonzero(apart & ~joined))
        rows, columns = np.nonzero(joined)
        ratios.append(seen[joined] / least[joined])
        extras.append(seen[joined] - least[joined])
        pairs.append(np.stack([block[rows], columns], axis=1))
    ratio = np.concatenate(ratios)
    if len(ratio) == 0:
        return None
    worst = _worst(ratio, np.concatenate(extras), np.concatenate(pairs), settings.listed)
    return Journeys(
        pairs=len(ratio),
        unreached=unreached,
        origins=len(origins),
        mean=float(ratio.mean()),
        median=float(np.median(ratio)),
        p95=float(np.percentile(ratio, 95.0)),
        largest=float(ratio.max()),
        over=tuple((over, float(np.mean(ratio > over))) for over in PLANNING_RATIOS),
        worst=_spelled_out(ways, worst),
    )


@dataclass(frozen=True, slots=True)
class _Pair:
    start: int
    end: int
    ratio: float


def _origins(stations: int, most: int) -> NDArray[np.int64]:
    """Take all stations, or so many at even steps through their order."""
    if stations <= most:
        return np.arange(stations)
    return np.unique(np.linspace(0, stations - 1, most).astype(np.int64))


def _blocks(origins: NDArray[np.int64]) -> Iterator[NDArray[np.int64]]:
    for first in range(0, len(origins), _BLOCK):
        yield origins[first : first + _BLOCK]


def _worst(
    ratio: Floats, extra: Floats, pairs: NDArray[np.int64], listed: int
) -> tuple[_Pair, ...]:
    """Choose the pairs with the largest ratio; each pair in one direction, no station too often."""
    order = np.lexsort((pairs[:, 1], pairs[:, 0], -extra, -ratio))
    used: dict[int, int] = {}
    taken: set[tuple[int, int]] = set()
    worst: list[_Pair] = []
    for k in order:
        a, b = int(pairs[k, 0]), int(pairs[k, 1])
        if ratio[k] <= 1.0 or len(worst) == listed:
            break
        if (b, a) in taken or max(used.get(a, 0), used.get(b, 0)) >= _OFTEN:
            continue
        taken.add((a, b))
        used[a], used[b] = used.get(a, 0) + 1, used.get(b, 0) + 1
        worst.append(_Pair(a, b, float(ratio[k])))
    return tuple(worst)


def _spelled_out(ways: Ways, worst: tuple[_Pair, ...]) -> tuple[Journey, ...]:
    return tuple(
        Journey(
            ways.station_ids[pair.start],
            ways.station_ids[pair.end],
            pair.ratio,
            looks_shortest=ways.looks_shortest(pair.start, pair.end),
            fastest=ways.fastest(pair.start, pair.end),
        )
        for pair in worst
    )
