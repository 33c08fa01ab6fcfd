"""An edition is written as its schema says and read back as it was."""

from __future__ import annotations

import importlib.resources
import json
import string
from dataclasses import replace

import jsonschema
import pytest
from hypothesis import given
from hypothesis import strategies as st

from gtfs_schematic.drift.placed import TimedPattern
from gtfs_schematic.edition.check import faults
from gtfs_schematic.edition.model import (
    Edition,
    EditionFeed,
    EditionLine,
    EditionLink,
    EditionStation,
    EditionWalk,
)
from gtfs_schematic.edition.save import from_json, to_json
from gtfs_schematic.errors import EditionError

# Lone surrogates are no text: they can stand in no UTF-8 file.
texts = st.text(st.characters(exclude_categories=["Cs"]), max_size=12)
ids = st.text(st.characters(exclude_categories=["Cs"]), min_size=1, max_size=6)
colors = st.text("0123456789abcdefABCDEF", min_size=6, max_size=6).map(lambda text: f"#{text}")
dates = st.dates().map(lambda day: day.isoformat()) | st.just("")
places = st.floats(0, 400, allow_nan=False)
WIDTH, HEIGHT = 420.0, 297.0


@st.composite
def editions(draw: st.DrawFn) -> Edition:
    """Make whole editions: any ids and texts, every reference leading somewhere."""
    station_ids = draw(st.lists(ids, min_size=2, max_size=6, unique=True))
    line_ids = draw(st.lists(ids, min_size=1, max_size=4, unique=True))
    some_lines = st.lists(st.sampled_from(line_ids), unique=True).map(tuple)
    some_stations = st.lists(st.sampled_from(station_ids), max_size=5).map(tuple)
    stations = tuple(
        EditionStation(
            id=key,
            name=draw(texts),
            stop_ids=tuple(draw(st.lists(ids, max_size=3))),
            lon=draw(st.floats(-180, 180)),
            lat=draw(st.floats(-90, 90)),
            x_mm=draw(places),
            y_mm=draw(st.floats(0, HEIGHT)),
            kind=draw(st.sampled_from(["stop", "interchange", "terminus"])),
            lines=draw(some_lines),
            group=draw(st.sampled_from(station_ids)),
            label_side=draw(st.sampled_from(["", "E", "NW"])),
            change_s=draw(st.none() | st.integers(0, 999)),
            stop_codes=tuple(draw(st.lists(ids, max_size=2))),
            second_name=draw(texts),
            boarding=draw(st.sampled_from(["unknown", "yes", "no"])),
        )
        for key in station_ids
    )
    link_ids = draw(st.lists(ids, min_size=2, max_size=4, unique=True))
    paths = [drawn_path(draw, stations) for _ in link_ids]
    links = tuple(
        EditionLink(key, a.id, b.id, draw(some_lines), path)
        for key, (a, b, path) in zip(link_ids[1:], paths[1:], strict=True)
    )
    a, b, path = paths[0]
    walks = (EditionWalk(link_ids[0], a.id, b.id, draw(st.none() | st.integers(0, 999)), path),)
    lines = tuple(
        EditionLine(
            id=key,
            name=draw(texts),
            color=draw(colors),
            text_color=draw(colors),
            route_ids=tuple(draw(st.lists(ids, max_size=2))),
            itineraries=tuple(draw(st.lists(some_stations, max_size=2))),
            long_name=draw(texts),
            mode=draw(st.sampled_from(["", "tram", "bus"])),
            service=draw(st.sampled_from(["", "all-day", "night"])),
            trips=draw(st.integers(0, 999)),
            headway_s=draw(st.none() | st.integers(1, 9999)),
        )
        for key in line_ids
    )
    sha = draw(st.text("0123456789abcdef", min_size=64, max_size=64))
    feed = EditionFeed(sha, draw(texts), draw(texts), draw(dates), draw(dates), draw(dates))
    left_out = tuple(draw(st.lists(st.tuples(texts, texts, texts), max_size=3)))
    findings = tuple(draw(st.lists(texts, max_size=3)))
    timed = tuple(
        timed_pattern(draw, line_ids, station_ids) for _ in range(draw(st.integers(0, 2)))
    )
    plain = st.dictionaries(texts, texts | st.booleans() | st.lists(texts, max_size=2), max_size=2)
    return Edition(
        draw(texts), feed, WIDTH, HEIGHT, stations, links, lines, left_out, findings, walks, timed,
        previous=draw(st.sampled_from(["", sha])),
        settings=draw(plain),
        adjustments=draw(plain),
    )  # fmt: skip


