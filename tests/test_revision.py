"""A revised edition keeps ids and places, finds every change, and says nothing else changed."""

from __future__ import annotations

import csv
import io
import json
import random
import zipfile
from pathlib import Path

import pytest

from gtfs_schematic import pipeline
from gtfs_schematic.config import Settings
from gtfs_schematic.edition.adjustments import adjustments_of
from gtfs_schematic.edition.folder import Beside
from gtfs_schematic.edition.identity import match_edition
from gtfs_schematic.edition.model import Edition
from gtfs_schematic.edition.ratchet import RevisionSettings, advice
from gtfs_schematic.edition.state import from_json
from gtfs_schematic.layout.check import faults
from gtfs_schematic.revision import Revision, files_of_revision, revise

DATA = Path(__file__).parent.parent / "data"
BEFORE, AFTER = DATA / "before.zip", DATA / "after.zip"
SETTINGS = Settings.model_validate({"layout": {"effort": "quick"}})
TRUTH = json.loads((DATA / "changes-truth.json").read_text("utf-8"))


@pytest.fixture(scope="module")
def drawn() -> pipeline.Result:
    return pipeline.draw(BEFORE, SETTINGS)


@pytest.fixture(scope="module")
def before(drawn: pipeline.Result) -> Edition:
    return drawn.edition


@pytest.fixture(scope="module")
def revision(before: Edition) -> Revision:
    return revise(before, AFTER, SETTINGS)


def names(revision: Revision, subject: str, kind: str) -> set[str]:
    return {c.name for c in revision.sheet.changes if (c.subject, c.kind) == (subject, kind)}


def test_an_unchanged_feed_gives_the_same_drawing_and_no_change(before: Edition):
    again = revise(before, BEFORE, SETTINGS)
    assert again.sheet.changes == ()
    new, old = again.result.edition, before
    assert [(s.id, s.x_mm, s.y_mm) for s in new.stations] == [
        (s.id, s.x_mm, s.y_mm) for s in old.stations
    ]
    assert new.links == old.links
    sides = [a.label_side == b.label_side for a, b in zip(new.stations, old.stations, strict=True)]
    assert sum(sides) >= 0.95 * len(sides)


@pytest.fixture(scope="module")
def beside(drawn: pipeline.Result) -> Beside:
    return Beside(state=from_json(drawn.state, drawn.edition))


def test_an_unchanged_feed_gives_the_same_diagram_to_the_byte(drawn, beside: Beside):
    again = revise(drawn.edition, BEFORE, SETTINGS, beside=beside)
    assert pipeline.files_of(again.result)["diagram.svg"] == pipeline.files_of(drawn)["diagram.svg"]


def test_permuted_ids_give_the_same_diagram(drawn, beside: Beside, tmp_path):
    shuffled = tmp_path / "shuffled.zip"
    _shuffle_ids(BEFORE, shuffled)
    again = revise(drawn.edition, shuffled, SETTINGS, beside=beside)
    assert again.result.layout.positions == drawn.layout.positions
    assert again.result.bundled.orders == drawn.bundled.orders
    assert again.result.labelled.labels == drawn.labelled.labels


def test_there_and_back_leaves_what_was_never_gone_in_its_place(drawn, beside: Beside):
    there = revise(drawn.edition, AFTER, SETTINGS, beside=beside).result
    kept = Beside(state=from_json(there.state, there.edition))
    back = revise(there.edition, BEFORE, SETTINGS, beside=kept).result
    first, last = drawn.edition, back.edition
    assert set(first.places) == set(last.places)
    stood = set(first.places) & set(there.edition.places)
    assert {key: last.places[key] for key in stood} == {key: first.places[key] for key in stood}
    orders = {k.id: k.lines for k in first.drawn}
    assert all(orders[k.id] == k.lines for k in last.drawn if k.id in orders)


def test_a_limit_on_the_growth_of_drift_is_told(drawn, beside: Beside):
    tight = SETTINGS.model_copy(update={"revision": RevisionSettings(most_drift_growth=1e-9)})
    evened = tight.model_copy(update={"revision": RevisionSettings(relax=1.0)})
    drifts = revise(drawn.edition, AFTER, evened, beside=beside).result.edition.drifts
    assert [each.service_date for each in drifts] == ["2026-03-02", "2026-06-29"]
    assert drifts[0].residual == pytest.approx(drawn.drift.north_up.residual, abs=1e-6)
    assert bool(advice(drifts, tight.revision)) == (drifts[1].residual > drifts[0].residual)


def test_what_stands_keeps_its_place(before: Edition, revision: Revision):
    old = {s.id: (s.x_mm, s.y_mm) for s in before.stations}
    new = {s.id: (s.x_mm, s.y_mm) for s in revision.result.edition.stations}
    assert not revision.anew
    assert all(new[key] == old[key] for key in set(old) & set(new))
    clearances = pipeline.clearances_of(revision.result.network, SETTINGS.bundles, SETTINGS.labels)
    assert faults(revision.result.layout, clearances) == ()


def test_every_change_of_the_demo_is_found(revision: Revision):
    """The truth file was written by the demo's generator, not by this comparison."""
    lines, stations = TRUTH["lines"], TRUTH["stations"]
    assert names(revision, "line", "new") == {each["name"] for each in lines["new"]}
    assert names(revision, "line", "gone") == {each["name"] for each in lines["withdrawn"]}
    for kind in ("extended", "rerouted"):
        assert names(revision, "line", kind) == {each["name"] for each in lines[kind]}
    assert names(revision, "line", "calls") == {each["name"] for each in lines["calls_dropped"]}
    assert names(revision, "station", "gone") == {each["name"] for each in stations["closed"]}
    assert names(revision, "station", "new") == {each["name"] for each in stations["opened"]}
    assert len(names(revision, "station", "renamed")) == len(stations["renamed"])
    assert len(names(revision, "station", "moved")) == len(stations["moved"])


