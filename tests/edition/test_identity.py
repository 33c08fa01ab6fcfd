"""Stations and lines are known again after service changes, whatever became of their ids."""

from __future__ import annotations

import itertools
import json
from dataclasses import replace
from pathlib import Path
from random import Random

import changed_timetables as changes
import numpy as np
import pytest
from generated_networks import wandering_network
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.optimize import linear_sum_assignment

from gtfs_schematic import pipeline
from gtfs_schematic.edition.adjustments import adjustments_of
from gtfs_schematic.edition.evidence import likeness
from gtfs_schematic.edition.identity import Matches, match_rosters
from gtfs_schematic.edition.make import stop_codes_of
from gtfs_schematic.edition.pairing import best_pairs
from gtfs_schematic.edition.roster import Roster, roster_of_network
from gtfs_schematic.feed.model import Timetable
from gtfs_schematic.network.build import build_network
from gtfs_schematic.network.model import Network, NetworkSettings

DATA = Path(__file__).parents[2] / "data"
TRUTH = json.loads((DATA / "changes-truth.json").read_text("utf-8"))


def roster(timetable: Timetable, network: Network) -> Roster:
    return roster_of_network(network, stop_codes_of(timetable, network))


@pytest.fixture(scope="module")
def before() -> tuple[Timetable, Network]:
    return pipeline.inspect(DATA / "before.zip")


@pytest.fixture(scope="module")
def after() -> tuple[Timetable, Network]:
    return pipeline.inspect(DATA / "after.zip")


def pairs(matches: Matches) -> tuple[set[tuple[str, str]], set[tuple[str, str]]]:
    return (
        {(m.old_id, m.new_id) for m in matches.stations.values()},
        {(m.old_id, m.new_id) for m in matches.lines.values()},
    )


def test_the_demo_feeds_as_the_truth_file_says(before, after):
    old, new = roster(*before), roster(*after)
    matches = match_rosters(old, new)
    stations, lines = pairs(matches)
    told = TRUTH["stations"]
    gone = {s.name for s in old.stations} - {old.station[a].name for a, _ in stations}
    fresh = {new.station[s.id].name for s in new.stations if s.id not in matches.stations}
    assert gone == {record["name"] for record in told["closed"]}
    assert fresh == {record["name"] for record in told["opened"]}
    stops_new = {stop: s.id for s in new.stations for stop in s.stop_ids}
    stops_old = {stop: s.id for s in old.stations for stop in s.stop_ids}
    (renumbered,) = told["renumbered"]
    assert (
        stops_old[renumbered["old_stop_ids"][0]],
        stops_new[renumbered["new_stop_ids"][0]],
    ) in stations
    for record in (*told["renamed"], *told["moved"]):
        for stop in record["stop_ids"]:
            assert (stops_old[stop], stops_new[stop]) in stations
    assert {k.id for k in old.lines} - {a for a, _ in lines} == {
        record["route_id"] for record in TRUTH["lines"]["withdrawn"]
    }
    assert {k.id for k in new.lines} - set(matches.lines) == {
        record["route_id"] for record in TRUTH["lines"]["new"]
    }
    assert matches.doubtful == ()


@pytest.mark.parametrize("shuffle", [changes.renumber_all, changes.permute_all])
def test_a_feed_with_all_ids_new_is_matched_whole(before, shuffle):
    """Also where every id now stands for something else."""
    timetable, network = before
    changed = shuffle(changes.unchanged(timetable), changes.chance_of(7))
    fresh = build_network(changed.timetable, NetworkSettings())
    matches = match_rosters(roster(timetable, network), roster(changed.timetable, fresh))
    stations, lines = pairs(matches)
    assert stations == changes.true_stations(network, fresh, changed).certain
    assert lines == changes.true_lines(network, fresh, changed).certain
    assert (len(stations), len(lines)) == (len(network.stations), len(network.lines))