def timed_pattern(draw, line_ids, station_ids):
    calls = draw(st.lists(st.sampled_from(station_ids), min_size=2, max_size=4))
    seconds = st.integers(0, 9999)
    times = draw(st.lists(seconds, min_size=len(calls), max_size=len(calls)).map(sorted))
    departures = draw(st.lists(seconds, min_size=1, max_size=3).map(sorted))
    line = draw(st.sampled_from(line_ids))
    return TimedPattern(line, tuple(calls), tuple(times), tuple(departures))


def drawn_path(draw, stations):
    a, b = draw(st.sampled_from(stations)), draw(st.sampled_from(stations))
    bends = draw(st.lists(st.tuples(places, places), max_size=2))
    return a, b, ((a.x_mm, a.y_mm), *bends, (b.x_mm, b.y_mm))


def schema():
    text = (importlib.resources.files("gtfs_schematic.edition") / "edition.schema.json").read_text(
        "utf-8"
    )
    jsonschema.Draft202012Validator.check_schema(json.loads(text))
    return json.loads(text)


SCHEMA = schema()


def station(key: str, x: float, y: float) -> EditionStation:
    return EditionStation(key, key.upper(), (key,), 10.0, 50.0, x, y, "stop", ("1",), key)


EXAMPLE = Edition(
    title="Tram network",
    feed=EditionFeed("0" * 64, "P", "v", "2026-03-01", "2026-06-30", "2026-03-11"),
    width_mm=WIDTH,
    height_mm=HEIGHT,
    stations=(station("a", 10.0, 10.0), station("b", 30.0, 10.0)),
    links=(EditionLink("a-b", "a", "b", ("1",), ((10.0, 10.0), (30.0, 10.0))),),
    lines=(EditionLine("1", "1", "#AA0000", "#FFFFFF", ("r1",), (("a", "b"),)),),
    patterns=(TimedPattern("1", ("a", "b"), (0, 120), (28800, 29400)),),
)


@given(editions())
def test_what_is_saved_is_loaded(edition):
    assert from_json(to_json(edition)) == edition


@given(editions())
def test_what_is_saved_meets_the_schema(edition):
    jsonschema.validate(json.loads(to_json(edition)), SCHEMA, cls=jsonschema.Draft202012Validator)


def test_the_documented_shape():
    """The fields that the design promises to every reader."""
    document = json.loads(to_json(EXAMPLE))
    assert (document["format"], document["version"]) == ("gtfs-schematic/edition", 1)
    assert document["sheet"] == {"width_mm": 420.0, "height_mm": 297.0}
    assert set(document["feed"]) == {
        "sha256",
        "publisher",
        "version",
        "start_date",
        "end_date",
        "service_date",
    }
    assert set(document["stations"][0]) >= {
        "id",
        "name",
        "stop_ids",
        "lon",
        "lat",
        "x_mm",
        "y_mm",
        "kind",
        "lines",
        "group",
    }
    assert set(document["links"][0]) >= {"id", "from", "to", "lines", "path_mm"}
    assert set(document["lines"][0]) >= {
        "id",
        "name",
        "color",
        "text_color",
        "route_ids",
        "itineraries",
    }


def test_each_row_has_a_line_of_its_own():
    """So that version control shows what changed."""
    before = to_json(EXAMPLE).splitlines()
    renamed = replace(EXAMPLE.stations[1], name="Bee")
    after = to_json(replace(EXAMPLE, stations=(EXAMPLE.stations[0], renamed))).splitlines()
    assert sum(a != b for a, b in zip(before, after, strict=True)) == 1


