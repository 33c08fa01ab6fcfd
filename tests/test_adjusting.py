"""An edition is redrawn without its feed, and only where an adjustment touches it."""

from __future__ import annotations

import random
from dataclasses import replace
from pathlib import Path

import pytest

from gtfs_schematic import pipeline
from gtfs_schematic.adjusting import Redrawn, adjust_edition, files_of_redrawn
from gtfs_schematic.clearances import clearances_of
from gtfs_schematic.edition.adjustments import Adjustments, adjustments_of
from gtfs_schematic.edition.model import Edition
from gtfs_schematic.edition.saying import with_saying
from gtfs_schematic.edition.state import State, from_json
from gtfs_schematic.errors import LayoutError, UsageError
from gtfs_schematic.layout import check as layout_check

QUICK = pipeline.Settings.model_validate({"layout": {"effort": "quick"}})
BEFORE = Path(__file__).parent.parent / "data" / "before.zip"
NOTHING = Adjustments()


@pytest.fixture(scope="module")
def drawn() -> pipeline.Result:
    return pipeline.draw(BEFORE, QUICK)


@pytest.fixture(scope="module")
def state(drawn: pipeline.Result) -> State:
    return from_json(drawn.state, drawn.edition)


def places(edition: Edition) -> dict[str, tuple[float, float]]:
    return {s.id: (s.x_mm, s.y_mm) for s in edition.stations}


def paths(edition: Edition) -> dict[str, object]:
    return {k.id: (k.path_mm, k.lines) for k in edition.links}


def redraw(drawn: pipeline.Result, state: State, **said: object) -> Redrawn:
    found = adjust_edition(drawn.edition, state, adjustments_of(said, "test"))
    pins = {k: p.pin_mm for k, p in adjustments_of(said, "test").stations.items() if p.pin_mm}
    layout = found.labelled.bundled.layout
    limits = clearances_of(layout.network, QUICK.bundles, QUICK.labels)
    assert layout_check.faults(layout, limits, pins) == ()
    return found


def test_without_an_adjustment_every_byte_is_the_same(drawn, state):
    assert files_of_redrawn(redraw(drawn, state)) == pipeline.files_of(drawn)


def test_an_adjustment_taken_back_leaves_no_trace(drawn, state):
    there = redraw(drawn, state, lines={"m1": {"color": "#225577"}})
    assert there.edition != drawn.edition
    back = adjust_edition(there.edition, from_json(there.state, there.edition), NOTHING)
    assert files_of_redrawn(back) == pipeline.files_of(drawn)


def test_a_color_touches_nothing_but_the_color(drawn, state):
    found = redraw(drawn, state, lines={"m1": {"color": "#225577"}})
    assert {k.color for k in found.edition.lines if k.id == "m1"} == {"#225577"}
    old = {k.id: k for k in drawn.edition.lines}
    assert all(k == old[k.id] for k in found.edition.lines if k.id != "m1")
    assert found.edition.stations == drawn.edition.stations
    assert found.edition.links == drawn.edition.links
    assert found.labelled.labels == drawn.labelled.labels
    assert found.drift == drawn.drift
    # The same picture comes of drawing the feed with the adjustment: nothing else depends on it.
    whole = pipeline.draw(BEFORE, QUICK, adjustments=adjustments_of(
        {"lines": {"m1": {"color": "#225577"}}}, "test"))  # fmt: skip
    assert files_of_redrawn(found) == pipeline.files_of(whole)


def test_a_name_touches_its_label_and_at_most_some_beside_it(drawn, state):
    found = redraw(drawn, state, stations={"183": {"name": "A name of quite some length"}})
    assert paths(found.edition) == paths(drawn.edition)
    assert "183" in found.renamed or "183" in found.labelled.unplaced
    assert len(found.renamed) <= 4 or "183" in found.renamed
    names = {s.station_id: s.name for s in found.drift.stations}
    assert names["183"] == "A name of quite some length"
    measured = pipeline.measure_edition(found.edition, QUICK.drift)
    assert found.drift == measured


