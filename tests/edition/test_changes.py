"""The change sheet tells every change, and nothing else."""

from __future__ import annotations

import csv
import io
import itertools
from dataclasses import replace
from pathlib import Path

import changed_timetables as changes
import pytest
from pypdf import PdfReader

from gtfs_schematic import pipeline
from gtfs_schematic.edition import changes_check
from gtfs_schematic.edition.carry import carried_matches, carried_roster
from gtfs_schematic.edition.change_list import to_pdf
from gtfs_schematic.edition.change_page import to_html
from gtfs_schematic.edition.changes import ChangeSheet, roster_changes, to_csv
from gtfs_schematic.edition.differences import Change, ChangeLimits, clock, listed
from gtfs_schematic.edition.identity import Matches, match_rosters
from gtfs_schematic.edition.make import stop_codes_of
from gtfs_schematic.edition.roster import Roster, RosterLine, RosterStation, roster_of_network
from gtfs_schematic.feed.model import Timetable
from gtfs_schematic.network.build import build_network
from gtfs_schematic.network.model import Network, NetworkSettings

DATA = Path(__file__).parents[2] / "data"
NONE = Matches({}, {})


def stop(key: str, lon: float, lines: tuple[str, ...] = ("1",)) -> RosterStation:
    return RosterStation(key, f"Stop {key}", "", (key,), (), lon, 50.0, lines, "unknown")


def line(key: str, *courses: str) -> RosterLine:
    itineraries = tuple(tuple(course) for course in courses)
    return RosterLine(
        key, key, "", "#AA0000", "#FFFFFF", "bus", (key,), itineraries, "all-day", 100, 18000,
        79200, 600,
    )  # fmt: skip


def network(*lines: RosterLine) -> Roster:
    """Give a roster of lines over stations a, b, c … that stand in a row."""
    calls: dict[str, set[str]] = {}
    links: dict[tuple[str, str], set[str]] = {}
    for each in lines:
        for course in each.itineraries:
            for s in course:
                calls.setdefault(s, set()).add(each.id)
            for a, b in itertools.pairwise(course):
                links.setdefault((min(a, b), max(a, b)), set()).add(each.id)
    stations = (stop(s, 0.01 * ord(s), tuple(sorted(on))) for s, on in sorted(calls.items()))
    return Roster(
        "Test", "0" * 64, "", "", "2026-03-11", tuple(stations), lines,
        tuple((a, b, tuple(sorted(on))) for (a, b), on in sorted(links.items())),
    )  # fmt: skip


def told(old: Roster, new: Roster, subject: str = "line") -> set[tuple[str, str, str]]:
    sheet = roster_changes(old, new, NONE)
    return {(c.kind, c.before, c.after) for c in sheet.changes if c.subject == subject}


@pytest.mark.parametrize(
    ("before", "after", "expected"),
    [
        (["abcd"], ["abcd"], set()),
        (["abcd"], ["dcba"], set()),
        (["abc"], ["abcd"], {("extended", "ends at Stop c", "ends at Stop d; gains Stop d")}),
        (["abcde"], ["bcde"], {("shortened", "ends at Stop a", "ends at Stop b; loses Stop a")}),
        (["abcd"], ["abd"], {("calls", "no longer calls at Stop c", "")}),
        (["abd"], ["abcd"], {("calls", "", "now calls at Stop c")}),
        (["abcde"], ["abxde"], {("rerouted", "by way of Stop c", "by way of Stop x")}),
        (["abcd"], ["abcd", "abxyz"], {("rerouted", "", "Stop a – Stop z")}),
        (["abcd", "xyz"], ["abcd"], {("rerouted", "Stop x – Stop z", "")}),
        (["abcda"], ["abcda"], set()),
    ],
)  # fmt: skip
def test_courses(before, after, expected):
    old, new = network(line("1", *before)), network(line("1", *after))
    assert told(old, new) == expected


def test_a_way_by_a_station_that_was_there_is_a_new_way():
    old = network(line("1", "abd"), line("2", "ac"))
    new = network(line("1", "abcd"), line("2", "ac"))
    assert told(old, new) == {("rerouted", "", "by way of Stop c")}


def test_words_of_a_line():
    old = network(line("1", "abc"))
    base = old.lines[0]
    new = replace(
        base, name="5", color="#00AA00", route_ids=("x",), mode="tram", service="peak",
        long_name="A to C", trips=50, headway_s=1200,
    )  # fmt: skip
    found = {kind for kind, _, _ in told(old, replace(old, lines=(new,)))}
    assert found == {
        "renamed", "recolored", "renumbered", "mode", "service", "long name", "retimed",
    }  # fmt: skip


@pytest.mark.parametrize(("trips", "small"), [(100, None), (90, True), (80, True), (79, False)])
def test_a_fifth_of_the_trips_is_the_limit(trips, small):
    old = network(line("1", "abc"))
    new = replace(old, lines=(replace(old.lines[0], trips=trips),))
    sheet = roster_changes(old, new, NONE, ChangeLimits(retimed_share=0.2))
    assert [c.small for c in sheet.changes] == ([] if small is None else [small])