def test_unknown_fields_are_let_by():
    document = json.loads(to_json(EXAMPLE))
    document["later"] = 1
    document["stations"][0]["later"] = {"x": []}
    assert from_json(json.dumps(document).encode()) == EXAMPLE


def test_an_edition_that_knows_no_timetable_is_read():
    """Fields that came later may be missing."""
    document = json.loads(to_json(EXAMPLE))
    del document["patterns"]
    for row in document["stations"]:
        del row["change_s"]
    assert from_json(json.dumps(document).encode()) == replace(EXAMPLE, patterns=())


def changed(path: str, value: object) -> bytes:
    document = json.loads(to_json(EXAMPLE))
    *way, last = [int(part) if part.isdigit() else part for part in path.split("/")]
    target = document
    for part in way:
        target = target[part]
    if value is None:
        del target[last]
    else:
        target[last] = value
    return json.dumps(document).encode()


@pytest.mark.parametrize(
    ("data", "message"),
    [
        (b"", "not JSON"),
        (b"\xff\xfe{}", "not JSON in UTF-8"),
        (b"[" * 100_000, "not JSON"),
        (b"[]", 'no "format"'),
        (b"{}", 'no "format"'),
        (b'{"format": "gtfs-schematic/edition", "version": NaN}', "not JSON"),
        (changed("version", 2), "version 2, but this program reads version 1"),
        (changed("title", None), "title: Field required"),
        (changed("stations/1/lon", "12.5"), "stations.1.lon: "),
        (changed("stations/1/lat", 95), "stations.1.lat: "),
        (changed("stations/1/name", 7), "stations.1.name: "),
        (changed("stations/1/kind", "depot"), "stations.1.kind: "),
        (changed("stations/1/id", "a"), "station a stands 2 times"),
        (changed("stations/1/x_mm", 500), "station b lies off the sheet"),
        (changed("stations/1/x_mm", 31), "its path does not join its stations"),
        (changed("stations/1/group", "q"), "group q is no station"),
        (changed("lines/0/color", "red"), "lines.0.color: "),
        (changed("lines/0/itineraries/0/1", "z"), "station z is unknown"),
        (changed("links/0/from", "z"), "link a-b: station z is unknown"),
        (changed("links/0/lines", ["2"]), "link a-b: line 2 is unknown"),
        (changed("links/0/path_mm", [[1, 1]]), "links.0.path_mm: "),
        (changed("links/0/path_mm/0", [1, 1, 1]), "links.0.path_mm.0"),
        (changed("stations/0/change_s", -1), "stations.0.change_s: "),
        (changed("patterns/0/line", "2"), "pattern 0: line 2 is unknown"),
        (changed("patterns/0/stations", ["a", "z"]), "pattern 0: station z is unknown"),
        (changed("patterns/0/stations", ["a"]), "patterns.0.stations: "),
        (changed("patterns/0/times_s", [0]), "pattern 0: not one time per station"),
        (changed("patterns/0/times_s", [60, 0]), "pattern 0: its times run backwards"),
        (changed("patterns/0/departures_s", []), "patterns.0.departures_s: "),
    ],
)
def test_what_cannot_be_read_is_named(data, message):
    with pytest.raises(EditionError) as caught:
        from_json(data)
    assert message in str(caught.value)


def test_infinity_hidden_in_an_exponent_is_refused():
    data = to_json(EXAMPLE).replace(b'"x_mm": 30.0', b'"x_mm": 1e999')
    with pytest.raises(EditionError, match=r"stations.1.x_mm"):
        from_json(data)


def test_an_edition_at_fault_is_not_written():
    broken = replace(EXAMPLE, lines=(), patterns=())
    assert faults(broken) == (
        "station a: line 1 is unknown",
        "station b: line 1 is unknown",
        "link a-b: line 1 is unknown",
    )
    with pytest.raises(EditionError, match="contradicts itself"):
        to_json(broken)


@given(st.text(string.printable, max_size=60))
def test_no_text_gets_past_the_reader_unexplained(text):
    with pytest.raises(EditionError):
        from_json(text.encode())
