"""What a revision marks on its sheet: words at what is new, closed stations struck through."""

from __future__ import annotations

import json
from dataclasses import replace
from pathlib import Path
from xml.etree import ElementTree as ET

import pytest

from gtfs_schematic import pipeline
from gtfs_schematic.adjusting import adjust_edition, files_of_redrawn
from gtfs_schematic.drawing.marks import ClosedStation, Marks, last_day, still_closed, with_room
from gtfs_schematic.edition.adjustments import Adjustments
from gtfs_schematic.edition.folder import Beside
from gtfs_schematic.edition.state import from_json
from gtfs_schematic.revision import Revision, revise

DATA = Path(__file__).parents[2] / "data"
TRUTH = json.loads((DATA / "changes-truth.json").read_text("utf-8"))
SVG = "{http://www.w3.org/2000/svg}"
QUICK = pipeline.Settings.model_validate({"layout": {"effort": "quick"}})


def marking(**drawing: str) -> pipeline.Settings:
    return QUICK.model_copy(update={"drawing": QUICK.drawing.model_copy(update=drawing)})


@pytest.fixture(scope="module")
def drawn() -> pipeline.Result:
    return pipeline.draw(DATA / "before.zip", QUICK)


def beside(result: pipeline.Result) -> Beside:
    return Beside("a" * 64, from_json(result.state, result.edition))


@pytest.fixture(scope="module")
def marked(drawn: pipeline.Result) -> Revision:
    wanted = marking(mark_new="from {date}", show_closed="60")
    return revise(drawn.edition, DATA / "after.zip", wanted, beside=beside(drawn))


def groups_of(text: str, css_class: str) -> list[ET.Element]:
    root = ET.fromstring(text)
    return [g for g in root.iter(f"{SVG}g") if g.get("class") == css_class]


def svg(result: pipeline.Result) -> str:
    return pipeline.files_of(result)["diagram.svg"].decode()


def test_what_is_new_says_so_at_its_name_in_its_title_and_in_the_key(marked: Revision):
    result = marked.result
    start = result.network.info.start_date
    names = {s.id: s.name for s in result.network.stations}
    opened = {each["name"] for each in TRUTH["stations"]["opened"]}
    assert {names[key] for key in result.marks.stations} == opened
    lines = {k.id: k.name for k in result.network.lines}
    assert {lines[key] for key in result.marks.lines} == {
        each["name"] for each in TRUTH["lines"]["new"]
    }
    text = svg(result)
    told = " ".join(result.edition.findings)
    bare = {key for key in result.marks.stations if f"station {key}: no room for" in told}
    assert len(bare) < len(opened)
    for kind, marks in (("station", result.marks.stations), ("line", result.marks.lines)):
        for key in marks:
            (group,) = [g for g in groups_of(text, kind) if g.get(f"data-{kind}") == key]
            title = group.find(f"{SVG}title")
            assert title is not None
            assert f"from {start}" in (title.text or "")
            said = [word.text for word in group.iter(f"{SVG}text")]
            assert kind == "line" or said
            assert kind == "line" or (f"from {start}" in said) == (key not in bare)
    assert text.count(f"from {start}") >= 2 * len(opened) + 1 - len(bare)


def test_closed_stations_keep_their_place_and_no_line_calls(drawn, marked: Revision):
    result = marked.result
    gone = {each["name"] for each in TRUTH["stations"]["closed"]}
    assert {each.name for each in result.marks.closed} <= gone
    told = " ".join(result.edition.findings)
    shown = with_room(result.marks, result.labelled).closed
    unshown = gone - {each.name for each in shown}
    assert len(unshown) < len(gone)
    assert all(f"closed station {name} " in told for name in unshown)
    old = {s.id: (s.x_mm, s.y_mm) for s in drawn.edition.stations}
    for each in result.marks.closed:
        assert each.at_mm == old[each.id]
        assert each.id not in result.network.station
        assert each.until == "2026-08-28"  # 60 days after 29 June: 2 of June, 31 of July, 27
    text = svg(result)
    groups = groups_of(text, "closed-station")
    assert len(groups) == len(shown)
    for group in groups:
        title = group.find(f"{SVG}title")
        assert title is not None
        assert "closed; marked before 2026-08-28" in (title.text or "")
    assert "Closed station" in text
    kept = result.edition.settings["drawing"]
    assert {"mark_new": "from {date}", "show_closed": "60"}.items() <= kept.items()
    assert {"line_remarks", "closed_sign"}.isdisjoint(kept)


def test_nothing_is_marked_unless_it_is_asked_for(drawn: pipeline.Result):
    found = revise(drawn.edition, DATA / "after.zip", QUICK, beside=beside(drawn)).result
    assert found.marks == Marks()
    assert "closed-station" not in svg(found)
    assert "Closed station" not in svg(found)


def test_an_adjusted_edition_keeps_its_marks(marked: Revision):
    result = marked.result
    state = from_json(result.state, result.edition)
    again = adjust_edition(result.edition, state, Adjustments())
    assert files_of_redrawn(again) == pipeline.files_of(result)


def test_the_next_revision_takes_words_away_and_keeps_the_closed_in_their_time(marked: Revision):
    result = marked.result
    wanted = marking(mark_new="new", show_closed="60")
    after = revise(result.edition, DATA / "after.zip", wanted, beside=beside(result)).result
    assert (after.marks.stations, after.marks.lines) == ({}, {})
    assert after.marks.closed == result.marks.closed
    # And an edition that begins when their time is over has none.
    info = replace(result.network.info, start_date="2026-08-28")
    closed = still_closed(after.marks.closed, {}, info.start_date)
    assert closed == ()


def test_days_and_dates():
    assert last_day("", "2026-01-01") == ""
    assert last_day("2026-09-01", "2026-01-01") == "2026-09-01"
    assert last_day("31", "2026-01-01") == "2026-02-01"
    assert last_day("31", "") == ""
    one = ClosedStation("a", "A", (1.0, 1.0), "2026-02-01")
    assert still_closed([one, one], {}, "2026-01-31") == (one,)
    assert still_closed([one], {"a": 1}, "2026-01-31") == ()
    assert still_closed([one], {}, "2026-02-01") == ()


def test_a_closed_station_gives_way_to_what_stands_there_now(marked: Revision):
    labelled = marked.result.labelled
    key = next(iter(labelled.labels))
    at = labelled.bundled.layout.positions[key]
    taken = ClosedStation("x", "X", at, "2027-01-01")
    corner = labelled.labels[key].outline_mm[0]
    under = ClosedStation("y", "Y", corner, "2027-01-01")
    free = with_room(marked.result.marks, labelled).closed[0]
    crowded = replace(free, label=labelled.labels[key])
    assert with_room(Marks(closed=(taken, under, free)), labelled).closed == (free,)
    assert with_room(Marks(closed=(crowded,)), labelled).closed == (replace(free, label=None),)
