"""Reading in bulk and row by row give the same, findings included."""

from __future__ import annotations

import csv
import io
import tempfile
from pathlib import Path

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from gtfs_schematic.errors import FeedError, SchematicError
from gtfs_schematic.feed import blocks
from gtfs_schematic.feed.blocks import whole_lines
from gtfs_schematic.feed.model import FeedSettings
from gtfs_schematic.feed.read import read_feed

FEEDS = ("cairns_feed", "nyc_subway_feed", "ann_arbor_feed")
LARGE = ("trips.txt", "stop_times.txt", "shapes.txt")
JUNK = st.sampled_from(
    [
        *("", " ", "0", "1", "-1", "+7", "x", "NA", " tams ", "gate1", "up", "t1", "t1b", "wk"),
        *("8:61:00", "999:00:00", " 09:00:00", "25:00:00", "181", "0.00000000000000000001"),
        *('a"b', '"', "a,b", "line\nend", "é", "\u00a0", "a  b", "\x00", "\r"),
    ]
)


def outcome(path, date="typical-weekday"):
    """Give all that comes of reading a feed, or the error."""
    try:
        timetable = read_feed([path], FeedSettings(date=date))
    except SchematicError as error:
        return str(error)
    shapes = {ident: shape.tolist() for ident, shape in timetable.shapes.items()}
    rest = [getattr(timetable, name) for name in ("info", "stops", "routes", "patterns")]
    return (*rest, shapes, timetable.findings, timetable.left_out)


def strictly(path, date="typical-weekday"):
    """Give the same with every row read by the strict reader."""
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(blocks, "_header", lambda *_: None)
        return outcome(path, date)


@given(st.data())
@settings(max_examples=60)
def test_damaged_feeds_give_the_same_both_ways(town_files, data):
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        for file, text in town_files.items():
            rows = list(csv.reader(io.StringIO(text)))
            if file in LARGE:
                rows += [list(row) for row in rows[1:3]]
                for _ in range(data.draw(st.integers(0, 3))):
                    row = rows[data.draw(st.integers(1, len(rows) - 1))]
                    if row:
                        row[data.draw(st.integers(0, len(row) - 1))] = data.draw(JUNK)
                        if data.draw(st.integers(0, 5)) == 0:
                            row.pop()
            out = io.StringIO()
            quoting = data.draw(st.sampled_from([csv.QUOTE_MINIMAL, csv.QUOTE_ALL]))
            end = data.draw(st.sampled_from(["\n", "\r\n", "\n\n"]))
            csv.writer(out, quoting=quoting, lineterminator=end).writerows(rows)
            (folder / file).write_bytes(out.getvalue().encode())
        with pytest.MonkeyPatch.context() as patch:
            patch.setattr(blocks, "_ROWS", data.draw(st.sampled_from([1, 3, 1 << 16])))
            assert outcome(folder) == strictly(folder)


@pytest.mark.parametrize("feed", FEEDS)
def test_real_feeds_give_the_same_both_ways(request, feed):
    path = request.getfixturevalue(feed)
    assert outcome(path) == strictly(path)


@given(st.binary(max_size=60), st.integers(1, 20))
def test_pieces_end_with_lines_and_lose_nothing(data, size):
    pieces = [bytes(piece) for piece in whole_lines(io.BytesIO(data), "x.txt", size)]
    assert b"".join(pieces) == data
    assert all(piece.endswith(b"\n") for piece in pieces[:-1])


def test_endless_lines_and_rows_are_refused(monkeypatch, read_town):
    monkeypatch.setattr(blocks, "_LONGEST", 64)
    with pytest.raises(FeedError, match=r"x.txt: has a line of more than 64 bytes"):
        list(whole_lines(io.BytesIO(b"a" * 100), "x.txt", 16))
    monkeypatch.setattr(blocks, "MOST_ROWS", 10)
    with pytest.raises(FeedError, match=r"stop_times.txt: has more than 10 rows"):
        read_town()