@pytest.mark.parametrize(("feed", "seeds"), [("demo", 2), ("ann_arbor_feed", 1)])
def test_generated_changes_are_seen_through(feed, seeds, request):
    """Precision and recall over all stations and lines of many changed feeds."""
    path = DATA / "before.zip" if feed == "demo" else request.getfixturevalue(feed)
    timetable, network = pipeline.inspect(path)
    old = roster(timetable, network)
    count = {"right": 0, "wrong": 0, "missed": 0}
    for seed, change in itertools.product(range(seeds), changes.CHANGES):
        chance = changes.chance_of(seed)
        changed = change(changes.unchanged(timetable), chance)
        if (seed + changes.CHANGES.index(change)) % 2:
            changed = changes.renumber_all(change(changed, chance), chance)
        fresh = build_network(changed.timetable, NetworkSettings())
        found = pairs(match_rosters(old, roster(changed.timetable, fresh)))
        truths = (
            changes.true_stations(network, fresh, changed),
            changes.true_lines(network, fresh, changed),
        )
        for truth, pair in zip(truths, found, strict=True):
            count["right"] += len(truth.certain & pair)
            count["wrong"] += len(truth.wrong(pair))
            count["missed"] += len(truth.missed(pair))
    assert count["right"] > 100 * seeds
    assert count["wrong"] <= 0.01 * (count["right"] + count["wrong"])
    assert count["missed"] <= 0.01 * (count["right"] + count["missed"])


def permuted(old: Roster, chance: Random) -> tuple[Roster, dict[str, str]]:
    """Give all stations, stops and lines each other's ids."""
    ids = [s.id for s in old.stations]
    name = dict(zip(ids, chance.sample(ids, len(ids)), strict=True))
    lines = [k.id for k in old.lines]
    line = dict(zip(lines, chance.sample(lines, len(lines)), strict=True))
    stations = [
        replace(s, id=name[s.id], stop_ids=(name[s.id],), lines=tuple(line[k] for k in s.lines))
        for s in old.stations
    ]
    fresh = replace(
        old,
        stations=tuple(sorted(stations, key=lambda s: s.id)),
        lines=tuple(
            replace(
                k,
                id=line[k.id],
                route_ids=(line[k.id],),
                itineraries=tuple(tuple(name[s] for s in ids) for ids in k.itineraries),
            )
            for k in old.lines
        ),
        links=tuple((name[a], name[b], tuple(line[k] for k in on)) for a, b, on in old.links),
    )
    return fresh, name


@given(st.integers(0, 10_000))
@settings(max_examples=25)
def test_permuted_ids_change_nothing(seed):
    old = roster_of_network(wandering_network(seed % 40, 5, 4, 9))
    fresh, name = permuted(old, changes.chance_of(seed))
    matches = match_rosters(old, fresh)
    assert {m.old_id: m.new_id for m in matches.stations.values()} == name


@given(st.integers(0, 10_000), st.integers(0, 10_000))
@settings(max_examples=25)
def test_matching_is_symmetric(first, second):
    """Whatever the two have in common: here places, names and ids overlap by accident."""
    one = roster_of_network(wandering_network(first % 60, 5, 4, 9))
    other = roster_of_network(wandering_network(second % 60, 5, 3, 8))
    there, back = match_rosters(one, other), match_rosters(other, one)
    for found, turned in zip(pairs(there), pairs(back), strict=True):
        assert found == {(b, a) for a, b in turned}
    assert [m.confidence for m in there.doubtful] == [m.confidence for m in back.doubtful]
    assert {(m.old_id, m.new_id) for m in there.merged_stations} == {
        (m.new_id, m.old_id) for m in back.split_stations
    }


odds = st.dictionaries(
    st.tuples(st.integers(0, 5), st.integers(0, 5)), st.floats(-5, 12, width=16), max_size=20
)


@given(odds)
def test_the_assignment_is_the_best_of_all(given_odds):
    """On the whole matrix by scipy, and by trying all ways."""
    chosen = best_pairs(given_odds)
    assert len({i for i, _ in chosen}) == len({j for _, j in chosen}) == len(chosen)
    total = sum(given_odds[pair] for pair in chosen)
    matrix = np.zeros((6, 6))
    for pair, value in given_odds.items():
        matrix[pair] = max(0.0, value)
    rows, columns = linear_sum_assignment(matrix, maximize=True)
    assert total == pytest.approx(matrix[rows, columns].sum())
    best = max(sum(matrix[range(6), order]) for order in itertools.permutations(range(6)))
    assert total == pytest.approx(best)
    assert all(0.0 < sure < 1.0 for sure in chosen.values())