def test_ids_all_new_match_all_the_same(before: Edition, drawn: pipeline.Result, tmp_path):
    shuffled = tmp_path / "shuffled.zip"
    _shuffle_ids(BEFORE, shuffled)
    _, network = pipeline.inspect(shuffled, SETTINGS)
    matches = match_edition(before, network)
    old = {s.id: (s.name, round(s.lon, 6), round(s.lat, 6)) for s in before.stations}
    new = {s.id: (s.name, round(s.lon, 6), round(s.lat, 6)) for s in network.stations}
    assert len(matches.stations) == len(old)
    assert len(matches.lines) == len(before.lines)
    assert all(new[key] == old[match.old_id] for key, match in matches.stations.items())
    names_of = {line.id: line.name for line in network.lines}
    old_names = {line.id: line.name for line in before.lines}
    assert all(names_of[key] == old_names[m.old_id] for key, m in matches.lines.items())


def test_the_change_sheet_is_written_whole(before: Edition, revision: Revision, drawn):
    svg = pipeline.files_of(drawn)["diagram.svg"]
    files = files_of_revision(revision, before, svg)
    document = json.loads(files["changes.json"])
    assert document["kept"] == 98
    assert document["moved_on_sheet"] == 0
    rows = list(csv.DictReader(io.StringIO(files["changes.csv"].decode())))
    assert [row["id"] for row in rows] == [change.id for change in revision.sheet.changes]
    page = files["changes.html"].decode()
    assert all(change.name in page for change in revision.sheet.changes)
    assert page.count('<g id="before"') == page.count('<g id="after"') == 1
    assert page.count('<use href="#before"/>') == page.count('<use href="#after"/>') > 5
    assert "http://" not in page.replace("http://www.w3.org", "")


def _shuffle_ids(source: Path, target: Path) -> None:
    """Permute all stop ids among each other, and give every route a new id."""
    with zipfile.ZipFile(source) as old:
        tables = {
            name: list(csv.DictReader(io.StringIO(old.read(name).decode("utf-8-sig"))))
            for name in old.namelist()
        }
    stops = [row["stop_id"] for row in tables["stops.txt"]]
    mixed = stops[:]
    random.Random(3).shuffle(mixed)  # noqa: S311 - a shuffle, no secret
    stop = dict(zip(stops, mixed, strict=True))
    route = {row["route_id"]: f"r-{i}" for i, row in enumerate(tables["routes.txt"])}
    for name, rows in tables.items():
        for row in rows:
            for key, value in row.items():
                if key in {"stop_id", "parent_station", "from_stop_id", "to_stop_id"} and value:
                    row[key] = stop[value]
                elif key == "route_id" and value:
                    row[key] = route[value]
                elif name == "translations.txt" and key == "record_id" and value in stop:
                    row[key] = stop[value]
    with zipfile.ZipFile(target, "w") as new:
        for name, rows in tables.items():
            text = io.StringIO()
            writer = csv.DictWriter(text, list(rows[0]) if rows else ["empty"])
            writer.writeheader()
            writer.writerows(rows)
            new.writestr(name, text.getvalue())


ADJUSTED = {
    "stations": {
        "183": {"name": "Mulg Halt", "label_side": "S"},
        "335-1": {"hide": True},
        "406": {"note": "as agreed"},
    },
    "merge": [{"stations": ["331-1", "332-1"], "name": "Mlåt both"}],
    "lines": {"m1": {"color": "#225577"}},
}


def test_adjustments_outlive_a_change_of_all_ids(tmp_path):
    shuffled = tmp_path / "shuffled.zip"
    _shuffle_ids(BEFORE, shuffled)
    before, again = _revised(ADJUSTED, shuffled)
    assert {s.id: s.name for s in before.stations}["183"] == "Mulg Halt"
    assert _names_and_colors(again.result.edition) == _names_and_colors(before)
    assert {c.kind for c in again.sheet.changes} <= {"renumbered", "stops"}
    assert not {"335-1", "332-1"} & {s.id for s in again.result.edition.stations}
    assert again.result.edition.adjustments == before.adjustments
    old, new = ({s.id: s for s in each.stations} for each in (before, again.result.edition))
    # Beside what stands, the side that was asked for may be free where it was not.
    assert new["183"].label_side in {"S", old["183"].label_side}


def test_merges_outlive_a_revision():
    before, again = _revised(ADJUSTED, BEFORE)
    names, _ = _names_and_colors(before)
    assert names["331-1"] == "Mlåt both"
    assert "332-1" not in names
    assert again.sheet.changes == ()
    assert _names_and_colors(again.result.edition) == _names_and_colors(before)
    assert again.result.edition.adjustments == before.adjustments


def _revised(said: dict[str, object], feed: Path) -> tuple[Edition, Revision]:
    adjustments = adjustments_of(said, "test")
    drawn = pipeline.draw(BEFORE, SETTINGS, adjustments=adjustments)
    beside = Beside(state=from_json(drawn.state, drawn.edition))
    return drawn.edition, revise(drawn.edition, feed, SETTINGS, beside=beside)


def _names_and_colors(edition: Edition) -> tuple[dict[str, str], dict[str, str]]:
    return {s.id: s.name for s in edition.stations}, {k.id: k.color for k in edition.lines}


def test_settings_of_the_edition_hold_again(before: Edition):
    assert before.settings == {"layout": {"effort": "quick"}}
    again = revise(before, BEFORE, beside=Beside("a" * 64))
    assert again.result.settings == SETTINGS
    assert again.result.edition.previous == "a" * 64
