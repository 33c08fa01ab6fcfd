"""Match the lines of two rosters, given which stations match."""

from __future__ import annotations

from collections import Counter
from collections.abc import Collection, Hashable, Mapping

from gtfs_schematic.edition.evidence import (
    Weight,
    Worth,
    course_weight,
    ids_weight,
    line_name_weight,
    surety,
    words_of,
    worth_of,
)
from gtfs_schematic.edition.match_stations import Found
from gtfs_schematic.edition.pairing import Pair, best_pairs
from gtfs_schematic.edition.roster import Roster, RosterLine
from gtfs_schematic.network.naming import name_key

_IDS = 5.0
"""The most that route ids in common can say."""
_SAME_COURSE = 0.5
_LONG_NAME, _COLOR, _OTHER_COLOR, _OTHER_MODE = 1.0, 1.0, -0.5, -4.0
_UNKNOWN = 1.0
"""What `surety` takes off for lines is one less than for stations: there are fewer of them."""


class LineMatching:
    """All that two rosters say of which lines are one."""

    def __init__(self, old: Roster, new: Roster) -> None:
        self.rows = sorted(old.lines, key=_content)
        self.columns = sorted(new.lines, key=_content)
        self.calls = [
            {line.id: frozenset(s for ids in line.itineraries for s in ids) for line in lines}
            for lines in (self.rows, self.columns)
        ]
        self.holders = [
            Counter(name_key(line.name) for line in lines) for lines in (self.rows, self.columns)
        ]

    def matched(
        self, stations: Mapping[str, str], settled: tuple[Collection[str], Collection[str]]
    ) -> Found:
        """Choose the best pairs.

        Parameters
        ----------
        stations
            New ids by old.
        settled
            Old and new ids of lines about which an adjustment has spoken.
        """
        rows = [i for i, line in enumerate(self.rows) if line.id not in settled[0]]
        columns = [j for j, line in enumerate(self.columns) if line.id not in settled[1]]
        courses = {(i, j): self._course((i, j), stations) for i in rows for j in columns}
        worth = self._worth(courses)
        weights = {
            pair: self._weights(pair, course, worth)
            for pair, course in courses.items()
            if self._possible(pair, course)
        }
        odds = {pair: surety(each) for pair, each in weights.items()}
        return {
            self.rows[i].id: (self.columns[j].id, words_of(weights[i, j]), sure)
            for (i, j), sure in best_pairs(odds).items()
        }

    def _course(self, pair: Pair, stations: Mapping[str, str]) -> Weight:
        one, other = self.rows[pair[0]], self.columns[pair[1]]
        return course_weight(self.calls[0][one.id], self.calls[1][other.id], stations)

    def _possible(self, pair: Pair, course: Weight) -> bool:
        """Whether a pair has anything in common."""
        one, other = self.rows[pair[0]], self.columns[pair[1]]
        return (
            course.value > -2.0
            or bool(set(one.route_ids) & set(other.route_ids))
            or name_key(one.name) == name_key(other.name)
        )

    def _worth(self, courses: Mapping[Pair, Weight]) -> Worth:
        shared = right = shared_right = right_shared = 0
        for (i, j), course in courses.items():
            one, other = self.rows[i], self.columns[j]
            common = bool(set(one.route_ids) & set(other.route_ids))
            named = name_key(one.name) == name_key(other.name)
            alike = course.value >= _SAME_COURSE
            shared += common
            shared_right += common and (named or alike)
            right += named and alike
            right_shared += common and named and alike
        return worth_of(shared_right, shared, right_shared, right, _IDS)

    def _weights(self, pair: Pair, course: Weight, worth: Worth) -> tuple[Weight, ...]:
        one, other = self.rows[pair[0]], self.columns[pair[1]]
        holders = max(self.holders[0][name_key(one.name)], self.holders[1][name_key(other.name)])
        long_name = one.long_name == other.long_name != ""
        same_color = one.color.upper() == other.color.upper()
        other_mode = one.mode != other.mode and bool(one.mode and other.mode)
        return (
            ids_weight(one.route_ids, other.route_ids, worth, "route ids"),
            line_name_weight(one.name, other.name, holders),
            Weight(_LONG_NAME * long_name, "the same long name" if long_name else ""),
            Weight(_COLOR, "the same color") if same_color else Weight(_OTHER_COLOR),
            Weight(_OTHER_MODE * other_mode, "another mode" if other_mode else ""),
            course,
            Weight(_UNKNOWN),
        )


def _content(line: RosterLine) -> tuple[Hashable, ...]:
    return (line.name, line.long_name, line.color, line.trips, line.route_ids, line.id)
