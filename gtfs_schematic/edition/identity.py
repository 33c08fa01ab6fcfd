"""Tell which stations and lines of a new network are those of an earlier edition, and how surely.

Ids are hints, not proof: feeds renumber. A pair is judged by ids, name, place and lines together,
and the best assignment of all pairs is taken (Kuhn 1955; scipy's `linear_sum_assignment`).
"""

from __future__ import annotations

import math
from collections.abc import Collection, Mapping, Sequence
from dataclasses import dataclass
from difflib import SequenceMatcher

import numpy as np
from scipy.optimize import linear_sum_assignment

from gtfs_schematic.edition.model import Edition, EditionLine, EditionStation
from gtfs_schematic.network.model import Line, Network, Station

_REACH_M = 600.0
"""Stations further apart than this are one only if they share a stop id and a name."""
_METRES_PER_DEGREE = 111_195.0
"""Length of a degree of a sphere of 6,371 km radius; near enough to compare neighbours."""
_LEAST_SURE = 0.5
_DOUBTFUL = 0.7


@dataclass(frozen=True, slots=True)
class Match:
    """A station or line of the new network, and the one of the edition that it is."""

    new_id: str
    old_id: str
    reason: str
    confidence: float
    """From 0 to 1."""


@dataclass(frozen=True, slots=True)
class Matches:
    """All matches, by new id; what is in neither map is new, or gone."""

    stations: Mapping[str, Match]
    lines: Mapping[str, Match]

    @property
    def doubtful(self) -> tuple[Match, ...]:
        """Matches that a person should look at, the least sure first."""
        every = [*self.stations.values(), *self.lines.values()]
        found = [match for match in every if match.confidence < _DOUBTFUL]
        return tuple(sorted(found, key=lambda m: (m.confidence, m.new_id)))


def match_edition(edition: Edition, network: Network) -> Matches:
    """Match a network's stations and lines to those of an earlier edition.

    Parameters
    ----------
    edition
        The earlier edition.
    network
        The network of the new feed, with ids of its own.
    """
    old_names = {line.id: line.name for line in edition.lines}
    new_names = {line.id: line.name for line in network.lines}
    pairs = {
        (i, j): judged
        for i, new in enumerate(network.stations)
        for j, old in enumerate(edition.stations)
        if (judged := _judge_stations(new, old, new_names, old_names)) is not None
    }
    new_ids = [station.id for station in network.stations]
    stations = _assign(new_ids, [station.id for station in edition.stations], pairs)
    known = {new: match.old_id for new, match in stations.items()}
    line_pairs = {
        (i, j): judged
        for i, new in enumerate(network.lines)
        for j, old in enumerate(edition.lines)
        if (judged := _judge_lines(new, old, known)) is not None
    }
    lines = _assign(
        [line.id for line in network.lines], [line.id for line in edition.lines], line_pairs
    )
    return Matches(stations, lines)


def _assign(
    new_ids: Sequence[str],
    old_ids: Sequence[str],
    pairs: Mapping[tuple[int, int], tuple[float, str]],
) -> dict[str, Match]:
    """Choose pairs that use each id once, with the greatest sum of confidence."""
    if not pairs:
        return {}
    score = np.zeros((len(new_ids), len(old_ids)))
    for (i, j), (confidence, _) in pairs.items():
        score[i, j] = round(confidence, 6)
    rows, columns = linear_sum_assignment(score, maximize=True)
    return {
        new_ids[i]: Match(new_ids[i], old_ids[j], pairs[i, j][1], round(pairs[i, j][0], 3))
        for i, j in zip(rows.tolist(), columns.tolist(), strict=True)
        if (i, j) in pairs and pairs[i, j][0] >= _LEAST_SURE
    }


def _judge_stations(
    new: Station, old: EditionStation, new_names: Mapping[str, str], old_names: Mapping[str, str]
) -> tuple[float, str] | None:
    """Give confidence and reason that two stations are one; None if they cannot be."""
    away = _metres(new, old)
    shared = bool(set(new.stop_ids) & set(old.stop_ids))
    if away > 5.0 * _REACH_M or (away > _REACH_M and not shared):
        return None
    alike = _alike(new.name, old.name)
    if away > _REACH_M and alike < 0.8:
        return None
    near = max(0.0, 1.0 - away / _REACH_M)
    common = _jaccard([new_names[k] for k in new.lines], [old_names[k] for k in old.lines])
    confidence = 0.2 * shared + 0.35 * alike + 0.3 * near + 0.15 * common
    if not shared and alike < 0.6 and near < 0.9:
        return None
    reasons = [
        "the same stop ids" if shared else "",
        "the same name" if alike == 1.0 else f"a name {alike:.0%} alike" if alike > 0.6 else "",
        f"{away:.0f} m apart",
        f"{common:.0%} of the lines" if common else "",
    ]
    # Ids may all be new: what name, place and lines agree on needs no id.
    sure = confidence / (1.0 if shared else 0.8)
    return min(1.0, sure), ", ".join(reason for reason in reasons if reason)


def _judge_lines(new: Line, old: EditionLine, known: Mapping[str, str]) -> tuple[float, str] | None:
    """Give confidence and reason that two lines are one; None if they cannot be."""
    called = {known.get(s, s) for course in new.itineraries for s in course}
    before = {s for course in old.itineraries for s in course}
    common = _jaccard(called, before)
    shared = bool(set(new.route_ids) & set(old.route_ids))
    named = new.name.casefold() == old.name.casefold()
    colored = new.color.upper() == old.color.upper()
    confidence = 0.15 * shared + 0.35 * named + 0.1 * colored + 0.4 * common
    if common == 0.0 or not (named or common > 0.5):
        return None
    reasons = [
        "the same route ids" if shared else "",
        "the same name" if named else "",
        "the same color" if colored else "",
        f"{common:.0%} of the stations",
    ]
    sure = confidence / (1.0 if shared else 0.85)
    return min(1.0, sure), ", ".join(reason for reason in reasons if reason)


def _metres(new: Station, old: EditionStation) -> float:
    shrink = math.cos(math.radians(old.lat))
    return _METRES_PER_DEGREE * math.hypot((new.lon - old.lon) * shrink, new.lat - old.lat)


def _alike(first: str, second: str) -> float:
    a, b = first.casefold().strip(), second.casefold().strip()
    return 1.0 if a == b else SequenceMatcher(None, a, b, autojunk=False).ratio()


def _jaccard(first: Collection[str], second: Collection[str]) -> float:
    a, b = set(first), set(second)
    return len(a & b) / len(a | b) if a | b else 0.0