def test_small_moves_stay_below_the_limit():
    old = network(line("1", "abc"))
    metre = 1.0 / 71_700.0  # a metre of longitude at 50° north, by the length of its parallel
    for metres, count in ((0.2, None), (10.0, True), (40.0, False)):
        stations = (replace(old.stations[0], lon=old.stations[0].lon + metres * metre),)
        new = replace(old, stations=(*stations, *old.stations[1:]))
        sheet = roster_changes(old, new, NONE)
        assert [c.small for c in sheet.changes] == ([] if count is None else [count])
        if count is False:
            assert sheet.changes[0].after == "40 m on the ground"


def test_the_check_sees_what_is_not_told():
    old = network(line("1", "abc"))
    stations = (replace(old.stations[0], name="Other"), *old.stations[1:])
    new = replace(old, stations=stations)
    assert changes_check.faults((), old, new, {}) == ("untold: station a name",)
    invented = Change("station", "renamed", "b", "Stop b", "x", "y", ("b",))
    real = Change("station", "renamed", "a", "Other", "Stop a", "Other", ("a",))
    found = changes_check.faults((real, invented), old, new, {})
    assert found == ("told, but the same: station b name",)


@pytest.fixture(scope="module")
def before() -> tuple[Timetable, Network]:
    return pipeline.inspect(DATA / "before.zip")


EXPECTED = {
    "close": {("station", "gone")},
    "open_between": {("station", "new")},
    "rename": {("station", "renamed")},
    "move": {("station", "moved")},
    "extend": {("station", "new"), ("line", "extended")},
    "reroute": {("station", "new"), ("line", "rerouted")},
    "renumber_some": {("line", "renumbered")},
    "withdraw": {("line", "gone")},
    "rename_route": {("line", "renamed")},
}
LINES_OF_STATIONS = {("station", "lines"), ("station", "stops"), ("station", "renumbered")}


@pytest.mark.parametrize("change", changes.CHANGES)
def test_generated_changes_are_told_whatever_the_ids(before, change):
    """With the ids kept and with all of them new: the sheet is the same but for the numbers."""
    timetable, old_network = before
    old = roster_of_network(old_network, stop_codes_of(timetable, old_network))
    for seed in range(3):
        chance = changes.chance_of(seed)
        changed = change(changes.unchanged(timetable), chance)
        kept = sheet_of(old, changed)
        kinds = {(c.subject, c.kind) for c in kept.large}
        assert EXPECTED[change.__name__] <= kinds | {("line", "rerouted")}
        renumbered = sheet_of(old, changes.renumber_all(changed, chance))
        assert telling(renumbered) == telling(kept)


def sheet_of(old: Roster, changed: changes.Changed) -> ChangeSheet:
    fresh = build_network(changed.timetable, NetworkSettings())
    new = roster_of_network(fresh, stop_codes_of(changed.timetable, fresh))
    found = match_rosters(old, new)
    return roster_changes(old, carried_roster(new, old, found), carried_matches(new, old, found))


def telling(sheet: ChangeSheet) -> list[tuple[str, ...]]:
    """Give what a sheet tells but for ids, and for colors that follow from their order."""
    numbers = {"renumbered", "stops", "routes", "recolored"}
    return sorted(
        (c.subject, c.kind, c.name, c.before, c.after)
        for c in sheet.changes
        if c.kind not in numbers and c.subject != "walk"
    )


def test_long_sheets_take_several_pages():
    old = network(line("1", "abc"))
    rows = tuple(
        Change("station", "renamed", f"s{i}", f"Place {i}", f"Old {i}", f"Place {i}")
        for i in range(120)
    )
    sheet = replace(roster_changes(old, old, NONE), changes=rows)
    data = to_pdf(sheet)
    assert data == to_pdf(sheet)
    reader = PdfReader(io.BytesIO(data))
    assert len(reader.pages) > 2
    text = " ".join(" ".join(page.extract_text() for page in reader.pages).split())
    assert all(f"Station Place {i} (s{i}), renamed" in text for i in range(120))
    assert [float(reader.pages[0].mediabox[i]) for i in (2, 3)] == pytest.approx(
        [210 / 25.4 * 72, 297 / 25.4 * 72], abs=0.01
    )  # ISO 216 A4
    assert len(list(csv.reader(io.StringIO(to_csv(sheet).decode())))) == 121


def test_markup_in_names_stays_text():
    old = network(line("1", "abc"))
    stations = (replace(old.stations[0], name="<b>&"), *old.stations[1:])
    page = to_html(roster_changes(old, replace(old, stations=stations), NONE)).decode()
    assert "<b>" not in page
    assert "&lt;b&gt;&amp;" in page


def test_words():
    assert clock(29 * 3600 + 600) == "29:10"
    assert listed("abc", {"a": "A"}, most=2) == "A, b and 1 more"