def test_a_pin_moves_the_station_and_little_else(drawn, state):
    chance = random.Random(2)  # noqa: S311 - no secret
    moved, refused = [], []
    for key, (x, y) in sorted(places(drawn.edition).items())[::9]:
        pin = (round(x + chance.uniform(-4, 4), 2), round(y + chance.uniform(-4, 4), 2))
        try:
            found = redraw(drawn, state, stations={key: {"pin_mm": pin}})
        except LayoutError as error:
            refused.append((key, str(error)))
            continue
        assert places(found.edition)[key] == pin
        assert found.drift == pipeline.measure_edition(found.edition, QUICK.drift)
        moved.append(len(found.moved))
    assert all(f"stations.{key}.pin_mm" in told for key, told in refused)
    assert len(moved) > len(refused)
    assert sorted(moved)[len(moved) // 2] <= 3


def test_a_place_beside_another_holds(drawn, state):
    kept = 0
    for link in drawn.network.links[5::14]:
        (x, _), (u, _) = (places(drawn.edition)[end] for end in (link.start, link.end))
        said = {link.start: {"pin_from": {"station": link.end, "dx_mm": round(x - u - 1.0, 2)}}}
        try:
            found = redraw(drawn, state, stations=said)
        except LayoutError:
            continue
        at = places(found.edition)
        assert at[link.start][0] - at[link.end][0] == pytest.approx(x - u - 1.0, abs=0.01)
        assert at[link.end] == places(drawn.edition)[link.end]
        assert found.unmet == ()
        kept += 1
    assert kept >= 3


def test_lines_change_places_where_it_is_asked_for_and_nowhere_else(drawn, state):
    order = drawn.bundled.orders["101~121"]
    said = {"between": ["101", "121"], "order": list(order[::-1])}
    found = redraw(drawn, state, links=[said])
    orders = {k.id: k.lines for k in found.edition.links}
    assert orders["101~121"] == order[::-1]
    chain = set(order)
    assert all(orders[k.id] == k.lines for k in drawn.edition.links if not chain & set(k.lines))
    assert places(found.edition) == places(drawn.edition)
    assert found.edition.patterns == drawn.edition.patterns


def test_what_is_merged_and_hidden_leaves_the_rest_where_it_was(drawn, state):
    found = redraw(
        drawn, state,
        merge=[{"stations": ["106", "343-1"], "name": "Both"}],
        stations={"132": {"hide": True}},
        group=[{"lines": ["t5", "t6"], "name": "T"}],
        lines={"rx": {"hide": True}},
    )  # fmt: skip
    old, new = places(drawn.edition), places(found.edition)
    assert {"132", "343-1"} & set(new) == set()
    moved = [key for key in set(old) & set(new) if old[key] != new[key]]
    assert len(moved) <= 0.05 * len(old)
    # Times are those of the network as it is drawn, which a drawing of the feed gives, too.
    said = adjustments_of(found.edition.adjustments, "test")
    network = pipeline.adjust(drawn.network, said, drawn.timetable, pipeline.Silent()).network
    assert found.edition.patterns == pipeline.timing_of(drawn.timetable, network).patterns


def test_what_has_no_room_is_refused_with_its_name(drawn, state):
    with pytest.raises(LayoutError, match=r"stations\.183\.pin_mm"):
        redraw(drawn, state, stations={"183": {"pin_mm": [-500, 3]}})


def test_a_wish_that_cannot_be_met_is_told_and_moves_nothing(drawn, state):
    link = drawn.network.link["101~121"]
    (ax, ay), (bx, by) = (drawn.layout.positions[end] for end in (link.start, link.end))
    back = ("W" if bx > ax else "E") if abs(bx - ax) > abs(by - ay) else "N" if by > ay else "S"
    found = redraw(drawn, state, links=[{"between": ["101", "121"], "direction": back}])
    if found.unmet:
        assert places(found.edition) == places(drawn.edition)
        assert "links.0.direction" in found.edition.findings[-1]
    else:
        path = found.labelled.bundled.layout.paths[link.id]
        assert len(path) == 2


def test_contradictions_are_refused(drawn, state):
    with pytest.raises(UsageError, match=r"stations\.152\.pin_mm and stations\.183\.pin_mm"):
        redraw(drawn, state, stations={"183": {"pin_mm": [9, 9]}, "152": {"pin_mm": [9, 9]}})


def test_sayings_join_and_are_taken_back():
    one = with_saying(NOTHING, ("stations", ["a"]), {"name": "A", "label_side": "N"})
    two = with_saying(one, ("stations", ["a"]), {"label_side": "S"})
    assert two.stations["a"].label_side == "S"
    assert two.stations["a"].name == "A"
    three = with_saying(two, ("links", ["a", "b"]), {"direction": "E"})
    four = with_saying(three, ("links", ["b", "a"]), {"order": ["x", "y"]})
    # Said from the other end the whole is said anew: it would be the other way round.
    assert len(four.links) == 1
    five = with_saying(four, ("merge", ["c", "d"]), {})
    assert five.merge[0].stations == ("c", "d")
    words = with_saying(five, ("abbreviations", ["Street"]), {"short": "St"})
    for about in (("merge", ["d", "c"]), ("links", ["a", "b"]), ("stations", ["a"])):
        words = with_saying(words, about, {}, ["all"])
    assert words == adjustments_of({"abbreviations": {"Street": "St"}}, "test")
    assert with_saying(words, ("abbreviations", ["Street"]), {}, ["all"]) == NOTHING
    with pytest.raises(UsageError, match="nothing is said"):
        with_saying(NOTHING, ("stations", ["a"]), {}, ["name"])
    with pytest.raises(UsageError, match="label_side, name"):
        with_saying(one, ("stations", ["a"]), {}, ["hide"])


def test_an_edition_of_its_own_names_the_one_before(drawn, state):
    found = redraw(drawn, state, lines={"m1": {"note": "as it is"}}).revising("a" * 64)
    assert found.edition.previous == "a" * 64
    assert replace(found.edition, previous="", adjustments={}) == drawn.edition
