"""Match the stations of two rosters."""

from __future__ import annotations

import math
from collections import Counter, defaultdict
from collections.abc import Callable, Collection, Hashable, Iterable, Mapping, Sequence
from functools import cached_property

import numpy as np
from scipy.spatial import cKDTree

from gtfs_schematic.edition.evidence import (
    Weight,
    Worth,
    around_weight,
    ids_weight,
    likeness,
    lines_weight,
    name_weight,
    place_weight,
    surety,
    words_of,
    worth_of,
)
from gtfs_schematic.edition.pairing import Pair, best_pairs
from gtfs_schematic.edition.roster import Roster, RosterStation
from gtfs_schematic.network.ground import ground_about
from gtfs_schematic.network.naming import name_key

_REACH = 2.5
"""Pairs further apart than so many spacings need more than their place to come into question."""
_SPACING_M = (100.0, 800.0)
_IDS, _CODES = 6.0, 3.0
"""The most that ids, and codes, in common can say."""
_ALIKE = 0.85
_NEAR = 0.4
"""In spacings: for learning what ids are worth."""

Found = dict[str, tuple[str, str, float]]
"""Per old id the new one, the reason, and how sure it is."""


class StationMatching:
    """All that two rosters say of which stations are one; the static part is weighed once."""

    def __init__(self, old: Roster, new: Roster) -> None:
        self.old, self.new = old, new
        # Rows in the order of what riders see, so that no id decides between equals.
        self.rows = sorted(old.stations, key=_content)
        self.columns = sorted(new.stations, key=_content)
        places = [(s.lon, s.lat) for s in (*self.rows, *self.columns)]
        metres = ground_about(sorted(places)).metres(places)
        self.at_row, self.at_column = metres[: len(self.rows)], metres[len(self.rows) :]
        self.holders = [
            Counter(name_key(s.name) for s in stations) for stations in (self.rows, self.columns)
        ]
        self.row_of = {s.id: i for i, s in enumerate(self.rows)}
        self.column_of = {s.id: j for j, s in enumerate(self.columns)}
        self._static: dict[Pair, tuple[Weight, ...]] = {}

    @cached_property
    def spacing_m(self) -> float:
        """Typical distance from a station to the nearest other, metres."""
        medians = [_spacing(at) for at in (self.at_row, self.at_column)]
        return float(np.clip(np.mean(medians), *_SPACING_M))

    def meters(self, pair: Pair) -> float:
        """Give how far the two stations of a pair are apart."""
        (x, y), (u, v) = self.at_row[pair[0]], self.at_column[pair[1]]
        return math.hypot(x - u, y - v)

    @cached_property
    def candidates(self) -> frozenset[Pair]:
        """Pairs that share an id, a code or a name, or are near each other."""
        found: set[Pair] = set()
        for keys in (_stop_ids, _codes, _names):
            found.update(_joined(self.rows, self.columns, keys))
        if len(self.rows) and len(self.columns):
            near = cKDTree(self.at_row).query_ball_tree(
                cKDTree(self.at_column), _REACH * self.spacing_m
            )
            found.update((i, j) for i, several in enumerate(near) for j in several)
        return frozenset(found)

    def beside(self, wanted: Sequence[bool], meters: float) -> dict[int, list[int]]:
        """Give per wanted row the columns that lie within some metres or share a stop id."""
        rows = [i for i, want in enumerate(wanted) if want]
        if not rows or not len(self.columns):
            return {}
        near = cKDTree(self.at_column).query_ball_point(self.at_row[rows], meters)
        shared = _joined([self.rows[i] for i in rows], self.columns, _stop_ids)
        found = {i: set(several) for i, several in zip(rows, near, strict=True)}
        for n, j in shared:
            found[rows[n]].add(j)
        return {i: sorted(found[i]) for i in rows}

    @cached_property
    def worths(self) -> tuple[Worth, Worth]:
        """What stop ids and stop codes are worth."""
        return self._worth(_stop_ids, _IDS), self._worth(_codes, _CODES)

    def _worth(self, keys: Callable[[RosterStation], Collection[str]], most: float) -> Worth:
        shared = _joined(self.rows, self.columns, keys)
        right = {p for p in self.candidates if self._agrees(p, both=True)}
        # Of several of one name only pairs that could be each other's count.
        right = {p for p in right if keys(self.rows[p[0]]) and keys(self.columns[p[1]])}
        return worth_of(
            sum(self._agrees(pair, both=False) for pair in shared),
            len(shared),
            len(right & shared),
            len(right),
            most,
        )

    def _agrees(self, pair: Pair, *, both: bool) -> bool:
        named = likeness(self.rows[pair[0]].name, self.columns[pair[1]].name) >= _ALIKE
        near = self.meters(pair) <= _NEAR * self.spacing_m
        return (named and near) if both else (named or near)

    def weights(
        self, pair: Pair, stations: Mapping[str, str], lines: Mapping[str, str]
    ) -> tuple[Weight, ...]:
        """Weigh a pair, given what else matches."""
        i, j = pair
        one, other = self.rows[i], self.columns[j]
        if pair not in self._static:
            ids, codes = self.worths
            holders = max(
                self.holders[0][name_key(one.name)], self.holders[1][name_key(other.name)]
            )
            self._static[pair] = (
                ids_weight(one.stop_ids, other.stop_ids, ids, "stop ids"),
                ids_weight(one.stop_codes, other.stop_codes, codes, "stop codes"),
                name_weight(one.name, other.name, holders),
                place_weight(self.meters(pair), self.spacing_m),
            )
        around = (self.old.neighbors[one.id], self.new.neighbors[other.id])
        return (
            *self._static[pair],
            around_weight(*around, stations),
            lines_weight(one.lines, other.lines, lines),
        )

    def matched(
        self,
        stations: Mapping[str, str],
        lines: Mapping[str, str],
        settled: tuple[Collection[str], Collection[str]],
    ) -> Found:
        """Choose the best pairs, given what matched before.

        Parameters
        ----------
        stations, lines
            New ids by old of what matched before.
        settled
            Old and new ids about which an adjustment has spoken.
        """
        pairs = self.candidates | self._between(stations)
        open_pairs = [
            (i, j)
            for i, j in pairs
            if self.rows[i].id not in settled[0] and self.columns[j].id not in settled[1]
        ]
        weights = {pair: self.weights(pair, stations, lines) for pair in open_pairs}
        odds = {pair: surety(each) for pair, each in weights.items()}
        return {
            self.rows[i].id: (self.columns[j].id, words_of(weights[i, j]), sure)
            for (i, j), sure in best_pairs(odds).items()
        }

    def _between(self, stations: Mapping[str, str]) -> set[Pair]:
        """Pairs without a match that are neighbours of one and the same match."""
        taken = set(stations.values())
        found: set[Pair] = set()
        for a, b in stations.items():
            ones = [s for s in self.old.neighbors.get(a, ()) if s not in stations]
            others = [s for s in self.new.neighbors.get(b, ()) if s not in taken]
            found.update((self.row_of[s], self.column_of[t]) for s in ones for t in others)
        return found


def _content(station: RosterStation) -> tuple[Hashable, ...]:
    return (station.name, station.lon, station.lat, station.stop_ids, station.id)


def _stop_ids(station: RosterStation) -> Collection[str]:
    return station.stop_ids


def _codes(station: RosterStation) -> Collection[str]:
    return station.stop_codes


def _names(station: RosterStation) -> Collection[str]:
    return (name_key(station.name),)


def _joined(
    rows: Sequence[RosterStation],
    columns: Sequence[RosterStation],
    keys: Callable[[RosterStation], Iterable[str]],
) -> set[Pair]:
    """Pairs with a key in common."""
    held: dict[str, list[int]] = defaultdict(list)
    for j, station in enumerate(columns):
        for key in keys(station):
            held[key].append(j)
    return {(i, j) for i, s in enumerate(rows) for key in keys(s) for j in held.get(key, ())}


def _spacing(at: np.ndarray) -> float:
    if len(at) < 2:
        return _SPACING_M[1]
    distances, _ = cKDTree(at).query(at, k=2)
    return float(np.median(distances[:, 1]))