def test_twins_are_doubtful():
    """Two pairs that are equally likely leave it open."""
    sure = best_pairs({(0, 0): 6.0, (0, 1): 6.0, (1, 0): 6.0, (1, 1): 6.0})
    assert len(sure) == 2
    assert all(value == pytest.approx(0.5, abs=0.01) for value in sure.values())
    assert best_pairs({(0, 0): 6.0})[0, 0] > 0.99


@given(st.text(max_size=8), st.text(max_size=8))
def test_likeness_is_symmetric(one, other):
    assert likeness(one, other) == likeness(other, one)
    assert likeness(one, one) == 1.0


def test_a_merged_station_and_its_turn_a_split_one(before):
    timetable, network = before
    old = roster(timetable, network)
    one, other = next(
        (a, b)
        for a, b in itertools.combinations(old.stations, 2)
        if b.id in old.neighbors[a.id] and a.name != b.name
    )
    merged = replace(one, stop_ids=tuple(sorted((*one.stop_ids, *other.stop_ids))))
    fresh = replace(
        old,
        stations=tuple(merged if s is one else s for s in old.stations if s is not other),
        lines=tuple(
            replace(
                k,
                itineraries=tuple(tuple(s for s in i if s != other.id) for i in k.itineraries),
            )
            for k in old.lines
        ),
        links=tuple(link for link in old.links if other.id not in link[:2]),
        walks=(),
    )
    there, back = match_rosters(old, fresh), match_rosters(fresh, old)
    assert [(m.old_id, m.new_id) for m in there.merged_stations] == [(other.id, one.id)]
    assert [(m.new_id, m.old_id) for m in back.split_stations] == [(other.id, one.id)]


def test_a_line_split_in_two(before):
    timetable, network = before
    old = roster(timetable, network)
    line = max(old.lines, key=lambda k: (len(k.itineraries) == 1, len(k.itineraries[0])))
    course = line.itineraries[0]
    middle = len(course) // 2
    first = replace(line, itineraries=(course[: middle + 1],))
    second = replace(line, id="zz", name="ZZ", long_name="", color="#123456", route_ids=("zz",),
                     itineraries=(course[middle:],))  # fmt: skip
    later = {frozenset(step) for step in itertools.pairwise(course[middle:])}
    links = tuple(
        (a, b, tuple(sorted("zz" if k == line.id else k for k in on)))
        if frozenset((a, b)) in later
        else (a, b, on)
        for a, b, on in old.links
    )
    lines = tuple(first if k is line else k for k in old.lines)
    fresh = replace(old, lines=(*lines, second), links=links)
    matches = match_rosters(old, fresh)
    assert matches.lines[line.id].old_id == line.id
    assert [(m.new_id, m.old_id) for m in matches.split_lines] == [("zz", line.id)]
    turned = match_rosters(fresh, old)
    assert [(m.old_id, m.new_id) for m in turned.merged_lines] == [("zz", line.id)]


def test_an_adjustment_settles_what_is_the_same(before, after):
    old, new = roster(*before), roster(*after)
    said = adjustments_of(
        {
            "same_station": [
                {"old": "411", "new": "421"},
                {"old": "183", "new": ""},
                {"old": "nowhere", "new": "422"},
            ],
            "same_line": [{"old": "b9", "new": "b10"}],
        },
        "test",
    )
    matches = match_rosters(old, new, said)
    assert matches.stations["421"].old_id == "411"
    assert matches.stations["421"].confidence == 1.0
    assert "183" not in {m.old_id for m in matches.stations.values()}
    assert matches.lines["b10"].old_id == "b9"
    assert matches.unknown == ("same_station.2: nowhere is in neither feed",)
